"""Expressions of a store, complete ones first."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.answers.columns import Columns
from colloc.answers.expressions.frames import frame_shapes, grown_frames, with_fillers
from colloc.answers.expressions.gathering import Gathered, gather
from colloc.answers.expressions.interaction import interactions
from colloc.answers.expressions.judging import Judged, in_order, judge, texts
from colloc.answers.expressions.orders import in_any_order
from colloc.answers.expressions.scoring import c_values, nesting
from colloc.answers.expressions.sets import ranked_sets
from colloc.answers.expressions.settings import Asked, ExpressionOptions, resolve, shown_columns
from colloc.answers.expressions.sureness import split_intervals
from colloc.answers.patterns import matches
from colloc.counts.runs import Column
from colloc.counts.sequences.growing import Grower
from colloc.records import Int64Array
from colloc.settings import DEFAULT_MEMORY
from colloc.store.connection import Store

Progress = Callable[[float, int, str], None]


def expressions(
    store: Store,
    *,
    options: ExpressionOptions,
    show: Sequence[str] | None = None,
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Progress | None = None,
) -> Columns:
    """Sequences of words that recur and hold together.

    Parameters
    ----------
    show : sequence of str
        Columns beside the expression; ``all`` for every one. A choice and what ranks when not given.
    limit : int
        Rows; 0 for all.

    Returns
    -------
    Columns
        Those of `colloc.answers.expressions.settings.COLUMNS` that are shown, in this order.
    """
    asked = resolve(store, options)
    shown = shown_columns(show, options)
    tell = progress if progress is not None else _silent
    with asked.growing(store, jobs, memory) as grower:
        if options.any_order:
            return ranked_sets(store, asked, grower, limit, tell).select(shown)
        pattern = options.pattern
        # before the long work: the store may not tell word classes
        places = None if pattern is None else grower.keep_matches(matches(store, pattern, asked.where))
        table = _grown(grower, options, tell)
        matched = None if places is None else _matched(grower, table, places)
        tell(1.0, grower.total, "ranking")
        answer = _ranked(store, asked, grower, table, matched, limit, shown)
    return answer.select(shown)


def _grown(grower: Grower, options: ExpressionOptions, tell: Progress) -> Gathered:
    if options.slots:
        shapes = frame_shapes(options.min_words, options.max_words, options.slots)
        return gather(grown_frames(grower, shapes, tell), grower.total, grower.units)
    levels = [grower.single]
    # one word more than is asked for, to see which are only fragments
    for words in range(2, options.max_words + 2):
        tell((words - 2) / options.max_words, grower.total, f"sequences of {words} words")
        levels.append(grower.join(levels[-1], levels[-1], 1))
    return gather(levels, grower.total, grower.units)


def _matched(grower: Grower, table: Gathered, places: Column) -> Int64Array:
    """Occurrences of all sequences of two words and more that stand where as long a match begins."""
    return np.concatenate([grower.matching(level, places) for level in table.levels[1:]])


def _ranked(
    store: Store,
    asked: Asked,
    grower: Grower,
    table: Gathered,
    matched: Int64Array | None,
    limit: int,
    shown: Sequence[str],
) -> Columns:
    judged = judge(table, asked, matched)
    first = table.edges[1]
    rows = np.flatnonzero(judged.listed) + first
    scores = scores_of(table, judged)
    rank = asked.options.rank
    if rank == "specific_interaction":
        values = np.full(len(judged.listed), np.nan)
        values[rows - first] = interactions(grower, table, rows)
        scores[rank] = values
    if asked.options.slots:
        rows = rows[~np.array([level.contiguous for level in table.levels])[table.level_of(rows)]]
        rows, fillers = with_fillers(store, asked, grower, table, rows, scores[rank], limit)
    else:
        fillers = {}
    rows, found = in_order(store, asked.layer, table, rows, scores[rank], limit)
    answer = _columns(store, asked, table, judged, scores, rows, found)
    more: dict[str, Any] = {name: [column[int(row)] for row in rows] for name, column in fillers.items()}
    more = {name: values if name == "fillers" else np.array(values) for name, values in more.items()}
    if "specific_interaction" in shown and rank != "specific_interaction":
        more["specific_interaction"] = interactions(grower, table, rows)
    more |= looked_up(grower, table, judged, rows, shown)
    if matched is not None:
        more["pattern_count"] = matched[rows - first]
    return answer.adding(more)


def looked_up(
    grower: Grower, table: Gathered, judged: Judged, rows: Int64Array, names: Sequence[str]
) -> dict[str, NDArray[Any]]:
    """Those of the named columns that go back to the stream, for some rows of the table; no list is ranked by them."""
    found: dict[str, NDArray[Any]] = {}
    if "any_order" in names and contiguous(table):
        found["any_order"] = in_any_order(grower, table, rows)
    if {"split_low", "split_high"} & set(names):
        held, here = judged.held, rows - table.edges[1]
        low, high = split_intervals(grower, table, rows, held.weakest[here], held.cut[here])
        found |= {"split_low": low, "split_high": high}
    return found


def contiguous(table: Gathered) -> bool:
    """Whether no sequence of the table has an open slot."""
    return all(level.contiguous for level in table.levels)


def scores_of(table: Gathered, judged: Judged) -> dict[str, NDArray[Any]]:
    """By name, for all sequences of two words and more."""
    scores: dict[str, NDArray[Any]] = {
        "count": table.counts[table.edges[1] :],
        "documents": table.spread.documents,
        "strength": judged.strength,
        "weakest_split": judged.held.weakest,
        "specific_correlation": judged.held.correlation,
        "best_split_g2": judged.held.g2,
    }
    if contiguous(table):
        scores["c_value"], scores["c_value_length"] = c_values(table, nesting(table, judged.fit))
    return scores


def _columns(
    store: Store,
    asked: Asked,
    table: Gathered,
    judged: Judged,
    scores: dict[str, NDArray[Any]],
    rows: Int64Array,
    found: list[str],
) -> Columns:
    first = table.edges[1]
    here = rows - first
    fragment = judged.fragment[here]
    return Columns(
        {
            "expression": found,
            "words": table.lengths[rows],
            **{name: values[here] for name, values in scores.items()},
            "dp_norm": table.spread.dp_norm[here],
            "capitals": table.spread.capitals[here],
            "completeness": judged.completeness[here],
            "cut": judged.held.cut[here],
            "fragment": texts(store, asked.layer, table, fragment),
            "fragment_count": np.where(fragment >= 0, table.counts[fragment], 0),
            "fragments": judged.fragments[here],
        },
        {**asked.settings(store), "tokens": table.total},
    )


def _silent(done: float, tokens: int, phase: str) -> None:
    """Progress where nobody asked for it."""
