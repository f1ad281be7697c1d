"""Which lines make the best examples: good sentences, from different documents, none like another."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from colloc.answers.concordance import merits
from colloc.answers.concordance.finding import Hits
from colloc.answers.concordance.passages import Passage, PassageReader, read_many
from colloc.counts.spans import apply_layer
from colloc.counts.words import slice_word_counts
from colloc.records import NO_TERM, FloatArray, Int64Array, UInt32Array
from colloc.store import vocabulary
from colloc.store.connection import Store
from colloc.tokens.folding import fold

MOST_CANDIDATES = 1500
"""Hits that are looked at: a seeded sample where there are more."""
READ_FOR_EACH = 6
"""Sentences whose text is read for each example wanted, at least ``LEAST_READ``."""
LEAST_READ = 40
LIKE = 0.5
"""Sentences that share more than this part of their words (Jaccard) are taken for the same."""
_FEWEST_WORDS = 3


@dataclass(frozen=True, slots=True)
class _Candidates:
    """Sentences around hits with what the stream alone says about them."""

    rows: Int64Array
    spans: list[tuple[int, int, int]]
    points: FloatArray


def choose(store: Store, reader: PassageReader, hits: Hits, layer: str, limit: int, seed: int) -> Int64Array:
    """Row numbers of the best examples, best first.

    Documents that have given an example already come after those that have not.

    Parameters
    ----------
    limit : int
        How many; 0 for as many as there are among the candidates.
    """
    rows = np.arange(len(hits))
    if len(rows) > MOST_CANDIDATES:
        rows = np.sort(np.random.default_rng(seed).choice(len(hits), MOST_CANDIDATES, replace=False))
    candidates = _weighed(store, reader, hits, layer, rows)
    wanted = limit or len(candidates.rows)
    order = _varied(candidates, hits.documents)
    read = max(LEAST_READ, READ_FOR_EACH * wanted)
    passages: list[Passage] = []
    points: list[float] = []
    while True:
        rest = order[len(passages) : read].tolist()
        fresh = read_many(reader, [candidates.spans[row] for row in rest])
        passages += fresh
        points += [candidates.points[row] + _text_points(one) for row, one in zip(rest, fresh, strict=True)]
        best = np.lexsort((order[: len(points)], -np.array(points)))
        picked = _different(passages, hits.documents[candidates.rows[order]], best.tolist(), wanted)
        if len(picked) == wanted or len(passages) == len(order):
            return candidates.rows[order[picked]]
        # Much of what was read is alike: read on.
        read *= 4


def _weighed(store: Store, reader: PassageReader, hits: Hits, layer: str, rows: Int64Array) -> _Candidates:
    counts = slice_word_counts(store, layer).tokens
    common = merits.commonness((counts * (1e6 / max(int(counts.sum()), 1))).astype(np.float64))
    of_type = vocabulary.layer_map(store, layer)
    spans, kept, points = [], [], []
    for row in rows.tolist():
        place, document, partner = int(hits.places[row]), int(hits.documents[row]), int(hits.partners[row])
        searched = set(range(place, place + hits.length))
        low, high = place, place + hits.length
        if partner >= 0:
            searched |= set(range(partner, partner + hits.partner_length))
            low, high = min(low, partner), max(high, partner + hits.partner_length)
        first, stop = reader.sentence(low, high - low, document)
        if stop - first < max(_FEWEST_WORDS, len(searched) + 1):
            continue
        types = reader.types(first, stop)
        others = np.ones(stop - first, np.bool_)
        others[[token - first for token in searched]] = False
        kept.append(row)
        spans.append((first, stop, document))
        points.append(merits.length_points(stop - first) + _common_points(common, of_type, types[others]))
    return _Candidates(np.array(kept, np.int64), spans, np.array(points, np.float64))


def _common_points(common: FloatArray, of_type: UInt32Array, types: UInt32Array) -> float:
    terms = apply_layer(of_type, types)
    return merits.common_points(common[terms[terms != NO_TERM]])


def _varied(candidates: _Candidates, documents: Int64Array) -> Int64Array:
    """Candidates by points, the best of every document before the second best of any."""
    order = np.lexsort((candidates.rows, -candidates.points))
    owners = documents[candidates.rows[order]]
    grouped = np.argsort(owners, kind="stable")
    sizes = np.diff(np.flatnonzero(np.diff(owners[grouped], prepend=-1, append=-1)))
    turn = np.empty(len(order), np.int64)
    turn[grouped] = np.arange(len(order)) - np.repeat(np.cumsum(sizes) - sizes, sizes)
    return order[np.argsort(turn, kind="stable")]


def _text_points(passage: Passage) -> float:
    words = _words(passage)
    return merits.text_points(passage.text, words) + merits.backward_points([fold(word) for word in words])


def _words(passage: Passage) -> list[str]:
    return [passage.text[start:end] for start, end in zip(passage.starts.tolist(), passage.ends.tolist(), strict=True)]


def _different(passages: list[Passage], documents: Int64Array, best: list[int], wanted: int) -> list[int]:
    """The first ``wanted`` that are not like one taken before, first one a document, then the others."""
    taken: list[int] = []
    words: list[frozenset[str]] = []
    used: set[int] = set()
    for again in (False, True):
        for row in best:
            if len(taken) == wanted:
                return taken
            if row in taken or (not again and int(documents[row]) in used):
                continue
            own = frozenset(map(fold, _words(passages[row])))
            if any(len(own & other) > LIKE * len(own | other) for other in words):
                continue
            taken.append(row)
            words.append(own)
            used.add(int(documents[row]))
    return taken
