"""A sieve for pairs: of all that a kernel finds, it keeps those that were asked for, by document."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from colloc.counts.accumulating import BoolArray, Places
from colloc.records import Int64Array, UInt32Array, UInt64Array

_SPREAD = np.uint32(2654435761)  # 2**32 / golden ratio: neighbouring labels fall far apart
_LEAST_BITS, _MOST_BITS = 12, 22
_WORD = np.uint64(32)


@dataclass(frozen=True, slots=True)
class Wanted:
    """Pairs to look for, as keys of labels.

    Terms that stand in no wanted pair share one label, so that labels stay small and tokens keep their places.

    Attributes
    ----------
    labels : uint32 array, shape (n_terms,)
        The label of each term.
    n_labels : int
        Labels in use; the last one is that of all other terms.
    keys : uint64 array
        ``first << 32 | second`` by label, sorted, each once. Without a direction both orders are there.
    pair : int64 array, same length
        Which pair a key stands for: a number below ``n_pairs``.
    given : int64 array
        For each pair that was given, the number of the one it is equal to.
    cover : bool array, shape (n_labels + 1,)
        Labels of which each wanted pair has one at least; one place more for tokens without a term.
    """

    labels: UInt32Array
    n_labels: int
    keys: UInt64Array
    pair: Int64Array
    given: Int64Array
    cover: BoolArray

    @property
    def n_pairs(self) -> int:
        """Different pairs."""
        return int(self.pair.max()) + 1 if len(self.pair) else 0


def wanted_pairs(first: UInt32Array, second: UInt32Array, n_terms: int, *, directed: bool) -> Wanted:
    """Prepare given pairs, also repeated ones, for a sieve."""
    terms = np.unique(np.concatenate([first, second])).astype(np.int64)
    labels = np.full(n_terms, len(terms), np.uint32)
    labels[terms] = np.arange(len(terms), dtype=np.uint32)
    one, two = labels[first].astype(np.uint64), labels[second].astype(np.uint64)
    if not directed:
        one, two = np.minimum(one, two), np.maximum(one, two)
    keys, given = np.unique(one << _WORD | two, return_inverse=True)
    pair = np.arange(len(keys))
    if not directed:
        turned = keys << _WORD | keys >> _WORD
        other = turned != keys
        keys, pair = np.concatenate([keys, turned[other]]), np.concatenate([pair, pair[other]])
        order = np.argsort(keys)
        keys, pair = keys[order], pair[order]
    cover = np.zeros(len(terms) + 2, np.bool_)
    cover[labels[first]] = True
    return Wanted(labels, len(terms) + 1, keys, pair, given.astype(np.int64).reshape(-1), cover)


class Sieve:
    """Takes pairs of places (`colloc.counts.accumulating.PairSink`) and keeps the wanted ones.

    A table of flags by hash lets almost all others fall through at the cost of one look-up a pair.
    """

    def __init__(self, wanted: Wanted) -> None:
        self._wanted = wanted
        bits = min(max(_LEAST_BITS, len(wanted.keys).bit_length() + 6), _MOST_BITS)
        self._mask = np.uint32(2**bits - 1)
        self._flags = np.zeros(2**bits, np.bool_)
        one = (wanted.keys >> _WORD).astype(np.uint32)
        self._flags[(one * _SPREAD + wanted.keys.astype(np.uint32)) & self._mask] = True
        self._found: list[UInt64Array] = []

    def place(self, documents: Int64Array, begin: int, stop: int, units: Int64Array) -> None:
        """Say which document each of the tokens is in that `load` is given next."""
        self._documents = documents

    def load(self, terms: UInt32Array) -> None:
        """Set the tokens, as labels; `NO_TERM` matches nothing."""
        self._labels = terms
        self._spread = terms * _SPREAD

    def pair(self, first: Places, second: Places, valid: BoolArray | None = None) -> None:
        """Keep the wanted ones of these pairs of places."""
        slot = self._spread[first] + self._labels[second]
        slot &= self._mask
        likely = self._flags[slot]
        if valid is not None:
            likely &= valid
        rows = np.flatnonzero(likely)
        if not len(rows):
            return
        one = self._labels[first][rows].astype(np.uint64)
        one <<= _WORD
        one |= self._labels[second][rows]
        place = np.searchsorted(self._wanted.keys, one)
        np.minimum(place, len(self._wanted.keys) - 1, out=place)
        same = self._wanted.keys[place] == one
        pair, rows = self._wanted.pair[place[same]], rows[same]
        documents = self._documents[first][rows]
        self._found.append(pair.astype(np.uint64) << _WORD | documents.astype(np.uint64))

    def take(self) -> UInt64Array:
        """What was found since the last call: ``pair << 32 | document``, in no order, with repeats."""
        found = np.concatenate(self._found) if self._found else np.empty(0, np.uint64)
        self._found.clear()
        return found
