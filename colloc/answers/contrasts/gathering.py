"""How often words, or pairs, occur in each document of two or more sides: what the test over documents is made from."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from colloc.answers.contrasts.grouped import Groups
from colloc.answers.questions import Question
from colloc.counts.candidates import CandidatePass
from colloc.counts.selection import slice_selection
from colloc.counts.words import document_words
from colloc.measures.subcorpora.ranks import DocumentRates
from colloc.records import Int64Array, UInt32Array
from colloc.store.connection import Store

BYTES_AN_ENTRY = 120
"""What one count in one document takes while it is gathered, ranked and added up (measured)."""


@dataclass(frozen=True, slots=True)
class DocumentCounts:
    """Counts of items in the documents of two or more sides.

    Attributes
    ----------
    items, documents, counts : int64 arrays, shape (m,)
        ``documents`` are numbered from 0 over all sides; empty ones are left out.
    sizes : int64 array, shape (n_documents,)
        Tokens.
    side : int64 array, shape (n_documents,)
        0 for the documents of the first side, 1 for those of the second, and so on.
    n_items : int
    """

    items: Int64Array
    documents: Int64Array
    counts: Int64Array
    sizes: Int64Array
    side: Int64Array
    n_items: int

    @property
    def rates(self) -> DocumentRates:
        """Relative frequencies."""
        rates = self.counts / self.sizes[self.documents]
        return DocumentRates(self.items, self.documents, rates, self.n_items, len(self.sizes))

    @property
    def in_this(self) -> NDArray[np.bool_]:
        """Which documents are of the first side, shape (n_documents,)."""
        chosen: NDArray[np.bool_] = self.side == 0
        return chosen

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
        chosen: NDArray[np.bool_] = (self.side[self.documents] == 0) == this
        return chosen


def word_counts_by_document(
    store: Store, layer: str, sides: Sequence[str], terms: Int64Array, held: Int64Array, memory: int
) -> Iterator[tuple[slice, DocumentCounts]]:
    """Counts of some words in each document, as many words at a time as memory allows; one pass for each lot.

    Parameters
    ----------
    terms : int64 array, shape (n,)
        Ascending.
    held : int64 array, shape (n,)
        Documents of all sides that hold the word.

    Yields
    ------
    slice, DocumentCounts
        Which of the words, and their counts.
    """
    for lot in _lots(held, memory // BYTES_AN_ENTRY):
        gathered = _Gathered()
        for where in sides:
            for batch in document_words(store, layer, slice_selection(store, where)):
                item = np.searchsorted(terms[lot], batch.terms)
                item[item == lot.stop - lot.start] = 0
                wanted = terms[lot][item] == batch.terms
                gathered.add(item[wanted], batch.documents[wanted], batch.counts[wanted])
                gathered.pass_documents(batch.sizes)
            gathered.next_side()
        yield lot, gathered.finish(lot.stop - lot.start)


class _Gathered:
    """Counts on their way, side after side, some documents at a time."""

    def __init__(self) -> None:
        self._parts: list[tuple[Int64Array, Int64Array, Int64Array]] = []
        self._sizes: list[Int64Array] = []
        self._sides: list[Int64Array] = []
        self._side = self._seen = 0

    def add(self, items: Int64Array, documents: Int64Array, counts: Int64Array) -> None:
        """Take counts in documents that are numbered from the last one passed on."""
        self._parts.append((items, documents + self._seen, counts))

    def pass_documents(self, sizes: Int64Array) -> None:
        """Go on behind documents of these sizes."""
        self._sizes.append(sizes)
        self._sides.append(np.full(len(sizes), self._side))
        self._seen += len(sizes)

    def next_side(self) -> None:
        """Go on with the documents of the next side."""
        self._side += 1

    def finish(self, n_items: int) -> DocumentCounts:
        """Everything that was added."""
        empty = np.empty(0, np.int64)
        items, documents, counts = (
            np.concatenate([empty, *(part[column] for part in self._parts)]) for column in range(3)
        )
        sizes, side = np.concatenate([empty, *self._sizes]), np.concatenate([empty, *self._sides])
        return DocumentCounts(items, documents, counts, sizes, side, n_items)


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
    gathered = _Gathered()
    for question in questions:
        found = CandidatePass(question.store, question.spec, first, second, directed=question.reader.ordered)
        filled = found.documents.lengths > 0
        number = np.cumsum(filled) - 1
        for part in found:
            index = np.searchsorted(found.documents.numbers, part.document)
            gathered.add(part.pair, number[index], part.count)
        gathered.pass_documents(found.documents.lengths[filled])
        gathered.next_side()
    return gathered.finish(len(first))


def pair_counts_by_group(question: Question, first: UInt32Array, second: UInt32Array, groups: Groups) -> DocumentCounts:
    """Counts of given pairs in each document of some groups; the groups are the sides. One pass for all of them."""
    found = CandidatePass(question.store, question.spec, first, second, directed=question.reader.ordered)
    group = groups.of(found.documents.numbers)
    taken = (found.documents.lengths > 0) & (group < len(groups))
    number = np.cumsum(taken) - 1
    gathered = _Gathered()
    for part in found:
        index = np.searchsorted(found.documents.numbers, part.document)
        inside = taken[index]
        gathered.add(part.pair[inside], number[index[inside]], part.count[inside])
    gathered.pass_documents(found.documents.lengths[taken])
    counts = gathered.finish(len(first))
    return replace(counts, side=group[taken])
