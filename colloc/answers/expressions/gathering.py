"""Frequent sequences of all lengths in one table, each with its parts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np

from colloc.counts.sequences.levels import Level, Spread
from colloc.records import Int64Array


@dataclass(frozen=True, slots=True, eq=False)
class Gathered:
    """Sequences by number of words: single words first (their row is their term), then those of two, three, ...

    Attributes
    ----------
    levels : tuple of Level
        By number of words; several of one number where there are open slots.
    begins : int64 array
        Row where each level begins.
    edges : tuple of int
        Row where the sequences of n + 1 words begin, and at the end the number of rows.
    left, right : int64 arrays, shape (rows,)
        Row of the sequence without its last word, and without its first; -1 for single words.
    counts : int64 array, shape (rows,)
    spread : Spread
        Of the sequences of two words and more: row ``edges[1]`` comes first.
    total : int
        Tokens.
    units : int
        Units (sentences), which no sequence reaches beyond.
    """

    levels: tuple[Level, ...]
    begins: Int64Array
    edges: tuple[int, ...]
    left: Int64Array
    right: Int64Array
    counts: Int64Array
    spread: Spread
    total: int
    units: int

    @property
    def longest(self) -> int:
        """Words of the longest sequences there are."""
        return len(self.edges) - 1

    def rows(self, words: int) -> Int64Array:
        """Rows of the sequences of so many words."""
        return np.arange(self.edges[words - 1], self.edges[words])

    @property
    def lengths(self) -> Int64Array:
        """Words of each row."""
        return np.repeat(np.arange(1, len(self.edges)), np.diff(self.edges))

    def level_of(self, rows: Int64Array) -> Int64Array:
        """Place in ``levels`` of each row."""
        return np.asarray(np.searchsorted(self.begins, rows, side="right") - 1, np.int64)

    def part(self, rows: Int64Array, words: int, begin: int, stop: int) -> Int64Array:
        """Row of the words ``begin`` to ``stop`` of each of some sequences of ``words`` words."""
        for _ in range(begin):
            rows = self.right[rows]
        for _ in range(words - stop):
            rows = self.left[rows]
        return rows

    def terms(self, rows: Int64Array, words: int) -> Int64Array:
        """Terms of sequences of ``words`` words: shape (n, words)."""
        return np.stack([self.part(rows, words, place, place + 1) for place in range(words)], axis=1)

    def halves(self, words: int) -> tuple[Int64Array, Int64Array]:
        """Counts of both parts at each cut of the sequences of ``words`` words: two arrays of shape (words - 1, n)."""
        rows = self.rows(words)
        cuts = range(1, words)
        left = np.stack([self.counts[self.part(rows, words, 0, cut)] for cut in cuts])
        right = np.stack([self.counts[self.part(rows, words, cut, words)] for cut in cuts])
        return left, right


def gather(levels: Sequence[Level], total: int, units: int) -> Gathered:
    """The table of levels that hold, with each level of two words and more, its left and its right one too."""
    ordered = tuple(sorted(levels, key=lambda level: (len(level.words), level.words)))
    sizes = [len(level) for level in ordered]
    begins = np.cumsum([0, *sizes[:-1]])
    place = {id(level): int(begin) for level, begin in zip(ordered, begins, strict=True)}
    longest = max(len(level.words) for level in ordered)
    by_length = [sum(len(level) for level in ordered if len(level.words) == words) for words in range(1, longest + 1)]
    nothing = np.full(by_length[0], -1)
    left, right = [nothing], [nothing]
    for level in ordered:
        if level.left is not None and level.right is not None:
            left.append(level.lefts + place[id(level.left)])
            right.append(level.rights + place[id(level.right)])
    spreads = [level.spread for level in ordered if level.spread is not None]
    return Gathered(
        ordered,
        begins,
        (0, *np.cumsum(by_length).tolist()),
        np.concatenate(left),
        np.concatenate(right),
        np.concatenate([level.counts for level in ordered]),
        Spread(*(np.concatenate([getattr(one, field.name) for one in spreads]) for field in fields(Spread))),
        total,
        units,
    )
