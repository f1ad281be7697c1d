"""What growing finds: levels of frequent sequences, each numbered by its place in a sorted table."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from colloc.counts.runs import Column
from colloc.counts.sequences.places import left_of, right_of
from colloc.records import FloatArray, Int64Array, UInt64Array


@dataclass(frozen=True, slots=True)
class Spread:
    """How the sequences of a level lie in the documents, and how they are written; arrays of shape (n,).

    Attributes
    ----------
    documents : int64 array
        Documents that hold the sequence.
    largest : int64 array
        Its occurrences in the document that holds most of them.
    dp, dp_norm : float64 arrays
        As for words: Gries 2008; Lijffijt & Gries 2012. DPnorm is NaN where there is one document only.
    capitals : float64 array
        Share of its words that are written with a capital, of those that can tell: not the first of a sentence, and
        longer than one letter. NaN where none can tell.
    opening, closing : int64 arrays
        How often the sequence begins a unit, and how often it ends one.
    """

    documents: Int64Array
    largest: Int64Array
    dp: FloatArray
    dp_norm: FloatArray
    capitals: FloatArray
    opening: Int64Array
    closing: Int64Array


@dataclass(frozen=True, slots=True, eq=False)
class Level:
    """Frequent sequences of one shape.

    Attributes
    ----------
    words : tuple of int
        Offsets of the words from the first, which is at 0; what is left out between is an open slot.
    left, right : Level or None
        The shorter sequences that make one up; None for single words, whose numbers are terms.
    keys : uint64 array, shape (n,)
        Number of the left part << 32 | number of the right part, ascending.
    counts : int64 array, shape (n,)
        Exact numbers of occurrences.
    ids : Column
        Number of the sequence that begins at each place of the selection, or `NONE`.
    spread : Spread or None
        None for single words.
    """

    words: tuple[int, ...]
    left: Level | None
    right: Level | None
    keys: UInt64Array
    counts: Int64Array
    ids: Column
    spread: Spread | None

    def __len__(self) -> int:
        return len(self.counts)

    @property
    def contiguous(self) -> bool:
        """Whether there is no open slot."""
        return self.words[-1] == len(self.words) - 1

    @property
    def lefts(self) -> Int64Array:
        """Number of each sequence's left part in its level."""
        return left_of(self.keys).astype(np.int64)

    @property
    def rights(self) -> Int64Array:
        """Number of each sequence's right part in its level."""
        return right_of(self.keys).astype(np.int64)
