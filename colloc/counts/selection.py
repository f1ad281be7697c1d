"""Which places of the stored stream are counted: all of them, or those of some documents."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from colloc.records import Int64Array
from colloc.store.connection import Store
from colloc.store.documents import document, token_places
from colloc.store.slices import fitting
from colloc.store.stream import token_count
from colloc.store.visibility import uncounted


@dataclass(frozen=True, slots=True)
class Selection:
    """Stretches of the stream, laid end to end.

    What is selected has places of its own, counted from 0 without the gaps; at each
    stretch a unit begins, for stretches are made of whole documents.

    Attributes
    ----------
    begins, stops : int64 arrays
        Places in the stream, ascending; stops are not included.
    places : int64 array
        The selection's own place of each begin, and at the end its length.
    """

    begins: Int64Array
    stops: Int64Array
    places: Int64Array

    def __len__(self) -> int:
        return int(self.places[-1])


def selection_of(begins: ArrayLike, stops: ArrayLike) -> Selection:
    """The selection of these stretches, sorted; neighbours are joined and empty ones left out."""
    first, last = np.asarray(begins, np.int64), np.asarray(stops, np.int64)
    order = np.argsort(first, kind="stable")
    order = order[last[order] > first[order]]
    first, last = first[order], last[order]
    if len(first):
        fresh = np.concatenate([[True], first[1:] != last[:-1]])
        first, last = first[fresh], last[np.append(fresh[1:], True)]
    return Selection(first, last, np.concatenate([[0], np.cumsum(last - first)]).astype(np.int64))


def visible_stream(store: Store) -> Selection:
    """Everything that readers see: up to the first document that is still being added."""
    coming = uncounted(store)
    return selection_of([0], [document(store, int(coming[0])).first_token if len(coming) else token_count(store)])


def documents_selection(store: Store, numbers: Int64Array) -> Selection:
    """The tokens of some documents; NotSeenError where the store does not have one."""
    first, n_tokens = token_places(store, numbers)
    return selection_of(first, first + n_tokens)


def slice_selection(store: Store, where: str) -> Selection:
    """The tokens of the documents of a slice; empty text means all. NotSeenError where no document fits."""
    return documents_selection(store, fitting(store, where)) if where else visible_stream(store)
