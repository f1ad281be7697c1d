"""Blocks of the stored stream as spans to count in: layer applied, slice cut out, no pair lost at a seam."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from colloc.counts.selection import Selection
from colloc.counts.units import unit_terms
from colloc.records import NO_TERM, Int64Array, TokenSpan, UInt32Array
from colloc.settings import Inside
from colloc.store.connection import Store
from colloc.store.stream import Block, BlockHead, block_heads, read_block

PIECE = 2**17
"""Tokens of a span: arrays of this length stay in the processor's cache."""


@dataclass(frozen=True, slots=True)
class Stretch:
    """Terms of consecutive places of a selection.

    Attributes
    ----------
    first : int
        Place of the first term in the selection.
    units : int64 array
        Places (not offsets) where units begin, ascending.
    """

    first: int
    terms: UInt32Array
    units: Int64Array

    @property
    def stop(self) -> int:
        """The place after the last term."""
        return self.first + len(self.terms)

    def part(self, begin: int, stop: int) -> Stretch:
        """The places from ``begin`` up to ``stop`` as far as they are here."""
        begin, stop = max(begin, self.first), min(stop, self.stop)
        inner = slice(*np.searchsorted(self.units, [begin, stop]))
        return Stretch(begin, self.terms[begin - self.first : max(begin, stop) - self.first], self.units[inner])


def apply_layer(layer: UInt32Array, types: UInt32Array) -> UInt32Array:
    """Terms of types; `NO_TERM` stays."""
    gone = types == NO_TERM
    if not gone.any():
        return layer.take(types)
    terms = np.full(len(types), NO_TERM)
    terms[~gone] = layer[types[~gone]]
    return terms


def unit_starts(block: Block, inside: Inside) -> Int64Array:
    """Offsets in the block where units begin, ascending; each document begins one."""
    if inside == "document":
        return block.document_starts
    parts = [block.sentences if inside == "sentence" else block.paragraphs, block.document_starts]
    if inside == "sentence" and not block.continues:
        parts.append(np.zeros(1, np.int64))
    return _union(*parts)


def _union(*sorted_places: Int64Array) -> Int64Array:
    """Ascending places together, each once; numpy's stable sort merges them, its ``unique`` would hash them."""
    places: Int64Array = np.sort(np.concatenate(sorted_places), kind="stable")
    if len(places) > 1:
        places = places[np.concatenate([[True], places[1:] != places[:-1]])]
    return places


def read_stretches(
    store: Store, layer: UInt32Array, selection: Selection, inside: Inside, begin: int = 0, stop: int | None = None
) -> Iterator[Stretch]:
    """The places ``begin`` to ``stop`` of a selection, a block or less at a time.

    Blocks that hold nothing of it are not read.
    """
    stop = len(selection) if stop is None else min(stop, len(selection))
    for head in block_heads(store):
        ranges = _ranges_in(selection, head)
        if ranges.start == ranges.stop:
            continue
        first = selection.places[ranges.start] + max(0, head.first_token - selection.begins[ranges.start])
        last = selection.places[ranges.stop - 1]
        last += min(selection.stops[ranges.stop - 1], head.first_token + head.n_tokens)
        last -= selection.begins[ranges.stop - 1]
        if last > begin and first < stop:
            yield _stretch(read_block(store, head.number), layer, selection, ranges, inside).part(begin, stop)


def _ranges_in(selection: Selection, head: BlockHead) -> slice:
    """Which stretches of the selection have tokens in a block."""
    begin = np.searchsorted(selection.stops, head.first_token, side="right")
    stop = np.searchsorted(selection.begins, head.first_token + head.n_tokens, side="left")
    return slice(int(begin), max(int(begin), int(stop)))


def slices_in(selection: Selection, head: BlockHead) -> tuple[int, list[slice]]:
    """Offsets of a block's tokens that are selected, and the place in the selection of the first of them."""
    ranges = _ranges_in(selection, head)
    begins, stops = selection.begins[ranges], selection.stops[ranges]
    if not len(begins):
        return 0, []
    inner = zip(
        np.maximum(begins - head.first_token, 0).tolist(),
        np.minimum(stops - head.first_token, head.n_tokens).tolist(),
        strict=True,
    )
    first = int(selection.places[ranges.start] + max(0, head.first_token - begins[0]))
    return first, [slice(low, high) for low, high in inner]


def _stretch(block: Block, layer: UInt32Array, selection: Selection, ranges: slice, inside: Inside) -> Stretch:
    begins, stops, places = selection.begins[ranges], selection.stops[ranges], selection.places[ranges]
    first, inner = slices_in(selection, block.head)
    types = [block.tokens[part] for part in inner]
    starts = unit_starts(block, inside) + block.first_token
    range_of = np.searchsorted(begins, starts, side="right") - 1
    chosen = range_of >= 0
    chosen[chosen] &= starts[chosen] < stops[range_of[chosen]]
    starts, range_of = starts[chosen], range_of[chosen]
    units = _union(starts - begins[range_of] + places[range_of], places[places >= first])
    return Stretch(first, apply_layer(layer, types[0] if len(types) == 1 else np.concatenate(types)), units)


def window_spans(
    stretches: Iterator[Stretch], begin: int, stop: int, context: int, ahead: int, piece: int = PIECE
) -> Iterator[TokenSpan]:
    """Spans that together count the places ``begin`` to ``stop`` once each.

    Parameters
    ----------
    stretches : iterator of Stretch
        From ``begin - context`` to ``stop + ahead``, as far as there is anything.
    context, ahead : int
        How many tokens a window reaches back and forward.
    """
    waiting: Stretch | None = None
    done = begin
    for stretch in stretches:
        waiting = stretch if waiting is None else _joined(waiting, stretch)
        # the last tokens here may have neighbours in the next stretch
        limit = min(stop, waiting.stop - ahead)
        yield from _pieces(waiting, done, limit, context, ahead, piece)
        done = max(done, limit)
        waiting = waiting.part(done - context, waiting.stop)
    if waiting is not None:
        yield from _pieces(waiting, done, min(stop, waiting.stop), context, ahead, piece)


def _joined(one: Stretch, other: Stretch) -> Stretch:
    return Stretch(one.first, np.concatenate([one.terms, other.terms]), np.concatenate([one.units, other.units]))


def _pieces(stretch: Stretch, begin: int, stop: int, context: int, ahead: int, piece: int) -> Iterator[TokenSpan]:
    for first in range(begin, stop, piece):
        last = min(first + piece, stop)
        part = stretch.part(first - context, last + ahead)
        yield TokenSpan(part.terms, part.units - part.first, first - part.first, part.stop - last)


def whole_units(
    stretches: Iterator[Stretch], begin: int, stop: int
) -> Iterator[tuple[UInt32Array, Int64Array, Int64Array]]:
    """The different terms of the units that begin at the places ``begin`` to ``stop``.

    ``stretches`` run from ``begin`` to the end of the selection; no more are taken than needed. However long a unit
    is, only its different terms are kept.

    Yields
    ------
    terms, starts
        As `colloc.counts.units.unit_terms` gives them.
    places : int64 array
        The place where each of the units begins.
    """
    open_terms: UInt32Array | None = None
    open_place = begin
    for stretch in stretches:
        starts = stretch.units[stretch.units >= begin]
        head = stretch.part(stretch.first, int(starts[0])) if len(starts) else stretch
        if open_terms is not None:
            open_terms = _distinct(np.concatenate([open_terms, head.terms]))
        if not len(starts):
            continue
        if open_terms is not None:
            yield _one_unit(open_terms, open_place)
            open_terms = None
        past = int(np.searchsorted(starts, stop))
        if past < len(starts):
            yield _units_between(stretch, int(starts[0]), int(starts[past]))
            return
        open_place = int(starts[-1])
        yield _units_between(stretch, int(starts[0]), open_place)
        open_terms = _distinct(stretch.part(open_place, stretch.stop).terms)
    if open_terms is not None:
        yield _one_unit(open_terms, open_place)


def _distinct(terms: UInt32Array) -> UInt32Array:
    return np.unique(terms[terms != NO_TERM])


def _one_unit(terms: UInt32Array, place: int) -> tuple[UInt32Array, Int64Array, Int64Array]:
    there = min(len(terms), 1)
    return terms, np.zeros(there, np.int64), np.full(there, place, np.int64)


def _units_between(stretch: Stretch, begin: int, stop: int) -> tuple[UInt32Array, Int64Array, Int64Array]:
    part = stretch.part(begin, stop)
    terms, starts = unit_terms(TokenSpan(part.terms, part.units - part.first))
    places = part.units
    if len(places) > len(starts):
        filled = np.logical_or.reduceat(part.terms != NO_TERM, places - part.first)
        places = places[filled]
    return terms, starts, places
