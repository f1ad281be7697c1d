"""Which document each place of a selection belongs to."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from colloc.counts.selection import Selection
from colloc.records import Int64Array
from colloc.store.connection import Store
from colloc.store.documents import document_spans


@dataclass(frozen=True, slots=True)
class DocumentPlaces:
    """The documents of a selection, in the order of the stream.

    Attributes
    ----------
    numbers : int64 array, shape (n,)
        Document numbers in the store.
    begins : int64 array, shape (n,)
        The place in the selection where each begins, ascending; an empty document begins where the next one does.
    lengths : int64 array, shape (n,)
        Tokens of each.
    stop : int
        The place after the last token of the last document.
    """

    numbers: Int64Array
    begins: Int64Array
    lengths: Int64Array
    stop: int

    def __len__(self) -> int:
        return len(self.numbers)

    def of(self, places: Int64Array) -> Int64Array:
        """Index (0..n-1) of the document that holds each place."""
        return np.searchsorted(self.begins, places, side="right") - 1

    def of_stretch(self, begin: int, stop: int) -> Int64Array:
        """Index of the document of every place from ``begin`` up to ``stop``."""
        if begin >= stop:
            return np.empty(0, np.int64)
        first, last = self.of(np.array([begin, stop - 1]))
        edges = np.concatenate([[begin], self.begins[first + 1 : last + 1], [stop]])
        return np.repeat(np.arange(first, last + 1), np.diff(edges))


def document_places(store: Store, selection: Selection) -> DocumentPlaces:
    """The visible documents that a selection holds."""
    numbers, firsts, lengths = document_spans(store)
    stretch = np.searchsorted(selection.begins, firsts, side="right") - 1
    inside = stretch >= 0
    inside[inside] &= firsts[inside] + lengths[inside] <= selection.stops[stretch[inside]]
    numbers, firsts, lengths, stretch = numbers[inside], firsts[inside], lengths[inside], stretch[inside]
    begins = firsts - selection.begins[stretch] + selection.places[stretch]
    return DocumentPlaces(numbers, begins, lengths, int(begins[-1] + lengths[-1]) if len(begins) else 0)
