"""How often words, or pairs, occur in each document of two sides: what the test over documents is made from."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colloc.answers.questions import Question
from colloc.counts.candidates import CandidatePass
from colloc.counts.selection import slice_selection
from colloc.counts.words import document_words
from colloc.measures.documents import DocumentRates
from colloc.records import Int64Array, UInt32Array
from colloc.store.connection import Store

BYTES_AN_ENTRY = 120
"""What one count in one document takes while it is gathered, ranked and added up (measured)."""


@dataclass(frozen=True, slots=True)
class DocumentCounts:
    """Counts of items in the documents of two sides.

    Attributes
    ----------
    items, documents, counts : int64 arrays, shape (m,)
        ``documents`` are numbered from 0 over both sides, the first side first; empty ones are left out.
    sizes : int64 array, shape (n_documents,)
        Tokens.
    n_this : int
        Documents of the first side.
    n_items : int
    """

    items: Int64Array
    documents: Int64Array
    counts: Int64Array
    sizes: Int64Array
    n_this: int
    n_items: int

    @property
    def rates(self) -> DocumentRates:
        """Relative frequencies."""
        in_this = np.arange(len(self.sizes)) < self.n_this
        return DocumentRates(
            self.items, self.documents, self.counts / self.sizes[self.documents], self.n_items, in_this
        )

    def documents_on(self, this: bool) -> Int64Array:
        """How many documents of one side hold each item."""
        return np.bincount(self.items[self._on(this)], minlength=self.n_items)

    def largest_on(self, this: bool) -> Int64Array:
        """The largest count in one document of one side, by item."""
        largest = np.zeros(self.n_items, np.int64)
        chosen = self._on(this)
        np.maximum.at(largest, self.items[chosen], self.counts[chosen])
        return largest

    def _on(self, this: bool) -> NDArray[np.bool_]:
        return np.equal(self.documents < self.n_this, this)


def word_counts_by_document(
    store: Store, layer: str, sides: Sequence[str], terms: Int64Array, held: Int64Array, memory: int
) -> Iterator[tuple[slice, DocumentCounts]]:
    """Counts of some words in each document, as many words at a time as memory allows; one pass for each lot.

    Parameters
    ----------
    terms : int64 array, shape (n,)
        Ascending.
    held : int64 array, shape (n,)
        Documents of both sides that hold the word.

    Yields
    ------
    slice, DocumentCounts
        Which of the words, and their counts.
    """
    for lot in _lots(held, memory // BYTES_AN_ENTRY):
        parts: list[tuple[Int64Array, Int64Array, Int64Array]] = []
        sizes: list[Int64Array] = []
        n_this = seen = 0
        for place, where in enumerate(sides):
            for batch in document_words(store, layer, slice_selection(store, where)):
                item = np.searchsorted(terms[lot], batch.terms)
                item[item == lot.stop - lot.start] = 0
                wanted = terms[lot][item] == batch.terms
                parts.append((item[wanted], batch.documents[wanted] + seen, batch.counts[wanted]))
                sizes.append(batch.sizes)
                seen += len(batch.sizes)
            n_this = seen if place == 0 else n_this
        items, documents, counts = (np.concatenate(column) for column in zip(*parts, strict=True))
        yield lot, DocumentCounts(items, documents, counts, np.concatenate(sizes), n_this, lot.stop - lot.start)


def _lots(held: Int64Array, most: int) -> Iterator[slice]:
    """Stretches that hold at most so many counts together (a single word may hold more)."""
    start = 0
    sums = np.cumsum(held)
    while start < len(held):
        before = sums[start - 1] if start else 0
        stop = max(start + 1, int(np.searchsorted(sums, before + most, side="right")))
        yield slice(start, stop)
        start = stop


def pair_counts_by_document(questions: Sequence[Question], first: UInt32Array, second: UInt32Array) -> DocumentCounts:
    """Counts of given pairs in each document, counted as the questions' tallies count.

    Parameters
    ----------
    questions : two Questions
        The same question about either side.
    """
    parts: list[tuple[Int64Array, Int64Array, Int64Array]] = []
    sizes: list[Int64Array] = []
    n_this = seen = 0
    for place, question in enumerate(questions):
        found = CandidatePass(question.store, question.spec, first, second, directed=question.reader.ordered)
        filled = found.documents.lengths > 0
        number = np.cumsum(filled) - 1 + seen
        for part in found:
            index = np.searchsorted(found.documents.numbers, part.document)
            parts.append((part.pair, number[index], part.count))
        sizes.append(found.documents.lengths[filled])
        seen += int(filled.sum())
        n_this = seen if place == 0 else n_this
    empty = np.empty(0, np.int64)
    items, documents, counts = (np.concatenate([empty, *(part[column] for part in parts)]) for column in range(3))
    return DocumentCounts(items, documents, counts, np.concatenate(sizes), n_this, len(first))
