"""Texts of a data set as numbers, in memory, and the pairs of words that stand near each other in them."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from colloc.answers.tables import Convention, Sums, TableMaker
from colloc.errors import UsageError
from colloc.records import Int64Array, UInt32Array
from colloc.settings import SegmentSettings, TallySpec
from colloc.tokens.folding import fold
from colloc.tokens.numbering import TypeNumberer
from colloc.tokens.segmenter import Segmenter

_STRETCH = 1 << 20
_BETWEEN = "\u2029"
"""A paragraph end: no sentence reaches across it."""


@dataclass(frozen=True, slots=True)
class Tokens:
    """The words of some texts.

    Attributes
    ----------
    terms : int64 array, shape (n,)
        Index into the vocabulary, -1 for words that are not in it.
    documents, sentences : int64 arrays, shape (n,)
        Which text and which sentence a word stands in; sentences are numbered through all texts.
    n_documents : int
    """

    terms: Int64Array
    documents: Int64Array
    sentences: Int64Array
    n_documents: int


class TextReader:
    """Numbers the words of texts.

    Parameters
    ----------
    lowercase : bool
        Fold case.
    vocabulary : dict of str to int, optional
        Words known; without it every word becomes known.
    """

    def __init__(self, lowercase: bool, vocabulary: dict[str, int] | None = None) -> None:
        self._lowercase = lowercase
        self._grows = vocabulary is None
        self.vocabulary: dict[str, int] = {} if vocabulary is None else vocabulary
        self._segmenter = Segmenter(SegmentSettings())
        self._numberer = TypeNumberer()
        self._of_form = np.zeros(0, np.int64)

    def read(self, texts: Iterable[str]) -> Tokens:
        """All words of the texts.

        Raises
        ------
        UsageError
            For a single string, or something in the list that is no text.
        """
        if isinstance(texts, str):
            raise UsageError("a list of texts is expected, not one string")
        terms, documents, sentences = [np.zeros(0, np.int64)], [np.zeros(0, np.int64)], [np.zeros(0, np.int64)]
        first = n_sentences = 0
        for lot in _lots(texts):
            segments = self._segmenter.segment(_BETWEEN.join(lot))
            begins = np.cumsum([0, *(len(text) + 1 for text in lot)])
            terms.append(self._terms(self._numberer.number(segments)))
            documents.append(np.searchsorted(begins, segments.starts, side="right") - 1 + first)
            marks = np.zeros(len(segments), np.int64)
            marks[segments.sentences[segments.sentences < len(segments)]] = 1
            sentences.append(np.cumsum(marks) + n_sentences)
            n_sentences = int(sentences[-1][-1]) + 1 if len(segments) else n_sentences
            first += len(lot)
        return Tokens(np.concatenate(terms), np.concatenate(documents), np.concatenate(sentences), first)

    def _terms(self, forms: UInt32Array) -> Int64Array:
        fresh = []
        for form in self._numberer.take_new():
            word = fold(form) if self._lowercase else form
            fresh.append(
                self.vocabulary.setdefault(word, len(self.vocabulary)) if self._grows else self.vocabulary.get(word, -1)
            )
        self._of_form = np.concatenate([self._of_form, np.array(fresh, np.int64)])
        return self._of_form[forms]


def _lots(texts: Iterable[str]) -> Iterator[list[str]]:
    lot: list[str] = []
    size = 0
    for place, text in enumerate(texts):
        if not isinstance(text, str):
            raise UsageError(f"texts are str; number {place} is {type(text).__name__}")
        lot.append(text)
        size += len(text)
        if size >= _STRETCH:
            yield lot
            lot, size = [], 0
    if lot:
        yield lot


def near_pairs(tokens: Tokens, window: int) -> Iterator[tuple[Int64Array, Int64Array]]:
    """Places of known words and of those that follow them in the same sentence, distance by distance."""
    for distance in range(1, window + 1):
        earlier = np.arange(max(len(tokens.terms) - distance, 0))
        later = earlier + distance
        same = tokens.sentences[earlier] == tokens.sentences[later]
        same &= tokens.documents[earlier] == tokens.documents[later]
        same &= (tokens.terms[earlier] >= 0) & (tokens.terms[later] >= 0)
        yield earlier[same], later[same]


@dataclass(frozen=True, slots=True)
class CountedPairs:
    """Different pairs with their counts.

    Attributes
    ----------
    first, second : int64 arrays, shape (n,)
        Terms; first <= second where order does not count.
    joint : int64 array, shape (n,)
    maker : TableMaker
        Makes their contingency tables, with pair margins.
    """

    first: Int64Array
    second: Int64Array
    joint: Int64Array
    maker: TableMaker


def count_pairs(tokens: Tokens, n_terms: int, window: int, directed: bool) -> CountedPairs:
    """Every pair of words within a window, counted as a tally of a store counts them."""
    keys, counts = np.zeros(0, np.int64), np.zeros(0, np.int64)
    rows, columns = np.zeros(n_terms, np.int64), np.zeros(n_terms, np.int64)
    for earlier, later in near_pairs(tokens, window):
        one, other = tokens.terms[earlier], tokens.terms[later]
        rows += np.bincount(one, minlength=n_terms)
        columns += np.bincount(other, minlength=n_terms)
        found, times = np.unique(pair_keys(one, other, n_terms, directed), return_counts=True)
        keys, places = np.unique(np.concatenate([keys, found]), return_inverse=True)
        counts = np.bincount(places, weights=np.concatenate([counts, times]), minlength=len(keys)).astype(np.int64)
    sums = Sums(TallySpec(right=window), int(rows.sum()), rows, columns)
    return CountedPairs(keys // n_terms, keys % n_terms, counts, TableMaker(sums, Convention(directed=directed)))


def pair_keys(first: Int64Array, second: Int64Array, n_terms: int, directed: bool) -> Int64Array:
    """One number for each pair; the same for both orders unless directed."""
    if directed:
        return first * n_terms + second
    return np.minimum(first, second) * n_terms + np.maximum(first, second)


def as_terms(numbers: Sequence[int] | Int64Array) -> UInt32Array:
    """Term numbers in the type that tables take."""
    return np.asarray(numbers).astype(np.uint32)
