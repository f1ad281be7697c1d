"""Margins of a tally for groups of documents apart: what a table without one of the groups is made from."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from colloc.counts.accumulating import BoolArray, Places
from colloc.records import NO_TERM, Int64Array, UInt32Array
from colloc.settings import TallySpec

GROUPS = 20
SEED = 20


def deal(n_documents: int, groups: int = GROUPS, seed: int = SEED) -> Int64Array:
    """The group of each document: shuffled by a fixed seed and dealt out like cards, so that groups are even.

    Parameters
    ----------
    groups : int
        At most as many as there are documents are used.

    Returns
    -------
    int64 array, shape (n_documents,)
    """
    used = max(1, min(groups, n_documents))
    return (np.random.default_rng(seed).permutation(n_documents) % used).astype(np.int64)


@dataclass(frozen=True, slots=True)
class GroupedMargins:
    """Sums of a table, by group and label.

    Attributes
    ----------
    first, second : int64 arrays, shape (n_groups, n_labels)
        Row and column sums, or what the kind of tally has instead.
    words : int64 array, shape (n_groups, n_labels)
        Tokens of each label (units that hold it, where units are counted).
    total : int64 array, shape (n_groups,)
    """

    first: Int64Array
    second: Int64Array
    words: Int64Array
    total: Int64Array


class MarginSink:
    """Takes every pair (`colloc.counts.scanning.feeding.PlacedSink`) and keeps sums only.

    Parameters
    ----------
    groups : int64 array, shape (n_documents,)
        The group of each document.
    """

    def __init__(self, spec: TallySpec, groups: Int64Array, n_labels: int) -> None:
        self._kind = spec.kind
        self._groups = groups
        self._n_labels = n_labels
        self._n_groups = int(groups.max()) + 1 if len(groups) else 1
        shape = (self._n_groups, n_labels)
        self._first, self._second, self._words = (np.zeros(shape, np.int64) for _ in range(3))
        self._observed = np.zeros(self._n_groups, np.int64)
        self._cell: Int64Array = np.empty(0, np.int64)

    def place(self, documents: Int64Array, begin: int, stop: int, units: Int64Array) -> None:
        """See `colloc.counts.scanning.feeding.PlacedSink.place`."""
        self._flush()
        self._rows = self._groups[documents]
        self._counted = slice(begin, stop)
        self._observed += np.bincount(self._groups[units], minlength=self._n_groups)

    def load(self, terms: UInt32Array) -> None:
        """Set the tokens, as labels."""
        absent = terms == NO_TERM
        self._present = ~absent if absent.any() else None
        self._cell = self._rows * self._n_labels + np.where(absent, 0, terms)
        self._follow = np.zeros(len(terms), np.int64)
        self._precede = np.zeros(len(terms), np.int64)
        own = self._cell[self._counted]
        if self._present is not None:
            own = own[self._present[self._counted]]
        self._add(self._words, own, None)

    def pair(self, first: Places, second: Places, valid: BoolArray | None = None) -> None:
        """Count the pairs at both their places; units are no pairs of places."""
        if self._kind == "unit":
            return
        if self._present is not None:
            both = self._present[first] & self._present[second]
            valid = both if valid is None else valid & both
        for counts, places in ((self._follow, first), (self._precede, second)):
            if isinstance(places, slice):
                counts[places] += 1 if valid is None else valid
            else:
                # a head has several dependents
                counts += np.bincount(places if valid is None else places[valid], minlength=len(counts))

    def _flush(self) -> None:
        if len(self._cell) and self._kind != "unit":
            self._add(self._first, self._cell, self._follow)
            self._add(self._second, self._cell, self._precede)
            self._cell = self._cell[:0]

    def _add(self, table: Int64Array, cells: Int64Array, weights: Int64Array | None) -> None:
        sums = np.bincount(cells, weights=weights, minlength=table.size)
        table += sums.astype(np.int64).reshape(table.shape)

    def finish(self) -> GroupedMargins:
        """The sums of everything that was fed."""
        self._flush()
        if self._kind == "unit":
            return GroupedMargins(self._words, self._words, self._words, self._observed)
        if self._kind == "positions":
            return GroupedMargins(self._words, self._second, self._words, self._words.sum(axis=1))
        return GroupedMargins(self._first, self._second, self._words, self._first.sum(axis=1))
