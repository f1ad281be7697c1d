"""Directed pairs of terms as 64-bit keys, and sorted runs of them.

A key is ``low << 32 | high << 1 | direction`` with ``low <= high``; direction 0
is the table cell [low, high], 1 the cell [high, low]. Both cells of a pair are
therefore neighbours in sorted order, and keys sort as (low, high) does. Terms
are below 2**31, so nothing overflows.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.kernels import merging, pairs
from colloc.kernels.switch import compiled
from colloc.records import Int64Array, PairBlock, UInt32Array, UInt64Array

_LOW = np.uint64(32)
_ONE = np.uint64(1)
_LOWER_HALF = np.uint64(0xFFFFFFFF)
_DIGIT = 9
"""Bits that one pass of a radix sort looks at: as many places as the nearest cache has room for."""
_HIGH_MASK = np.uint64(0x7FFFFFFF)


@dataclass(frozen=True, slots=True)
class Run:
    """Counted directed pairs.

    Attributes
    ----------
    keys : uint64 array, shape (n,)
        Sorted, unique.
    counts : int64 array, shape (n,)
    """

    keys: UInt64Array
    counts: Int64Array

    def __len__(self) -> int:
        return len(self.keys)


def empty_run() -> Run:
    """A run of no pairs."""
    return Run(np.empty(0, np.uint64), np.empty(0, np.int64))


def pack(first: NDArray[Any], second: NDArray[Any]) -> UInt64Array:
    """Keys of the table cells [first, second]; on the diagonal the direction is 0."""
    return pack_ordered(np.minimum(first, second), np.maximum(first, second), first > second)


def pack_ordered(low: NDArray[Any], high: NDArray[Any], swapped: NDArray[np.bool_]) -> UInt64Array:
    """Keys of pairs low <= high; ``swapped`` says which are the cell [high, low]."""
    keys: UInt64Array = low.astype(np.uint64)
    keys <<= _LOW
    upper = high.astype(np.uint64)
    upper <<= _ONE
    keys |= upper
    keys |= swapped
    return keys


def run_of_keys(keys: UInt64Array) -> Run:
    """Sort ``keys``, whose content is lost, and count equal ones."""
    if len(keys) == 0:
        return empty_run()
    if compiled():
        sorted_keys, spare = keys, np.empty_like(keys)
        for shift, bits in pairs.bit_ranges(*_bits(keys), _DIGIT):
            places = np.zeros(1 << bits, np.int64)
            pairs.find_places(sorted_keys, shift, places)
            pairs.move_keys(sorted_keys, spare, shift, places)
            sorted_keys, spare = spare, sorted_keys
        counts = np.zeros(len(keys), np.int64)
        n = pairs.group_keys(sorted_keys, counts)
        return Run(sorted_keys[:n].copy(), counts[:n].copy())
    keys.sort()
    edges = _group_edges(keys)
    return Run(keys[edges[:-1]], edges[1:] - edges[:-1])


def sorted_run(keys: UInt64Array, counts: Int64Array) -> Run:
    """Unique keys in any order as a run.

    Where keys and places fit into 64 bits together they are sorted as one number each, which
    costs half of an ``argsort``: terms below 2**21 and two million keys fit, and the like.
    """
    if len(keys) == 0:
        return empty_run()
    if compiled():
        return _by_digits(keys, counts)
    term_bits = max(_bits(keys))
    place_bits = len(keys).bit_length()
    if 2 * term_bits + 1 + place_bits > 64:
        order = np.argsort(keys)
        return Run(keys[order], counts[order])
    narrow = (keys >> _LOW) << np.uint64(term_bits + 1) | (keys & _LOWER_HALF)
    narrow <<= np.uint64(place_bits)
    narrow |= np.arange(len(keys), dtype=np.uint64)
    narrow.sort()
    order = (narrow & np.uint64((1 << place_bits) - 1)).astype(np.int64)
    return Run(keys[order], counts[order])


def _bits(keys: UInt64Array) -> tuple[int, int]:
    """Bits of the largest lower term and of the largest higher term."""
    return (int(keys.max()) >> 32).bit_length(), int(high_terms(keys).max()).bit_length()


def _by_digits(keys: UInt64Array, counts: Int64Array) -> Run:
    """`sorted_run` by a radix sort, which carries the counts along."""
    run, other = (keys, counts), (np.empty_like(keys), np.empty_like(counts))
    for shift, bits in pairs.bit_ranges(*_bits(keys), _DIGIT):
        places = np.zeros(1 << bits, np.int64)
        pairs.find_places(run[0], shift, places)
        pairs.move_entries(*run, *other, shift, places)
        run, other = other, run
    return Run(*run)


def merge(runs: Sequence[Run]) -> Run:
    """One run that holds the sum of all. Counts add up in int64.

    The stable sort of numpy finds the sorted stretches and merges them, which
    costs a sixth of sorting anew and needs no packing of counts beside keys.
    """
    filled = [run for run in runs if len(run)]
    if len(filled) < 2:
        return filled[0] if filled else empty_run()
    if compiled():
        # Two and two, the shortest first: each entry is moved as often as the halves double.
        filled.sort(key=len)
        while len(filled) > 1:
            filled = sorted([*filled[2:], _merge_two(filled[0], filled[1])], key=len)
        return filled[0]
    keys = np.concatenate([run.keys for run in filled])
    order = np.argsort(keys, kind="stable")
    keys = keys[order]
    counts = np.concatenate([run.counts for run in filled])[order]
    starts = _group_edges(keys)[:-1]
    return Run(keys[starts], np.add.reduceat(counts, starts))


def _merge_two(one: Run, other: Run) -> Run:
    n = len(one) + len(other)
    keys, counts = np.empty(n, np.uint64), np.empty(n, np.int64)
    n = merging.merge_two(one.keys, one.counts, other.keys, other.counts, keys, counts)
    return Run(keys[:n], counts[:n])


def pair_block(run: Run) -> PairBlock:
    """The run as unordered pairs with both directions beside each other, sorted by (low, high)."""
    if len(run) == 0:
        nothing, none = np.empty(0, np.uint32), np.empty(0, np.int64)
        return PairBlock(nothing, nothing, none, none)
    if compiled():
        n = len(run)
        low, high = np.empty(n, np.uint32), np.empty(n, np.uint32)
        ahead, back = np.empty(n, np.int64), np.empty(n, np.int64)
        n = merging.pair_up(run.keys, run.counts, 1, low, high, ahead, back)
        return PairBlock(low[:n], high[:n], ahead[:n], back[:n])
    unordered = run.keys >> _ONE
    edges = _group_edges(unordered)
    # a pair has one key or two: its first key is the forward one, its last the backward one, if they are there
    first, last = edges[:-1], edges[1:] - 1
    keys = run.keys[first]
    forward = run.counts[first]
    forward[backward(keys)] = 0
    back = run.counts[last]
    back[~backward(run.keys[last])] = 0
    return PairBlock(low_terms(keys), high_terms(keys), forward, back)


def low_terms(keys: UInt64Array) -> UInt32Array:
    """The lower term of each key."""
    return (keys >> _LOW).astype(np.uint32)


def high_terms(keys: UInt64Array) -> UInt32Array:
    """The higher term of each key."""
    return ((keys >> _ONE) & _HIGH_MASK).astype(np.uint32)


def backward(keys: UInt64Array) -> NDArray[np.bool_]:
    """Whether each key is the cell [high, low]."""
    return (keys & _ONE).astype(np.bool_)


def _group_edges(values: UInt64Array) -> Int64Array:
    """Offsets where a new value begins in the sorted, non-empty ``values``, and at the end their number."""
    fresh = np.empty(len(values) + 1, np.bool_)
    fresh[0] = fresh[-1] = True
    np.not_equal(values[1:], values[:-1], out=fresh[1:-1])
    return np.flatnonzero(fresh)
