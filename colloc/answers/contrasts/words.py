"""Words that two sub-corpora use at different rates."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Literal, get_args

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.contrasts.gathering import word_counts_by_document
from colloc.answers.contrasts.saying import both_directions, say
from colloc.answers.contrasts.sides import resolve_sides
from colloc.answers.questions import built_spec
from colloc.counts.words import slice_word_counts
from colloc.errors import NotSeenError, UsageError
from colloc.measures.contrast import as_table, keyness_g2, keyness_g2_two_cells, log_ratio_interval
from colloc.measures.discoveries import log_q_values
from colloc.measures.exact import association_log_p
from colloc.measures.subcorpora.documents import document_test, permuted_p
from colloc.records import FloatArray
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT
from colloc.store import vocabulary
from colloc.store.connection import Store

ContrastOrder = Literal["documents", "bound", "log_ratio", "g2"]


def contrast_words(
    store: Store,
    *,
    this: Sequence[str],
    that: Sequence[str] = (),
    where: Sequence[str] = (),
    layer: str | None = None,
    pattern: str | None = None,
    min_count: int = DEFAULT_MIN_COUNT,
    min_docs: int = 1,
    sort: ContrastOrder = "documents",
    limit: int = 50,
    permutations: int = 0,
    seed: int = 1,
    memory: int = DEFAULT_MEMORY,
) -> Columns:
    """Words more frequent on one side than on the other, both directions in one table.

    Parameters
    ----------
    this, that : sequences of str
        Slices; without ``that`` all other documents.
    min_count : int
        Least count on both sides together; all such words are tested.
    min_docs : int
        Least number of documents of both sides that hold the word; acts on what is shown.
    sort : {"documents", "bound", "log_ratio", "g2"}
        By the test over documents; by the end of the log ratio's interval that is nearer to 0; by the log ratio; by G2.
    permutations : int
        Exchanges of document labels from which ``document_p`` comes; 0: none, and ``document_q`` from the curve.

    Returns
    -------
    Columns
        word, log_ratio, formula_low, formula_high (bits, 95 %), count_this, count_that, per_million_this,
        per_million_that, documents_this, documents_that, g2, g2_two_cells, q, document_z, document_q (or
        document_p), says. Words of this come first (log_ratio above 0), then words of that.
    """
    check_order(sort)
    sides = resolve_sides(store, this, that, where)
    layer = layer or built_spec(store).layer
    frequencies = [slice_word_counts(store, layer, side) for side in sides.both]
    totals = [int(counts.tokens.sum()) for counts in frequencies]
    tested = frequencies[0].tokens + frequencies[1].tokens >= max(min_count, 1)
    if pattern is not None:
        matching = np.zeros(len(tested), dtype=bool)
        matching[vocabulary.terms_matching(store, layer, pattern)] = True
        tested &= matching
    terms = np.flatnonzero(tested)
    if not len(terms):
        raise NotSeenError(f"{store.path}: no word occurs {min_count} times in the two slices; lower --min-count")
    count = (frequencies[0].tokens[terms], frequencies[1].tokens[terms])
    held = (frequencies[0].documents[terms], frequencies[1].documents[terms])
    arguments = (count[0], totals[0], count[1], totals[1])
    log_ratio, interval = log_ratio_interval(*arguments)
    g2 = keyness_g2(*arguments)
    log_q = log_q_values(association_log_p(*as_table(*arguments)))
    z, document_log_p = np.zeros(len(terms)), np.full(len(terms), np.nan)
    largest = (np.zeros(len(terms), np.int64), np.zeros(len(terms), np.int64))
    permuted = np.full(len(terms), np.nan)
    lots = word_counts_by_document(store, layer, sides.both, terms, held[0] + held[1], memory)
    for lot, found in lots:
        if permutations and (lot.start, lot.stop) != (0, len(terms)):
            raise UsageError(
                "the words do not fit into memory together, which permutations need: raise --memory or --min-count"
            )
        result = document_test(found.rates, found.in_this)
        z[lot], document_log_p[lot] = result.rank_z, result.log_p
        largest[0][lot], largest[1][lot] = found.largest_on(True), found.largest_on(False)
        if permutations:
            permuted = permuted_p(found.rates, found.in_this, permutations, seed)
    document_q = permuted if permutations else np.exp(log_q_values(document_log_p))
    more_in_this = log_ratio >= 0
    score = ranking_score(sort, document_log_p, log_ratio, interval.low, interval.high, g2)
    shown = np.flatnonzero(held[0] + held[1] >= min_docs)
    rows = shown[both_directions(score[shown], [np.abs(g2[shown])], more_in_this[shown], limit)]
    columns: dict[str, Any] = {
        "word": vocabulary.term_texts(store, layer, terms[rows]),
        "log_ratio": log_ratio[rows],
        "formula_low": interval.low[rows],
        "formula_high": interval.high[rows],
        "count_this": count[0][rows],
        "count_that": count[1][rows],
        "per_million_this": count[0][rows] * (1e6 / max(totals[0], 1)),
        "per_million_that": count[1][rows] * (1e6 / max(totals[1], 1)),
        "documents_this": held[0][rows],
        "documents_that": held[1][rows],
        "g2": g2[rows],
        "g2_two_cells": keyness_g2_two_cells(*(np.asarray(a)[rows] if np.ndim(a) else a for a in arguments)),
        "q": np.exp(log_q[rows]),
        "document_z": z[rows],
        "document_p" if permutations else "document_q": document_q[rows],
        "says": say(
            np.exp(log_q[rows]),
            document_q[rows],
            (count[0][rows], count[1][rows]),
            (largest[0][rows], largest[1][rows]),
            more_in_this[rows],
        ),
    }
    settings = {
        "store": str(store.path),
        "layer": layer,
        "this": sides.this,
        "that": sides.that,
        "pattern": pattern,
        "min_count": min_count,
        "min_docs": min_docs,
        "sort": sort,
        "limit": limit,
        "tested": len(terms),
        "tokens_this": totals[0],
        "tokens_that": totals[1],
        **({"permutations": permutations, "seed": seed} if permutations else {}),
    }
    return Columns(columns, settings)


def check_order(sort: str) -> None:
    """Raise UsageError for an order that contrasts of words do not have."""
    if sort not in get_args(ContrastOrder):
        raise UsageError(f"a contrast of words is sorted by one of {', '.join(get_args(ContrastOrder))}, not {sort!r}")


def ranking_score(
    sort: str, document_log_p: FloatArray, log_ratio: FloatArray, low: FloatArray, high: FloatArray, g2: FloatArray
) -> FloatArray:
    """What rows are sorted by, highest first, whichever side they are more frequent on."""
    if sort == "documents":
        return -document_log_p
    if sort == "bound":
        return np.where(log_ratio >= 0, low, -high)
    return np.abs(log_ratio) if sort == "log_ratio" else np.abs(g2)
