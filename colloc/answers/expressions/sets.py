"""Sets of words that meet in whatever order, side by side or with a gap: found, scored, folded and named."""

from __future__ import annotations

from dataclasses import dataclass, fields
from itertools import combinations, pairwise
from math import factorial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.answers.columns import Columns
from colloc.answers.expressions.folding import SHARE, folded_into
from colloc.answers.expressions.judging import common_terms, reaching, weighed
from colloc.answers.expressions.settings import NAME_SHARE, Asked
from colloc.counts.sequences.growing import Grower
from colloc.counts.sequences.sets import SetCounter, WordSets, chained, rows_in
from colloc.measures.multivariate import entropy
from colloc.records import FloatArray, Int64Array
from colloc.store.connection import Store
from colloc.store.vocabulary import term_texts

_LISTED = 5
"""Orders named for each set."""


@dataclass(frozen=True, slots=True, eq=False)
class _Table:
    """Sets of all sizes, the smaller ones first, each with all the smaller sets of its words; arrays by row.

    Attributes
    ----------
    sets : dict of int to WordSets
        By number of words.
    begins : dict of int to int
        Row where they begin.
    lengths, counts, adjacent, documents, largest : int64 arrays
    dp_norm, capitals : float64 arrays
    share : float64 array
        log2 of the mean share of choices of places, over all orders, that hold the words in one order.
    """

    sets: dict[int, WordSets]
    begins: dict[int, int]
    lengths: Int64Array
    counts: Int64Array
    adjacent: Int64Array
    documents: Int64Array
    largest: Int64Array
    dp_norm: FloatArray
    capitals: FloatArray
    share: FloatArray


def ranked_sets(store: Store, asked: Asked, grower: Grower, limit: int, tell: Any) -> Columns:
    """The sets that are asked for, in the order of their rank.

    Returns
    -------
    Columns
        All columns of `colloc.answers.expressions.settings.COLUMNS` that sets have; the expression is the most
        frequent order, of equals the first by text.
    """
    options, counter = asked.options, SetCounter(grower.ground, asked.options.gap)
    table = _counted(grower, counter, asked, tell)
    weakest, correlation = _bonds(grower, table)
    fit = (table.counts >= options.min_count) & (table.documents >= asked.min_docs)
    if options.names == "drop":
        fit &= table.capitals < NAME_SHARE
    strength = weighed(weakest, table.counts, table.documents, table.largest)
    whole = _wholes(grower, table, fit) if options.fragments == "fold" else np.arange(len(fit))
    fragment, strength, fragments = folded_into(whole, np.where(fit, strength, -np.inf), 0)
    listed = fit & (whole == np.arange(len(fit))) & (table.lengths >= options.min_words)
    if options.common == "drop":
        listed &= ~_only(table, common_terms(grower.words.tokens))
    scores: dict[str, NDArray[Any]] = {
        "strength": strength,
        "weakest_split": weakest,
        "specific_correlation": correlation,
        "count": table.counts,
        "documents": table.documents,
    }
    rows = np.flatnonzero(listed)
    values = scores[options.rank][rows]
    rows, values = reaching(rows, values, table.counts[rows], limit)
    names = _Names(store, asked.layer, counter, table, np.unique(np.concatenate([rows, fragment[rows]])))
    texts = [names.best(row) for row in rows.tolist()]
    order = sorted(range(len(rows)), key=lambda place: (-values[place], -table.counts[rows[place]], texts[place]))
    order = order[: limit or None]
    rows = rows[order]
    kept = fragment[rows]
    return Columns(
        {
            "expression": [texts[place] for place in order],
            "words": table.lengths[rows],
            **{name: of[rows] for name, of in scores.items()},
            "adjacent": table.adjacent[rows],
            "dp_norm": table.dp_norm[rows],
            "capitals": table.capitals[rows],
            "fragment": [names.best(row) for row in kept.tolist()],
            "fragment_count": np.where(kept >= 0, table.counts[kept], 0),
            "fragments": fragments[rows],
            "order_kinds": np.array([len(names.orders(row)) for row in rows.tolist()], np.int64),
            "order_entropy": np.array([names.entropy(row) for row in rows.tolist()], np.float64),
            "orders": [names.listed(row) for row in rows.tolist()],
        },
        {**asked.settings(store), "tokens": grower.total},
    )


def _counted(grower: Grower, counter: SetCounter, asked: Asked, tell: Any) -> _Table:
    options = asked.options
    wanted: dict[int, list[Int64Array]] = {words: [] for words in range(2, options.max_words + 1)}
    for words in wanted:
        tell((words - 2) / options.max_words, grower.total, f"sets of {words} words")
        found = counter.frequent(words, grower.words.tokens, options.min_count)
        wanted[words].append(found)
        for fewer in range(2, words):
            wanted[fewer] += [found[:, list(chosen)] for chosen in combinations(range(words), fewer)]
    tell(1.0, grower.total, "numbers of sets")
    sets = {words: counter.survey(np.unique(np.concatenate(parts), axis=0)) for words, parts in wanted.items()}
    sizes = [len(one) for one in sets.values()]
    begins = dict(zip(sets, np.cumsum([0, *sizes[:-1]]).tolist(), strict=True))
    joined = {
        field.name: np.concatenate([getattr(one, field.name) for one in sets.values()])
        for field in fields(WordSets)
        if field.name not in ("terms", "chances")
    }
    share = np.concatenate([_share(one) for one in sets.values()])
    return _Table(sets, begins, np.repeat(list(sets), sizes), share=share, **joined)


def _share(found: WordSets) -> FloatArray:
    """log2(count / (choices of places * orders that the words can have)); minus infinity for what never meets."""
    with np.errstate(divide="ignore"):
        result: FloatArray = np.log2(found.counts / (_arrangements(found.terms) * max(found.chances, 1)))
    return result


def _arrangements(terms: Int64Array) -> FloatArray:
    """How many orders the words of each set can have."""
    words = terms.shape[1]
    run, same = np.ones(len(terms)), np.ones(len(terms))
    for one, other in pairwise(range(words)):
        run = np.where(terms[:, one] == terms[:, other], run + 1, 1.0)
        same *= run
    return factorial(words) / same


def _bonds(grower: Grower, table: _Table) -> tuple[FloatArray, FloatArray]:
    """Weakest split and specific correlation of all sets, in bits.

    With q the mean share of choices of places that hold the words in one order, and p that of a word: the smallest
    log2(q(all) / (q(some) q(the others))) over all ways to divide the words in two of which both parts meet, and
    log2(q(all) / product of p). For sequences the first goes over cuts, and q is a count by the tokens.
    """
    single = _alone(grower)
    chains = {words: chained(found.terms) for words, found in table.sets.items()}

    def share(terms: Int64Array) -> FloatArray:
        words = terms.shape[1]
        if words == 1:
            alone: FloatArray = single[terms[:, 0]]
            return alone
        return table.share[table.begins[words] + rows_in(chains[words], terms)]

    weakest, correlation = [], []
    for words, found in table.sets.items():
        own = table.share[table.begins[words] : table.begins[words] + len(found)]
        best = np.full(len(found), np.inf)
        whole = np.flatnonzero(found.counts > 0)
        terms = found.terms[whole]
        for size in range(1, words // 2 + 1):
            for chosen in combinations(range(words), size):
                others = [word for word in range(words) if word not in chosen]
                best[whole] = np.minimum(
                    best[whole], own[whole] - share(terms[:, list(chosen)]) - share(terms[:, others])
                )
        best[np.isinf(best)] = -np.inf
        weakest.append(best)
        correlation.append(own - single[found.terms].sum(axis=1))
    return np.concatenate(weakest), np.concatenate(correlation)


def _alone(grower: Grower) -> FloatArray:
    """log2 of the share of the tokens that each term has."""
    with np.errstate(divide="ignore"):
        result: FloatArray = np.log2(grower.words.tokens / max(grower.total, 1))
    return result


def _wholes(grower: Grower, table: _Table, fit: NDArray[np.bool_]) -> Int64Array:
    """The whole of each set: its own row, or that of a larger one.

    A set is a fragment of one with a word more that takes up `SHARE` of its occurrences, beyond those in which that
    word would stand near by chance, and half of its documents. So it goes on, a word at a time, as long as the whole
    has that share of the occurrences of the fragment.
    """
    single, most = _alone(grower), np.full(len(fit), -1)
    for words, found in table.sets.items():
        if words - 1 not in table.sets:
            continue
        chain, rows = chained(table.sets[words - 1].terms), np.arange(len(found)) + table.begins[words]
        rows = rows[fit[rows]]
        # of several writes to one place the last stays: the most frequent, of equals the first row
        rows = rows[np.lexsort((-rows, table.counts[rows]))]
        terms = found.terms[rows - table.begins[words]]
        chances = _arrangements(terms) * found.chances
        parts = np.full((len(rows), words), -1)
        for word in range(words):
            part = rows_in(chain, np.delete(terms, word, axis=1)) + table.begins[words - 1]
            by_chance = np.exp2(table.share[part] + single[terms[:, word]]) * chances
            inside = fit[part] & (2 * table.documents[rows] >= table.documents[part])
            inside &= table.counts[rows] - by_chance >= SHARE * table.counts[part]
            parts[inside, word] = part[inside]
        row, column = np.nonzero(parts >= 0)
        most[parts[row, column]] = rows[row]
    whole = np.arange(len(fit))
    for _ in table.sets:
        offer = most[whole]
        grows = (offer >= 0) & (table.counts[offer] >= SHARE * table.counts)
        if not grows.any():
            break
        whole = np.where(grows, offer, whole)
    return whole


def _only(table: _Table, terms: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Which sets are made only of some terms."""
    return np.concatenate([terms[found.terms].all(axis=1) for found in table.sets.values()])


class _Names:
    """The orders in which some sets meet, most frequent first, of equals by text."""

    def __init__(self, store: Store, layer: str, counter: SetCounter, table: _Table, rows: Int64Array) -> None:
        self._orders: dict[int, list[tuple[str, int]]] = {}
        rows = rows[rows >= 0]
        for words, found in table.sets.items():
            here = rows[table.lengths[rows] == words]
            if not len(here):
                continue
            index, ordered, counts = counter.orders(found.terms[here - table.begins[words]])
            distinct, place = np.unique(ordered, return_inverse=True)
            spelled = np.array(term_texts(store, layer, distinct), dtype=object)[place.reshape(ordered.shape)]
            for row, order, count in zip(here[index].tolist(), spelled.tolist(), counts.tolist(), strict=True):
                self._orders.setdefault(row, []).append((" ".join(order), count))
        for orders in self._orders.values():
            orders.sort(key=lambda order: (-order[1], order[0]))

    def orders(self, row: int) -> list[tuple[str, int]]:
        """Each order with its count; none for row -1."""
        return self._orders.get(row, [])

    def best(self, row: int) -> str:
        """The most frequent order; empty for row -1."""
        return self._orders[row][0][0] if row >= 0 else ""

    def listed(self, row: int) -> str:
        """The most frequent orders with their counts."""
        return ", ".join(f"{text} {count}" for text, count in self.orders(row)[:_LISTED])

    def entropy(self, row: int) -> float:
        """Of the orders, in bits."""
        return float(entropy([count for _, count in self.orders(row)]))
