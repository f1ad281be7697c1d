"""Plain values that pass between layers."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

MetaValue = str | int | float | bool | None
"""What a metadata key may hold."""

UInt8Array = NDArray[np.uint8]
UInt32Array = NDArray[np.uint32]
Int64Array = NDArray[np.int64]
UInt64Array = NDArray[np.uint64]
FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class SourceInfo:
    """One input as the provenance records it."""

    name: str
    """The path as the user gave it, ``-`` for standard input."""
    size: int
    """Bytes on disk, -1 where unknown."""
    modified: float
    """Modification time, seconds since the epoch; 0 where unknown."""


CONLLU_COLUMNS = ("id", "form", "lemma", "upos", "xpos", "feats", "head", "deprel", "deps", "misc")
"""Columns of CoNLL-U, where nothing else is said."""


@dataclass(frozen=True, slots=True)
class Annotation:
    """Says that a document's pieces are words already: a line a word, its columns divided by tabs.

    Blank lines end sentences; a line that begins with ``#`` is a comment (where
    the first column is not ``id``: unless it has as many columns as a word).
    Each of `Document.sentences` holds whole sentences, every line ended by LF and
    every sentence by a blank line.

    Attributes
    ----------
    columns : tuple of str
        What the columns hold: ``form`` at least; ``id``, ``lemma``, ``upos``,
        ``xpos``, ``feats``, ``head``, ``deprel`` and ``misc`` are understood
        as CoNLL-U has them, all others are kept as they are.
    source : str
        The input, as messages name it.
    line : int
        Number of the document's first line there.
    """

    columns: tuple[str, ...]
    source: str
    line: int = 1


@dataclass(frozen=True, slots=True)
class Document:
    """One document as its reader gives it: streamed, never held whole.

    ``pieces`` are the text in order, each of bounded size; they may be cut
    anywhere, even inside a word. They must be consumed before the next document
    is asked for. Annotated documents have ``sentences`` instead: pieces of
    UTF-8, cut between sentences only.
    """

    identifier: str
    metadata: Mapping[str, MetaValue]
    pieces: Iterable[str]
    record: int
    """0-based ordinal of the document in its source: where a resumed build goes on."""
    annotation: Annotation | None = None
    """None for plain text."""
    sentences: Iterable[bytes] = ()
    """Text that is annotated; see `Annotation`."""


@dataclass(frozen=True, slots=True)
class Segments:
    """Words and sentences of one stretch of text.

    Attributes
    ----------
    text : str
        The stretch itself; all offsets are code points in it.
    starts, ends : int64 arrays, shape (n_tokens,)
    sentences, paragraphs : int64 arrays
        Numbers of the tokens that begin a sentence / a paragraph, ascending.
        A stretch that goes on inside a sentence does not list token 0.
    closed : bool
        Whether a sentence ends where this stretch ends.
    dropped : int
        Tokens left out because they were longer than ``max_token``.
    points : unsigned array, shape (len(text),), or None
        Code points of the text, where they are at hand.
    """

    text: str
    starts: Int64Array
    ends: Int64Array
    sentences: Int64Array
    paragraphs: Int64Array
    closed: bool = True
    dropped: int = 0
    points: NDArray[np.unsignedinteger[Any]] | None = None

    def __len__(self) -> int:
        return len(self.starts)


@dataclass(frozen=True, slots=True)
class TokenSpan:
    """A run of term numbers to count in, with the units that bound a window.

    Attributes
    ----------
    terms : uint32 array, shape (n,)
        ``NO_TERM`` marks a token that is not there (removed, or not in the layer).
    units : int64 array
        Offsets where units begin, ascending; offset 0 begins one too, listed or not.
        Every document start is a unit start.
    context : int
        The first ``context`` tokens were counted elsewhere: pairs wholly inside them are not counted again.
    ahead : int
        The last ``ahead`` tokens are there to be looked at only and are counted with the next span (position counts).
    """

    terms: UInt32Array
    units: Int64Array
    context: int = 0
    ahead: int = 0


NO_TERM = np.uint32(0xFFFFFFFF)


@dataclass(frozen=True, slots=True)
class PairBlock:
    """A stretch of a tally: unordered pairs of terms with both directions' counts.

    Attributes
    ----------
    low, high : uint32 arrays, shape (n,)
        Terms, low <= high; sorted by (low, high), or by (high, low) when read by ``high``.
    forward, backward : int64 arrays, shape (n,)
        Table cells [low, high] and [high, low]; on the diagonal ``backward`` is 0.
    """

    low: UInt32Array
    high: UInt32Array
    forward: Int64Array
    backward: Int64Array

    def __len__(self) -> int:
        return len(self.low)


@dataclass(frozen=True, slots=True)
class WordCounts:
    """Frequencies of the terms of a layer, indexed by term number."""

    tokens: Int64Array
    documents: Int64Array


@dataclass(frozen=True, slots=True)
class Anchors:
    """Places where segmenting can begin again: token offset beside character offset."""

    tokens: Int64Array
    characters: Int64Array


@dataclass(frozen=True, slots=True)
class DocumentRow:
    """A document as the store keeps it."""

    number: int
    identifier: str
    source: int
    record: int
    first_token: int
    n_tokens: int
    first_character: int
    n_characters: int
    metadata: Mapping[str, MetaValue] = field(default_factory=dict)
