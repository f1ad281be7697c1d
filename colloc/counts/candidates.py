"""Where given pairs stand: one pass over the token stream for all of them, document by document."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from colloc.counts.grouping import GroupedMargins, MarginSink, deal
from colloc.counts.placing import DocumentPlaces, document_places
from colloc.counts.scanning.feeding import Fork, feed
from colloc.counts.scanning.sieving import Sieve, Wanted, wanted_pairs
from colloc.counts.selection import slice_selection
from colloc.counts.spans import apply_layer
from colloc.records import Int64Array, UInt32Array, UInt64Array
from colloc.settings import TallySpec
from colloc.store.connection import Store
from colloc.store.vocabulary import layer_map, term_count

_WORD = np.uint64(32)
_LOWER = np.uint64(0xFFFFFFFF)
WAITING = 2**21
"""Finds that come together before they are counted."""


@dataclass(frozen=True, slots=True)
class Occurrences:
    """Counts of pairs in documents.

    Attributes
    ----------
    pair : int64 array, shape (n,)
        Index into the pairs that were given.
    document : int64 array
        Document number in the store.
    count : int64 array
        How often the pair occurs in the document, counted as the tally of its spec counts.
    """

    pair: Int64Array
    document: Int64Array
    count: Int64Array

    def __len__(self) -> int:
        return len(self.pair)


def occurrences(
    store: Store, spec: TallySpec, first: UInt32Array, second: UInt32Array, *, directed: bool
) -> Iterator[Occurrences]:
    """The counts of given pairs in each document of the slice, in bounded memory.

    Parameters
    ----------
    first, second : uint32 arrays, shape (n,)
        Terms of the spec's layer; pairs may be repeated.
    directed : bool
        Only the cell [first, second]; otherwise both cells of the pair together. Units have no direction.

    Yields
    ------
    Occurrences
        Each pair and document at most once over the whole iteration. The counts of a pair over all documents add up
        to its cell, or cells, of the tally.
    """
    yield from CandidatePass(store, spec, first, second, directed=directed)


class CandidatePass:
    """One pass over the stream: iterate to get the occurrences; afterwards the margins of groups are there.

    Parameters
    ----------
    groups : int
        How many groups the documents are dealt into; 0: no margins are wanted.

    Attributes
    ----------
    documents : DocumentPlaces
        The documents of the slice.
    group_of : int64 array, shape (n_documents,)
    first, second : int64 arrays, shape (n,)
        The columns of the margins that belong to the given pairs.
    margins : GroupedMargins
        Once the iteration has come to its end.
    """

    def __init__(
        self,
        store: Store,
        spec: TallySpec,
        first: UInt32Array,
        second: UInt32Array,
        *,
        directed: bool,
        groups: int = 0,
    ) -> None:
        self._store, self._spec, self._n_given = store, spec, len(first)
        n_terms = term_count(store, spec.layer)
        self._wanted = wanted_pairs(first, second, n_terms, directed=directed and spec.kind != "unit")
        self._selection = slice_selection(store, spec.where)
        self.documents = document_places(store, self._selection)
        self.group_of = deal(len(self.documents), groups or 1)
        self.first, self.second = (self._wanted.labels[terms].astype(np.int64) for terms in (first, second))
        self.margins: GroupedMargins | None = None
        self._with_margins = groups > 0

    def __iter__(self) -> Iterator[Occurrences]:
        if not self._n_given:
            return
        wanted, documents = self._wanted, self.documents
        sieve, margins = Sieve(wanted), MarginSink(self._spec, self.group_of, wanted.n_labels)
        sink = Fork([sieve, margins]) if self._with_margins else sieve
        labels = apply_layer(wanted.labels, layer_map(self._store, self._spec.layer))
        gathered = _Gathered()
        cover = None if self._with_margins else wanted.cover
        for document in feed(self._store, self._spec, self._selection, documents, labels, sink, cover):
            found = gathered.add(sieve.take(), document)
            if found is not None:
                yield _given(found, wanted, documents)
        self.margins = margins.finish()
        yield _given(gathered.rest(), wanted, documents)


class _Gathered:
    """Finds on their way to counts; those of the document that goes on are held back."""

    def __init__(self) -> None:
        self._waiting: list[UInt64Array] = []
        self._n_waiting = 0
        self._open = np.empty(0, np.uint64)
        self._open_counts = np.empty(0, np.int64)

    def add(self, found: UInt64Array, document: int) -> tuple[UInt64Array, Int64Array] | None:
        """Take finds; gives the counts of the documents before ``document`` when many have come together."""
        self._waiting.append(found)
        self._n_waiting += len(found)
        if self._n_waiting < WAITING:
            return None
        keys, counts = self.rest()
        going_on = (keys & _LOWER) >= np.uint64(document)
        self._open, self._open_counts = keys[going_on], counts[going_on]
        return keys[~going_on], counts[~going_on]

    def rest(self) -> tuple[UInt64Array, Int64Array]:
        """All that is still here."""
        keys, counts = np.unique(np.concatenate([*self._waiting, np.empty(0, np.uint64)]), return_counts=True)
        if len(self._open):
            keys, place = np.unique(np.concatenate([keys, self._open]), return_inverse=True)
            together = np.concatenate([counts, self._open_counts])
            counts = np.bincount(place.reshape(-1), weights=together, minlength=len(keys)).astype(np.int64)
        self._waiting, self._n_waiting = [], 0
        self._open, self._open_counts = self._open[:0], self._open_counts[:0]
        return keys, counts.astype(np.int64, copy=False)


def _given(found: tuple[UInt64Array, Int64Array], wanted: Wanted, documents: DocumentPlaces) -> Occurrences:
    """Finds of different pairs as occurrences of the pairs that were given."""
    keys, counts = found
    pair = (keys >> _WORD).astype(np.int64)
    numbers = documents.numbers[(keys & _LOWER).astype(np.int64)]
    order = np.argsort(wanted.given, kind="stable")
    starts = np.searchsorted(wanted.given[order], np.arange(wanted.n_pairs + 1))
    times = np.diff(starts)[pair]
    row = np.repeat(np.arange(len(pair)), times)
    turn = np.arange(len(row)) - np.repeat(np.cumsum(times) - times, times)
    return Occurrences(order[starts[pair[row]] + turn], numbers[row], counts[row])
