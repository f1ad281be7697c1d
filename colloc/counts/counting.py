"""A tally, counted: shares into runs, runs into pages, pages into whatever takes them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import asdict, dataclass
from itertools import pairwise
from pathlib import Path

import numpy as np

from colloc.counts.budget import Budget
from colloc.counts.merging import choose_bounds
from colloc.counts.pagefiles import PageFile, page_file
from colloc.counts.processes import Crew, Task
from colloc.counts.runs import Column, RunFile, save_runs, write_column
from colloc.counts.selection import Selection
from colloc.counts.tasks import HIGHS, RUNS, Facts
from colloc.records import Int64Array
from colloc.settings import TallySpec
from colloc.store.pages import Order, PageHead

Progress = Callable[[float, int, str], None]
"""Called with the share done (0..1), tokens so far, and the phase."""
AddPage = Callable[[Order, PageHead, bytes], None]

_LARGEST_SHARE = 2**24
"""Tokens that one table of frequent pairs counts: more would make fewer runs, but progress would stand still."""
_RANGES_PER_JOB = 4
_LEAST_RANGE = 2**14
"""Entries: fewer are not worth a task of their own."""
_COUNTED, _MERGED = 0.6, 0.8
"""How far the whole has come when counting, and when merging, is done."""


@dataclass(frozen=True, slots=True)
class Counts:
    """What belongs to a tally besides its pages.

    Attributes
    ----------
    total : int
    first, second : int64 arrays, shape (n_terms,)
        Margins, by term.
    """

    total: int
    first: Int64Array
    second: Int64Array


def count_tally(
    crew: Crew,
    jobs: int,
    spec: TallySpec,
    selection: Selection,
    n_terms: int,
    budget: Budget,
    folder: Path,
    add_page: AddPage,
    *,
    sign: int = 1,
    progress: Progress | None = None,
) -> Counts:
    """Count a selection; the pages go to ``add_page``, in each order ascending.

    The counts are the same for any number of jobs and any budget; how the pairs are cut into pages is not.

    Parameters
    ----------
    folder : Path
        An empty folder for temporary files.
    sign : int
        -1: everything negative, for a change that takes away.
    """
    tell = progress if progress is not None else _silent
    counted = _count_shares(crew, jobs, spec, selection, budget, folder, tell)
    runs = [_run_file(run) for share in counted for run in share["runs"]]
    tell(_COUNTED, len(selection), "merging")
    first, second = np.zeros(n_terms, np.int64), np.zeros(n_terms, np.int64)

    def take_in(facts: Facts) -> None:
        pages = page_file(facts)
        for head, data in pages.pages():
            add_page(pages.order, head, data)
        _add_margins(pages, first, second)
        for path in (pages.path, pages.terms.path, pages.first.path, pages.second.path):
            Path(path).unlink()

    _merge(crew, jobs, spec, runs, budget, folder, sign, take_in, lambda done: tell(done, len(selection), "merging"))
    total = sign * sum(share["total"] for share in counted)
    own = np.zeros(n_terms, np.int64)
    for share in counted:
        if share["margin"] is not None:
            own += sign * Column(**share["margin"]).read()
    tell(1.0, len(selection), "merging")
    if spec.kind == "unit":
        return Counts(total, own, own)
    if spec.kind == "positions":
        return Counts(total, own, second)
    return Counts(int(first.sum()), first, second)


def _count_shares(
    crew: Crew, jobs: int, spec: TallySpec, selection: Selection, budget: Budget, folder: Path, tell: Progress
) -> list[Facts]:
    where = {
        "begins": asdict(write_column(folder / "begins", selection.begins)),
        "stops": asdict(write_column(folder / "stops", selection.stops)),
    }
    size = len(selection)
    parts = jobs * -(-size // (jobs * _LARGEST_SHARE))
    edges = [size * part // parts for part in range(parts + 1)] if size else [0]
    tasks: list[Task] = []
    for part, (begin, stop) in enumerate(pairwise(edges)):
        arguments = {"spec": spec.to_json(), "selection": where, "begin": begin, "stop": stop}
        arguments |= {"pending": budget.pending, "cells": budget.cells, "folder": str(folder), "name": f"share-{part}"}
        tasks.append(("count", arguments))
    counted = []
    tell(0.0, 0, "counting")
    for part, facts in enumerate(crew.results(tasks)):
        counted.append(facts)
        tell(_COUNTED * edges[part + 1] / size, edges[part + 1], "counting")
    return counted


def _merge(
    crew: Crew,
    jobs: int,
    spec: TallySpec,
    runs: list[RunFile],
    budget: Budget,
    folder: Path,
    sign: int,
    take_in: Callable[[Facts], None],
    tell: Callable[[float], None],
) -> None:
    entries = sum(run.keys.n for run in runs)
    if not entries:
        return
    keys, highs = choose_bounds(runs, min(budget.entries, max(_LEAST_RANGE, -(-entries // (jobs * _RANGES_PER_JOB)))))
    save_runs(folder / RUNS, runs)
    write_column(folder / HIGHS, np.array(highs, np.int64))
    place = {"folder": str(folder)}
    tasks: list[Task] = [
        (
            "merge",
            {"first": first, "last": last, "symmetric": spec.kind == "unit", "sign": sign, "name": f"low-{i}", **place},
        )
        for i, (first, last) in enumerate(pairwise(keys))
    ]
    for done, facts in enumerate(crew.results(tasks), 1):
        take_in(facts["pages"])
        tell(_COUNTED + (_MERGED - _COUNTED) * done / len(tasks))
    for run in runs:
        Path(run.keys.path).unlink()
        Path(run.counts.path).unlink()
    parts = len(tasks)
    tasks = [
        ("transpose", {"names": "low", "parts": parts, "group": group, "name": f"high-{group}", **place})
        for group in range(len(highs) - 1)
    ]
    for done, facts in enumerate(crew.results(tasks), 1):
        take_in(facts["pages"])
        tell(_MERGED + (1 - _MERGED) * done / len(tasks))


def _run_file(facts: Facts) -> RunFile:
    return RunFile(Column(**facts["keys"]), Column(**facts["counts"]))


def _add_margins(pages: PageFile, first: Int64Array, second: Int64Array) -> None:
    terms = pages.terms.read()
    # the terms of one file are all different
    first[terms] += pages.first.read()
    second[terms] += pages.second.read()


def _silent(done: float, tokens: int, phase: str) -> None:
    """Progress where nobody asked for it."""
