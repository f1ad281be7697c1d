"""Expressions of a store, complete ones first."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.answers.columns import Columns
from colloc.answers.expressions.folding import completeness, folded_into, wholes
from colloc.answers.expressions.gathering import Gathered, gather
from colloc.answers.expressions.scoring import Bonds, bonds, c_values, nesting
from colloc.answers.expressions.settings import COMMON_SHARE, NAME_SHARE, Asked, ExpressionOptions, resolve
from colloc.counts.sequences.growing import Grower, growing
from colloc.errors import UsageError
from colloc.records import FloatArray, Int64Array
from colloc.settings import DEFAULT_MEMORY
from colloc.store.connection import Store
from colloc.store.vocabulary import term_texts

Progress = Callable[[float, int, str], None]

COLUMNS = (
    *(
        "expression",
        "words",
        "count",
        "documents",
        "dp_norm",
        "capitals",
        "strength",
        "completeness",
        "weakest_split",
        "cut",
    ),
    *("specific_correlation", "best_split_g2", "c_value", "c_value_length", "fragment", "fragment_count", "fragments"),
)
SHOWN = (
    *("expression", "count", "documents", "dp_norm", "strength", "weakest_split", "c_value"),
    *("fragment", "fragment_count"),
)
"""What is shown when nothing else is asked for."""


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
        Columns beside the expression; ``all`` for every one. `SHOWN` and what ranks when not given.
    limit : int
        Rows; 0 for all.

    Returns
    -------
    Columns
        Of these, in this order, those that are shown:
        expression, words, count, documents, dp_norm, capitals, strength, weakest_split, cut (words left of it),
        specific_correlation, best_split_g2, c_value, c_value_length, fragment (the strongest folded into this one),
        fragment_count, fragments (how many).
    """
    asked = resolve(store, options)
    shown = shown_columns(show, options.rank)
    with growing(
        store,
        layer=asked.layer,
        where=asked.where,
        inside=asked.inside,
        min_count=options.min_count,
        jobs=jobs,
        memory=memory,
    ) as grower:
        table = _grown(grower, options.max_words + 1, progress)
    return _ranked(store, asked, table, limit).select(shown)


def shown_columns(show: Sequence[str] | None, rank: str) -> list[str]:
    """The columns of an answer, in their order.

    Raises
    ------
    UsageError
        A name that is no column.
    """
    if show is not None and "all" in show:
        return list(COLUMNS)
    for name in show or ():
        if name not in COLUMNS:
            raise UsageError(f"no column {name!r}: choose from all, {', '.join(COLUMNS)}")
    chosen = {"expression", rank, *(SHOWN if show is None else show)}
    return [name for name in COLUMNS if name in chosen]


def _grown(grower: Grower, longest: int, progress: Progress | None) -> Gathered:
    tell = progress if progress is not None else _silent
    levels = [grower.single]
    for words in range(2, longest + 1):
        tell((words - 2) / (longest - 1), grower.total, f"sequences of {words} words")
        levels.append(grower.join(levels[-1], levels[-1], 1))
    tell(1.0, grower.total, "ranking")
    return gather(levels, grower.total, grower.units)


def strength(table: Gathered, weakest: FloatArray) -> FloatArray:
    """What expressions are ranked by: weakest split in bits, times log2 of 1 + the occurrences elsewhere.

    Elsewhere is outside the document that holds most of them, so that one document's repeats and names carry no
    weight; where all tokens are in one document, all occurrences count. (Own definition.)
    """
    counts = table.counts[table.edges[1] :]
    alone = table.spread.documents.max(initial=0) < 2
    elsewhere = counts if alone else counts - table.spread.largest
    result: FloatArray = weakest * np.log2(1.0 + elsewhere)
    return result


def _ranked(store: Store, asked: Asked, table: Gathered, limit: int) -> Columns:
    options, first = asked.options, table.edges[1]
    held = bonds(table)
    fit = table.spread.documents >= asked.min_docs
    if options.names == "drop":
        # NaN, where every word begins a sentence or is a single letter (headings), compares as false
        fit &= table.spread.capitals < NAME_SHARE
    whole = wholes(table, fit) if options.fragments == "fold" else np.arange(first, table.edges[-1])
    holding = np.where(fit, strength(table, held.weakest), -np.inf)
    fragment, best, fragments = folded_into(whole, holding, first)
    complete = completeness(table)
    by_log, by_length = c_values(table, nesting(table, fit))
    lengths = table.lengths[first:]
    shown = fit & (whole == np.arange(first, table.edges[-1]))
    shown &= (lengths >= options.min_words) & (lengths <= options.max_words)
    if options.common == "drop":
        shown &= ~only_common(table)
    scores: dict[str, NDArray[Any]] = {
        "strength": np.where(best > 0, best * complete, best),
        "weakest_split": held.weakest,
        "specific_correlation": held.correlation,
        "best_split_g2": held.g2,
        "c_value": by_log,
        "c_value_length": by_length,
        "count": table.counts[first:],
        "documents": table.spread.documents,
        "completeness": complete,
    }
    chosen, texts = _in_order(store, asked.layer, table, np.flatnonzero(shown), scores[options.rank], limit)
    return _columns(store, asked, table, chosen, texts, held, scores, fragment, fragments)


def only_common(table: Gathered) -> NDArray[np.bool_]:
    """Which sequences are made only of the words that make up the first half of the running text."""
    counts = table.counts[: table.edges[1]]
    order = np.argsort(-counts, kind="stable")
    before = np.cumsum(counts[order]) - counts[order]
    common = np.zeros(table.edges[-1], bool)
    common[order[before < COMMON_SHARE * table.total]] = True
    for words in range(2, table.longest + 1):
        rows = table.rows(words)
        common[rows] = common[table.left[rows]] & common[table.right[rows]]
    return common[table.edges[1] :]


def _in_order(
    store: Store, layer: str, table: Gathered, rows: Int64Array, score: NDArray[Any], limit: int
) -> tuple[Int64Array, list[str]]:
    """Rows by score, count and text, with the texts; text is made only for what can reach the list."""
    count = table.counts[table.edges[1] :]
    order = np.lexsort((-count[rows], -score[rows]))
    rows = rows[order]
    if limit and len(rows) > limit:
        last = rows[limit - 1]
        reach = (score[rows] > score[last]) | ((score[rows] == score[last]) & (count[rows] >= count[last]))
        rows = rows[reach]
    texts = _texts(store, layer, table, rows)
    ordered = sorted(range(len(rows)), key=lambda place: (-score[rows[place]], -count[rows[place]], texts[place]))
    ordered = ordered[: limit or None]
    return rows[ordered], [texts[place] for place in ordered]


def _texts(store: Store, layer: str, table: Gathered, rows: Int64Array) -> list[str]:
    """Words of rows (counted from the first of two words), joined by spaces; empty for -1."""
    first = table.edges[1]
    lengths = table.lengths
    texts = np.full(len(rows), "", dtype=object)
    for words in range(2, table.longest + 1):
        here = np.flatnonzero((rows >= 0) & (lengths[rows + first] == words))
        terms = table.terms(rows[here] + first, words)
        distinct, place = np.unique(terms, return_inverse=True)
        names = np.array(term_texts(store, layer, distinct), dtype=object)[place.reshape(terms.shape)]
        texts[here] = [" ".join(row) for row in names.tolist()]
    return list(texts)


def _columns(
    store: Store,
    asked: Asked,
    table: Gathered,
    rows: Int64Array,
    texts: list[str],
    held: Bonds,
    scores: dict[str, NDArray[Any]],
    fragment: Int64Array,
    fragments: Int64Array,
) -> Columns:
    first = table.edges[1]
    core = np.where(fragment[rows] >= 0, fragment[rows] - first, -1)
    counts = table.counts[first:]
    return Columns(
        {
            "expression": texts,
            "words": table.lengths[first:][rows],
            "count": counts[rows],
            "documents": table.spread.documents[rows],
            "dp_norm": table.spread.dp_norm[rows],
            "capitals": table.spread.capitals[rows],
            "strength": scores["strength"][rows],
            "completeness": scores["completeness"][rows],
            "weakest_split": held.weakest[rows],
            "cut": held.cut[rows],
            "specific_correlation": held.correlation[rows],
            "best_split_g2": held.g2[rows],
            "c_value": scores["c_value"][rows],
            "c_value_length": scores["c_value_length"][rows],
            "fragment": _texts(store, asked.layer, table, core),
            "fragment_count": np.where(core >= 0, counts[core], 0),
            "fragments": fragments[rows],
        },
        {**asked.settings(store), "tokens": table.total},
    )


def _silent(done: float, tokens: int, phase: str) -> None:
    """Progress where nobody asked for it."""
