"""Which words are the rows or the contexts of a matrix: by frequency, or by a list."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from colloc.errors import UsageError
from colloc.records import Int64Array
from colloc.store import vocabulary
from colloc.store.connection import Store


@dataclass(frozen=True, slots=True, kw_only=True)
class Choice:
    """A choice of words; the conditions hold together.

    Parameters
    ----------
    words : tuple of str, optional
        These words, in this order; a word that the store does not know has an empty row or column.
    min_count : int or None
        Words seen at least so often (in the slice asked for); None: as often as `reliable_count` says.
    most : int, optional
        So many words, the most frequent; ties by number, which is the order of first appearance.
    """

    words: tuple[str, ...] | None = None
    min_count: int | None = 1
    most: int | None = None

    def __post_init__(self) -> None:
        if self.words is not None and (self.min_count != 1 or self.most is not None):
            raise UsageError("words are chosen by a list or by frequency: give one of them")
        if self.words is not None and len(set(self.words)) < len(self.words):
            twice = sorted({word for word in self.words if self.words.count(word) > 1})
            raise UsageError(f"the list names {', '.join(map(repr, twice[:5]))} twice; leave the repeats out")
        if self.most is not None and self.most < 1:
            raise UsageError(f"at least 1 word must be chosen, not {self.most}")

    def settled(self, tokens: Int64Array) -> Choice:
        """The choice with a least count that is a number."""
        return self if self.min_count is not None else replace(self, min_count=reliable_count(tokens))

    def described(self) -> str:
        """In words, for the settings; empty where all words are taken."""
        if self.words is not None:
            return f"{len(self.words)} listed"
        parts = [f"seen {self.min_count} times or more"] if self.min_count != 1 else []
        return ", ".join([*parts, *([f"{self.most} most frequent"] if self.most is not None else [])])


EVERY_WORD = Choice()
"""No condition."""


@dataclass(frozen=True, slots=True)
class Words:
    """What rows or contexts are chosen from.

    Attributes
    ----------
    store : Store
    layer : str
    tokens : int64 array
        How often each of the layer's words was seen, in the slice asked for.
    """

    store: Store
    layer: str
    tokens: Int64Array


@dataclass(frozen=True, slots=True)
class Chosen:
    """A choice resolved for one store.

    Attributes
    ----------
    terms : int64 array or None
        Terms of a list in its order, -1 for unknown words; None where those with cells are taken.
    mask : bool array or None
        By term: whether it may have cells; None where all may.
    words : tuple of str or None
        The words of the list.
    """

    terms: Int64Array | None
    mask: NDArray[np.bool] | None
    words: tuple[str, ...] | None

    def texts(self, known: Words, terms: Int64Array) -> list[str]:
        """What the rows or columns are called."""
        if self.words is not None:
            return list(self.words)
        return vocabulary.term_texts(known.store, known.layer, terms)


def reliable_count(tokens: Int64Array) -> int:
    """From how many occurrences on a word is compared with others by its PPMI row.

    Rows of rare words say more of the places they happened to stand in than of the words. In two halves of 99 novels
    (11 million words) a word seen 5 to 20 times in each has itself among the ten nearest of the other half in 15 to
    21 % of cases, seen 20 to 50 times in 26 %, seen 50 to 100 times in 60 %, seen more often in 80 to 97 %: most rows
    hold from `RELIABLE` on. A small text has few such words; there `RELIABLE_IN_SMALL`, so that an answer can be given.

    Parameters
    ----------
    tokens : int64 array
        How often each word was seen.
    """
    return RELIABLE if np.count_nonzero(tokens >= RELIABLE) >= ENOUGH_WORDS else RELIABLE_IN_SMALL


RELIABLE, RELIABLE_IN_SMALL = 50, 20
ENOUGH_WORDS = 1000
"""With fewer words of `RELIABLE` occurrences a text is small."""


def choose(known: Words, choice: Choice, what: str) -> Chosen:
    """The terms that a choice means.

    Raises
    ------
    UsageError
        Where two words of a list are one term of the layer.
    """
    if choice.words is not None:
        return _listed(known, choice.words, what)
    tokens = known.tokens
    mask: NDArray[np.bool] | None = None
    least = choice.settled(tokens).min_count or 1
    if least > 1:
        mask = tokens >= least
    if choice.most is not None:
        first = np.argsort(-tokens, kind="stable")[: choice.most]
        frequent = np.zeros(len(tokens), bool)
        frequent[first] = True
        mask = frequent if mask is None else mask & frequent
    return Chosen(None, mask, None)


def _listed(known: Words, words: Sequence[str], what: str) -> Chosen:
    terms = vocabulary.term_numbers(known.store, known.layer, words)
    there = terms[terms >= 0]
    numbers, counts = np.unique(there, return_counts=True)
    if (counts > 1).any():
        same = [word for word, term in zip(words, terms.tolist(), strict=True) if term == numbers[counts > 1][0]]
        raise UsageError(
            f"{what}: {' and '.join(map(repr, same[:2]))} are one word in the layer {known.layer!r}; leave one out"
        )
    mask = np.zeros(len(known.tokens), bool)
    mask[there] = True
    return Chosen(terms, mask, tuple(words))
