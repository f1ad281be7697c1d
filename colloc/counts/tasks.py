"""The pieces of work that counting is cut into, done in this process or in another one."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Iterator
from itertools import islice
from pathlib import Path
from typing import Any

import numpy as np

from colloc.counts.accumulating import Accumulator
from colloc.counts.dense import plan_cells
from colloc.counts.keys import Run
from colloc.counts.merging import Dealt, merge_range, transpose_range
from colloc.counts.positions import add_positions
from colloc.counts.relations import read_dependents
from colloc.counts.runs import Column, RunFile, load_runs, write_column, write_run
from colloc.counts.selection import Selection, selection_of
from colloc.counts.sequences.set_tasks import count_orders, count_sets, survey_sets
from colloc.counts.sequences.sharing import (
    count_fillers,
    count_groups,
    count_joins,
    count_matches,
    lay_out,
    merge_joins,
    number_joins,
    spread_sequences,
    survey_sequences,
)
from colloc.counts.spans import Stretch, read_stretches, whole_units, window_spans
from colloc.counts.units import add_units
from colloc.counts.windows import add_windows
from colloc.kernels.switch import compiled
from colloc.records import NO_TERM, Int64Array, TokenSpan, UInt32Array
from colloc.settings import TallySpec
from colloc.store.connection import Store
from colloc.store.vocabulary import layer_map, term_count

_SAMPLE_BLOCKS = 1
_COMPILED_CELLS = 2**18
"""A compiled loop adds to a table in the nearer caches in a tenth of the time it takes to reach a farther one, and
that is less than sorting takes."""
RUNS, HIGHS = "runs.json", "highs"
"""Files of a job's folder that every task of merging reads."""
Facts = dict[str, Any]
"""What passes between processes: paths and small facts, as JSON has them."""


def count_share(
    store: Store, spec: str, selection: Facts, begin: int, stop: int, pending: int, cells: int, folder: str, name: str
) -> Facts:
    """Count the places ``begin`` to ``stop`` of a selection into runs.

    Returns
    -------
    dict
        ``runs``: the run files. ``total``: tokens seen, or units. ``margin``: a column by term with the tokens
        (positions) or units of each term; None for the other kinds, whose margins are sums of cells.
    """
    what = TallySpec.from_json(spec)
    chosen = selection_of(Column(**selection["begins"]).read(), Column(**selection["stops"]).read())
    layer = layer_map(store, what.layer)
    runs: list[RunFile] = []

    def spill(run: Run) -> None:
        if len(run):
            runs.append(write_run(Path(folder), f"{name}-{len(runs)}", run))

    n_terms = term_count(store, what.layer)
    margin = np.zeros(n_terms, np.int64)
    total = 0
    back, ahead = reach(what)
    last = len(chosen) if what.kind == "unit" else stop + ahead
    cells = min(cells, _COMPILED_CELLS) if compiled() else cells
    plan = plan_cells(_sample(store, layer, chosen, what, begin, stop, n_terms), cells) if cells else None
    into = Accumulator(plan, pending, spill)
    stretches = read_stretches(store, layer, chosen, what.inside, max(0, begin - back), last)
    if what.kind == "relation":
        for found in read_dependents(store, layer, chosen, what.relation, begin, stop):
            into.load(found.terms)
            into.pair(found.heads, found.dependents)
    elif what.kind == "unit":
        for terms, starts, _places in whole_units(stretches, begin, stop):
            add_units(terms, starts, into)
            margin += np.bincount(terms, minlength=n_terms)
            total += len(starts)
    else:
        for span in window_spans(stretches, begin, stop, back, ahead):
            if what.kind == "positions":
                add_positions(span, what.left, what.right, into)
                own = _own_terms(span)
                margin += np.bincount(own, minlength=n_terms)
                total += len(own)
            else:
                add_windows(span, what.left, what.right, into)
    into.finish()
    explicit = what.kind in ("unit", "positions")
    return {
        "runs": [dataclasses.asdict(run) for run in runs],
        "total": total,
        "margin": dataclasses.asdict(write_column(Path(folder) / f"{name}.margin", margin)) if explicit else None,
    }


def reach(spec: TallySpec) -> tuple[int, int]:
    """How many tokens before and after those that are counted a window of this kind looks at."""
    if spec.kind == "positions":
        return spec.left, spec.right
    return (0, 0) if spec.kind in ("unit", "relation") else (max(spec.left, spec.right), 0)


def _own_terms(span: TokenSpan) -> UInt32Array:
    own = span.terms[span.context : len(span.terms) - span.ahead]
    present: UInt32Array = own[own != NO_TERM]
    return present


def _sample(
    store: Store, layer: UInt32Array, chosen: Selection, spec: TallySpec, begin: int, stop: int, n_terms: int
) -> Int64Array:
    """Frequencies of terms in a block from the middle: enough to tell which pairs will be frequent."""
    middle = (begin + stop) // 2
    stretches: Iterator[Stretch] = read_stretches(store, layer, chosen, spec.inside, middle, stop)
    frequencies = np.zeros(n_terms, np.int64)
    for stretch in islice(stretches, _SAMPLE_BLOCKS):
        frequencies += np.bincount(stretch.terms[stretch.terms != NO_TERM], minlength=n_terms)
    return frequencies


def merge_runs(first: int, last: int, symmetric: bool, sign: int, folder: str, name: str) -> Facts:
    """`merge_range` over the runs and groups that `RUNS` and `HIGHS` in ``folder`` list."""
    place = Path(folder)
    highs = np.fromfile(place / HIGHS, np.int64).tolist()
    pages, dealt = merge_range(load_runs(place / RUNS), first, last, highs, symmetric, sign, place, name)
    dealt.save(place / f"{name}.dealt")
    return {"pages": dataclasses.asdict(pages), "pairs": dealt.edges[-1]}


def transpose(names: str, parts: int, group: int, folder: str, name: str) -> Facts:
    """`transpose_range` over what the tasks ``names-0``, ``names-1``, ... dealt out."""
    dealt = [Dealt.load(Path(folder) / f"{names}-{part}.dealt") for part in range(parts)]
    return {"pages": dataclasses.asdict(transpose_range(dealt, group, Path(folder), name))}


STORE_TASKS: dict[str, Callable[..., Facts]] = {"count": count_share, "lay_out": lay_out}
"""Tasks that read the store, which is their first argument."""
FILE_TASKS: dict[str, Callable[..., Facts]] = {
    "merge": merge_runs,
    "transpose": transpose,
    "count_joins": count_joins,
    "merge_joins": merge_joins,
    "number_joins": number_joins,
    "survey_sequences": survey_sequences,
    "count_fillers": count_fillers,
    "count_groups": count_groups,
    "count_sets": count_sets,
    "survey_sets": survey_sets,
    "count_orders": count_orders,
    "count_matches": count_matches,
    "spread_sequences": spread_sequences,
}
"""Tasks on temporary files alone."""


def perform(store: Store, task: str, arguments: Facts) -> Facts:
    """Do one piece of work."""
    if task in STORE_TASKS:
        return STORE_TASKS[task](store, **arguments)
    return FILE_TASKS[task](**arguments)
