"""Frequent sequences of all lengths in one table, each with its parts and its whole."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np

from colloc.counts.sequences.levels import Level, Spread
from colloc.records import Int64Array


@dataclass(frozen=True, slots=True, eq=False)
class Gathered:
    """Contiguous sequences: single words first (their row is their term), then those of two words, three, ...

    Attributes
    ----------
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
    """The table of single words and contiguous levels of two words, three, ..."""
    edges = (0, *np.cumsum([len(level) for level in levels]).tolist())
    nothing = np.full(edges[1], -1)
    left = [nothing, *(level.lefts + begin for level, begin in zip(levels[1:], edges, strict=False))]
    right = [nothing, *(level.rights + begin for level, begin in zip(levels[1:], edges, strict=False))]
    spreads = [level.spread for level in levels if level.spread is not None]
    spread = Spread(
        *(
            np.concatenate([np.empty(0, np.int64), *(getattr(one, field.name) for one in spreads)])
            for field in fields(Spread)
        )
    )
    counts = np.concatenate([level.counts for level in levels])
    return Gathered(edges, np.concatenate(left), np.concatenate(right), counts, spread, total, units)
