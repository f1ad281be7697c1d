"""Where expressions stand in a row of words: a trie walked from all places at once.

States of the trie are numbered; an edge is the key ``state << 32 | word``, all edges stand in one sorted array. The
places that are still on a path are looked up together, word by word, so that the time goes with the number of
words and hardly with that of expressions.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colloc.answers.joining.listed import Expression
from colloc.records import FloatArray, Int64Array, UInt64Array

ANY = "*"
_ANY_WORD = 1
"""Number of the word that stands for any; 0 is a word that is in no expression."""


@dataclass(frozen=True, slots=True)
class Matches:
    """Expressions found; they do not overlap once chosen.

    Attributes
    ----------
    starts : int64 array, shape (n,)
        Number of the first word, ascending.
    lengths : int64 array
        Words.
    numbers : int64 array
        Which expression.
    """

    starts: Int64Array
    lengths: Int64Array
    numbers: Int64Array

    def take(self, index: np.ndarray) -> Matches:
        """The matches chosen by a mask or by numbers."""
        return Matches(self.starts[index], self.lengths[index], self.numbers[index])


class Trie:
    """Expressions laid out for looking up.

    Parameters
    ----------
    expressions : sequence of Expression
        Each once.

    Attributes
    ----------
    word_numbers : dict of str to int
        From 1 up; other words are 0.
    """

    def __init__(self, expressions: Sequence[Expression]) -> None:
        self.word_numbers: dict[str, int] = {ANY: _ANY_WORD}
        edges: dict[int, int] = {}
        ends: dict[int, int] = {}
        for number, expression in enumerate(expressions):
            state = 0
            for word in expression.words:
                key = state << 32 | self.word_numbers.setdefault(word, len(self.word_numbers) + 1)
                state = edges.setdefault(key, len(edges) + 1)
            ends[state] = number
        keys = np.fromiter(edges, np.uint64, len(edges))
        order = np.argsort(keys)
        self._keys: UInt64Array = keys[order]
        self._states = np.fromiter(edges.values(), np.int64, len(edges))[order]
        self._ends = np.full(len(edges) + 1, -1, np.int64)
        self._ends[list(ends)] = list(ends.values())
        self._wild = _ANY_WORD in {key & 0xFFFFFFFF for key in edges}
        self._first = np.zeros(len(self.word_numbers) + 1, np.int64)
        for key, state in edges.items():
            if key >> 32 == 0:
                self._first[key] = state
        self.scores: FloatArray = np.array([expression.score for expression in expressions])

    def find(self, words: Int64Array, linked: NDArray[np.bool]) -> Matches:
        """Every match, also those inside others.

        Parameters
        ----------
        words : int64 array, shape (n,)
            By ``word_numbers``.
        linked : bool array, shape (n,)
            Whether a word may be joined to the next one.
        """
        places = np.arange(len(words)) if self._first[_ANY_WORD] else np.flatnonzero(self._first[words])
        places = places[linked[places]]
        states = self._first[words[places]]
        found = []
        starts, step = places, 0
        if self._first[_ANY_WORD]:
            starts, states = _both(starts, states, self._first[_ANY_WORD])
        while len(starts):
            step += 1
            going = linked[starts + step - 1]
            starts, states = starts[going], states[going]
            starts, states = self._follow(starts, states, words[starts + step])
            ends = self._ends[states]
            here = ends >= 0
            found.append(Matches(starts[here], np.full(int(here.sum()), step + 1), ends[here]))
        nothing = np.zeros(0, np.int64)
        return Matches(
            *(
                np.concatenate([nothing, *(getattr(part, name) for part in found)])
                for name in ("starts", "lengths", "numbers")
            )
        )

    def _follow(self, starts: Int64Array, states: Int64Array, words: Int64Array) -> tuple[Int64Array, Int64Array]:
        named = self._edges(states, words)
        kept = named > 0
        if not self._wild:
            return starts[kept], named[kept]
        other = self._edges(states, np.full(len(states), _ANY_WORD))
        also = other > 0
        return np.concatenate([starts[kept], starts[also]]), np.concatenate([named[kept], other[also]])

    def _edges(self, states: Int64Array, words: Int64Array) -> Int64Array:
        """The state behind each edge; 0 where there is none."""
        keys = (states.astype(np.uint64) << np.uint64(32)) | words.astype(np.uint64)
        places = np.minimum(np.searchsorted(self._keys, keys), len(self._keys) - 1)
        return np.where(self._keys[places] == keys, self._states[places], 0)


def _both(starts: Int64Array, states: Int64Array, any_state: np.int64) -> tuple[Int64Array, Int64Array]:
    named = states > 0
    return np.concatenate([starts[named], starts]), np.concatenate([states[named], np.full(len(starts), any_state)])


def chosen(matches: Matches, scores: FloatArray) -> Matches:
    """Matches that do not overlap: longer ones first, among equals the higher score, then the earlier place."""
    order = np.lexsort((matches.starts, -scores[matches.numbers], -matches.lengths))
    by_start = np.argsort(matches.starts, kind="stable")
    starts, ends = matches.starts[by_start], (matches.starts + matches.lengths)[by_start]
    # A match is free where no other reaches into it: most are, and only the others are looked at one by one.
    reach = np.maximum.accumulate(ends)
    touched = np.zeros(len(starts), bool)
    touched[1:] |= starts[1:] < reach[:-1]
    touched[:-1] |= starts[1:] < ends[:-1]
    free = np.ones(len(starts), bool)
    free[by_start[touched]] = False
    taken = bytearray(int(reach[-1]) if len(reach) else 0)
    kept = []
    contested = order[~free[order]]
    rows = zip(contested.tolist(), matches.starts[contested].tolist(), matches.lengths[contested].tolist(), strict=True)
    for row, start, length in rows:
        if taken.find(1, start, start + length) < 0:
            taken[start : start + length] = b"\1" * length
            kept.append(row)
    rows_kept = np.concatenate([np.flatnonzero(free), np.array(kept, np.int64)])
    return matches.take(rows_kept[np.argsort(matches.starts[rows_kept])])
