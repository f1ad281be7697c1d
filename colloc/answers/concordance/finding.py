"""Where expressions stand: one pass over the blocks that can hold them."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colloc.answers.concordance.matching import Search
from colloc.counts.placing import document_places
from colloc.counts.selection import Selection, selection_of, slice_selection
from colloc.counts.spans import PIECE, read_stretches, slices_in, window_spans
from colloc.records import NO_TERM, Int64Array, TokenSpan, UInt32Array
from colloc.settings import Inside
from colloc.store.connection import Store
from colloc.store.stream import block_heads, block_types, read_block

_FAR = np.int64(2**62)
_FEW_TYPES = 16
"""Spellings of a word up to which each is compared with the stream."""


@dataclass(frozen=True, slots=True)
class Hits:
    """Places of the first expression, in the order of the text.

    Attributes
    ----------
    places : int64 array, shape (n,)
        Token of the stream where it begins.
    documents : int64 array, shape (n,)
        Document numbers.
    length : int
        Its tokens.
    partners : int64 array, shape (n,)
        Where the nearest second expression begins; -1 where none was asked for.
    distances : int64 array, shape (n,)
        Words from one to the other, negative where the second stands before; 0 where none was asked for.
    partner_length : int
    """

    places: Int64Array
    documents: Int64Array
    length: int
    partners: Int64Array
    distances: Int64Array
    partner_length: int

    def __len__(self) -> int:
        return len(self.places)

    def take(self, rows: NDArray[np.int64]) -> Hits:
        """Some of the hits, in the order given."""
        return Hits(
            self.places[rows],
            self.documents[rows],
            self.length,
            self.partners[rows],
            self.distances[rows],
            self.partner_length,
        )


def find(store: Store, search: Search, *, left: int, right: int, inside: Inside, where: str) -> Hits:
    """Every place of the first expression; with a second one only those that have it in reach.

    Parameters
    ----------
    left, right : int
        Words of reach of the second expression: its nearest word stands at distance 1..left before the first word
        or 1..right after the last word of the first expression.
    inside : {"sentence", "paragraph", "document"}
        Neither an expression nor the reach crosses the border of such a unit.
    where : str
        Canonical slice; empty for all documents.
    """
    whole = slice_selection(store, where)
    selection = _needed(store, search, whole, max(left, right) + sum(search.lengths))
    types = search.types_of(0)
    if search.lengths == (1,) and len(types) <= _FEW_TYPES:
        found = _of_one_word(store, types, selection)
    else:
        found = _of_expressions(store, search, selection, left, right, inside)
    nothing = np.empty(0, np.int64)
    at, partners, distances = (np.concatenate(arrays) for arrays in zip((nothing,) * 3, *found, strict=True))
    documents = document_places(store, whole)
    owner = documents.numbers[documents.of(_selection_places(whole, at))] if len(at) else nothing
    partner_length = search.lengths[1] if len(search.lengths) > 1 else 0
    return Hits(at, owner, search.lengths[0], partners, distances, partner_length)


_Found = tuple[Int64Array, Int64Array, Int64Array]
"""Places, partners and distances, as `Hits` has them."""


def _of_one_word(store: Store, types: Int64Array, selection: Selection) -> Iterator[_Found]:
    """A single word: no border of a unit matters to it, and its few types are soon compared."""
    for head in block_heads(store):
        _, parts = slices_in(selection, head)
        tokens = read_block(store, head.number).tokens if parts else np.empty(0, np.uint32)
        for part in parts:
            fits = np.zeros(part.stop - part.start, np.bool_)
            for one in types.tolist():
                fits |= tokens[part] == one
            places = np.flatnonzero(fits) + (head.first_token + part.start)
            yield places, np.full(len(places), -1), np.zeros(len(places), np.int64)


def _of_expressions(
    store: Store, search: Search, selection: Selection, left: int, right: int, inside: Inside
) -> Iterator[_Found]:
    """Several words, or too many types to compare each."""
    words = sum(search.lengths)
    for first, span in _spans(store, search, selection, inside, left + words, right + words):
        places, partners, distances = _in_span(span, search.lengths, left, right)
        if len(search.lengths) > 1:
            partners = stream_places(selection, partners + first)
        yield stream_places(selection, places + first), partners, distances


def _needed(store: Store, search: Search, selection: Selection, reach: int) -> Selection:
    """The part of a selection that lies in blocks where every part of the search can be in reach."""
    parts = [search.types_of(part) for part in range(sum(search.lengths))]
    heads = block_heads(store)
    firsts = np.array([head.first_token for head in heads], np.int64)
    stops = np.array([head.first_token + head.n_tokens for head in heads], np.int64)
    there = np.zeros((len(heads), len(parts)), np.bool_)
    for head in heads:
        types = block_types(store, head.number)
        there[head.number] = [_share_some(part, types) for part in parts]
    needed: list[int] = []
    for number in np.flatnonzero(there.any(axis=1)).tolist():
        near = slice(
            int(np.searchsorted(stops, firsts[number] - reach, side="right")),
            int(np.searchsorted(firsts, stops[number] + reach)),
        )
        if there[near].any(axis=0).all():
            # What lies between two of them within reach is needed as well: it parts them, and may end a unit.
            between = needed and firsts[number] - stops[needed[-1]] <= reach
            needed += range(needed[-1] + 1 if between else number, number + 1)
    begins = [np.maximum(selection.begins, firsts[number]) for number in needed]
    ends = [np.minimum(selection.stops, stops[number]) for number in needed]
    if not begins:
        return selection_of([], [])
    first, last = np.concatenate(begins), np.concatenate(ends)
    return selection_of(first[last > first], last[last > first])


def _share_some(part: Int64Array, types: UInt32Array) -> bool:
    """Whether two ascending arrays have an element in common."""
    if len(part) > len(types):
        part, types = types.astype(np.int64), part.astype(np.uint32)
    place = np.searchsorted(types, part)
    inside = place < len(types)
    return bool((types[place[inside]] == part[inside]).any())


def _spans(
    store: Store, search: Search, selection: Selection, inside: Inside, back: int, ahead: int
) -> Iterator[tuple[int, TokenSpan]]:
    """Spans of masks, each with the place of its first token in the selection."""
    stretches = read_stretches(store, search.masks, selection, inside)
    place = 0
    for span in window_spans(stretches, 0, len(selection), back, ahead, PIECE):
        masks = span.terms
        gone = masks == NO_TERM
        if gone.any():
            masks = np.where(gone, np.uint32(0), masks)
        begin = place - span.context
        yield begin, TokenSpan(masks, span.units, span.context, span.ahead)
        place = begin + len(span.terms) - span.ahead


def _in_span(
    span: TokenSpan, lengths: tuple[int, ...], left: int, right: int
) -> tuple[Int64Array, Int64Array, Int64Array]:
    """Offsets of the hits that a span counts, of their partners, and the distances between them."""
    n = len(span.terms)
    hits = _matches(span, 0, lengths[0])
    hits = hits[(hits >= span.context) & (hits < n - span.ahead)]
    if len(lengths) == 1:
        return hits, np.full(len(hits), -1, np.int64), np.zeros(len(hits), np.int64)
    partners = _matches(span, lengths[0], lengths[1])
    if not len(partners) or not len(hits):
        nothing = np.empty(0, np.int64)
        return nothing, nothing, nothing
    length, partner_length = lengths
    unit_begin, unit_end = _bounds(span, hits)
    after = np.searchsorted(partners, hits + length)
    next_one = partners[np.minimum(after, len(partners) - 1)]
    ahead = np.where(
        (after < len(partners)) & (next_one + partner_length <= unit_end), next_one - (hits + length - 1), _FAR
    )
    ahead[ahead > right] = _FAR
    before = np.searchsorted(partners, hits - partner_length, side="right") - 1
    last_one = partners[np.maximum(before, 0)]
    behind = np.where((before >= 0) & (last_one >= unit_begin), hits - (last_one + partner_length - 1), _FAR)
    behind[behind > left] = _FAR
    forward = ahead <= behind
    near = np.minimum(ahead, behind) < _FAR
    distance = np.where(forward, ahead, -behind)
    return hits[near], np.where(forward, next_one, last_one)[near], distance[near]


def _matches(span: TokenSpan, first_part: int, length: int) -> Int64Array:
    """Offsets where the parts of one expression follow each other inside one unit."""
    masks = span.terms
    found = np.flatnonzero(masks & np.uint32(1 << first_part))
    for part in range(1, length):
        found = found[found + part < len(masks)]
        found = found[(masks[found + part] & np.uint32(1 << (first_part + part))) != 0]
    if length > 1 and len(found):
        found = found[found + length <= _bounds(span, found)[1]]
    return found


def _bounds(span: TokenSpan, offsets: Int64Array) -> tuple[Int64Array, Int64Array]:
    """Where the unit of each offset begins, and where it ends."""
    edges = np.concatenate([[0], span.units[span.units > 0], [len(span.terms)]])
    unit = np.searchsorted(edges[:-1], offsets, side="right") - 1
    return edges[unit], edges[unit + 1]


def stream_places(selection: Selection, places: Int64Array) -> Int64Array:
    """Tokens of the stream that stand at some places of a selection."""
    stretch = np.searchsorted(selection.places, places, side="right") - 1
    if not len(selection.begins):
        return places
    stretch = np.minimum(stretch, len(selection.begins) - 1)
    return selection.begins[stretch] + places - selection.places[stretch]


def _selection_places(selection: Selection, places: Int64Array) -> Int64Array:
    stretch = np.searchsorted(selection.begins, places, side="right") - 1
    return selection.places[stretch] + places - selection.begins[stretch]
