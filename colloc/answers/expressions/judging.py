"""Which sequences are listed, and how strong each is: alike for expressions with and without open slots."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.answers.expressions.folding import completeness, folded_into, wholes
from colloc.answers.expressions.gathering import Gathered
from colloc.answers.expressions.scoring import Bonds, bonds
from colloc.answers.expressions.settings import COMMON_SHARE, NAME_SHARE, Asked
from colloc.records import FloatArray, Int64Array
from colloc.store.connection import Store
from colloc.store.vocabulary import term_texts

SLOT = "_"
"""Stands for an open slot in the text of an expression."""


@dataclass(frozen=True, slots=True)
class Judged:
    """Arrays by sequence, beginning with the first of two words.

    Attributes
    ----------
    held : Bonds
    completeness : float64 array
    strength : float64 array
        What expressions are ranked by: `holding` of the sequence or of the strongest of its fragments, times its
        completeness.
    fit : bool array
        Whether the sequence passes what was asked of documents, names and word classes.
    listed : bool array
        Whether it is also no fragment, not too long or short, and not made of common words only.
    fragment : int64 array
        Row in the table of the strongest fragment folded into it, -1 for none.
    fragments : int64 array
        How many fragments.
    """

    held: Bonds
    completeness: FloatArray
    strength: FloatArray
    fit: NDArray[np.bool_]
    listed: NDArray[np.bool_]
    fragment: Int64Array
    fragments: Int64Array


def judge(table: Gathered, asked: Asked, matched: Int64Array | None = None) -> Judged:
    """All that the table itself says of its sequences.

    Parameters
    ----------
    matched : int64 array, optional
        Occurrences that follow the pattern asked for, of all sequences of two words and more.
    """
    options, first = asked.options, table.edges[1]
    own = np.arange(first, table.edges[-1])
    held = bonds(table)
    lengths = table.lengths[first:]
    # what was looked up on top of the frequent sequences, or is longer than they, is part of no rule
    fit = (table.counts[first:] >= options.min_count) & (lengths <= options.max_words + 1)
    fit &= table.spread.documents >= asked.min_docs
    if options.names == "drop":
        # NaN, where every word begins a sentence or is a single letter (headings), compares as false
        fit &= table.spread.capitals < NAME_SHARE
    if matched is not None:
        fit &= 2 * matched >= table.counts[first:]
    whole = wholes(table, fit) if options.fragments == "fold" else own
    fragment, best, fragments = folded_into(whole, np.where(fit, holding(table, held.weakest), -np.inf), first)
    complete = completeness(table)
    listed = fit & (whole == own) & (lengths >= options.min_words) & (lengths <= options.max_words)
    if options.common == "drop":
        listed &= ~only_common(table)
    # what repels itself gets no better by being incomplete
    strength = np.where(best > 0, best * complete, best)
    return Judged(held, complete, strength, fit, listed, fragment, fragments)


def holding(table: Gathered, weakest: FloatArray) -> FloatArray:
    """How well sequences hold together: weakest split in bits, times log2 of 1 + the occurrences elsewhere.

    Elsewhere is outside the document that holds most of them, so that one document's repeats and names carry no
    weight; where all tokens are in one document, all occurrences count. (Own definition.)
    """
    spread = table.spread
    return weighed(weakest, table.counts[table.edges[1] :], spread.documents, spread.largest)


def weighed(weakest: FloatArray, counts: Int64Array, documents: Int64Array, largest: Int64Array) -> FloatArray:
    """The weakest split weighed by occurrences elsewhere; all arrays by sequence."""
    alone = documents.max(initial=0) < 2
    elsewhere = counts if alone else counts - largest
    with np.errstate(invalid="ignore"):  # minus infinity times 0: what was looked up and never occurs
        result: FloatArray = weakest * np.log2(1.0 + elsewhere)
    return result


def only_common(table: Gathered) -> NDArray[np.bool_]:
    """Which sequences are made only of the words that make up the first half of the running text."""
    common = np.zeros(table.edges[-1], bool)
    common[: table.edges[1]] = common_terms(table.counts[: table.edges[1]])
    for words in range(2, table.longest + 1):
        rows = table.rows(words)
        common[rows] = common[table.left[rows]] & common[table.right[rows]]
    return common[table.edges[1] :]


def common_terms(counts: Int64Array) -> NDArray[np.bool_]:
    """Which terms make up the first half of the running text; ``counts`` by term."""
    order = np.argsort(-counts, kind="stable")
    before = np.cumsum(counts[order]) - counts[order]
    common = np.zeros(len(counts), bool)
    common[order[before < COMMON_SHARE * counts.sum()]] = True
    return common


def in_order(
    store: Store, layer: str, table: Gathered, rows: Int64Array, score: NDArray[Any], limit: int
) -> tuple[Int64Array, list[str]]:
    """Rows of the table by score, count and text, with the texts; text is made only for what can reach the list.

    Parameters
    ----------
    score : array
        Of all sequences of two words and more.
    limit : int
        0 for all.
    """
    first, count = table.edges[1], table.counts
    values = score[rows - first]
    rows, values = reaching(rows, values, count[rows], limit)
    found = texts(store, layer, table, rows)
    ordered = sorted(range(len(rows)), key=lambda place: (-values[place], -count[rows[place]], found[place]))
    ordered = ordered[: limit or None]
    return rows[ordered], [found[place] for place in ordered]


def reaching(rows: Int64Array, values: NDArray[Any], counts: Int64Array, limit: int) -> tuple[Int64Array, NDArray[Any]]:
    """Rows and their scores, highest first, with all that tie with the last one of the list: texts decide then."""
    order = np.lexsort((-counts, -values))
    if limit and len(rows) > limit:
        last = order[limit - 1]
        reach = (values > values[last]) | ((values == values[last]) & (counts >= counts[last]))
        order = order[reach[order]]
    return rows[order], values[order]


def texts(store: Store, layer: str, table: Gathered, rows: Int64Array) -> list[str]:
    """The words of rows with spaces between them, `SLOT` for open slots; empty for row -1."""
    found = np.full(len(rows), "", dtype=object)
    level = table.level_of(rows)
    for index in np.unique(level[rows >= 0]).tolist():
        here = np.flatnonzero((level == index) & (rows >= 0))
        shape = table.levels[index].words
        terms = table.terms(rows[here], len(shape))
        distinct, place = np.unique(terms, return_inverse=True)
        names = np.array(term_texts(store, layer, distinct), dtype=object)[place.reshape(terms.shape)]
        spaced = np.full((len(here), shape[-1] + 1), SLOT, dtype=object)
        spaced[:, list(shape)] = names
        found[here] = [" ".join(row) for row in spaced.tolist()]
    return list(found)
