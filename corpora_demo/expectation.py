"""Expected counts of words and word pairs, computed from the rules alone.

Because the rules of a sentence are chosen independently, everything follows from
four tables for each symbol, all by context: the chance of each length, the chance
that its k-th word from the left (right) is a given word, and the expected number of
given pairs at each distance inside it. Two neighbours A B combine as

    length(A B)   = length(A) convolved with length(B)
    left(A B)[k]  = left(A)[k] + sum over m of P(A has m words) left(B)[k - m]
    pairs(A B)[d] = pairs(A)[d] + pairs(B)[d] + sum over k of right(A)[k] left(B)[d - 1 - k]

and alternatives mix with their probabilities: no sampling anywhere. Punctuation has
length 0. The wildcard `ANY` stands for every word, which gives the margins.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from corpora_demo.grammar import PUNCTUATION, Rule

ANY = "*"
WINDOW = 10

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class _Tables:
    """Leading axis of each: contexts, or 1 where the context makes no difference."""

    length: Floats  # (c, WINDOW): P(length = m) for m < WINDOW
    left: Floats  # (c, WINDOW, targets)
    right: Floats  # (c, WINDOW, targets)
    pairs: Floats  # (c, WINDOW, pairs), entry d - 1: ordered pairs at distance d
    count: Floats  # (c, targets): expected occurrences


class Expectation:
    """Expected counts in one sentence of each rule name, in each context, for chosen pairs of words."""

    def __init__(self, rules: Mapping[str, list[Rule]], pairs: Sequence[tuple[str, str]]) -> None:
        self._rules = rules
        self._targets = {word: i for i, word in enumerate(dict.fromkeys([ANY, *(w for pair in pairs for w in pair)]))}
        wanted = dict.fromkeys([(ANY, ANY), *pairs])
        wanted |= dict.fromkeys(p for w in self._targets for p in ((w, ANY), (ANY, w)))
        self._pairs = {pair: i for i, pair in enumerate(wanted)}
        self._first = np.array([self._targets[x] for x, _ in self._pairs])
        self._second = np.array([self._targets[y] for _, y in self._pairs])
        self._cache: dict[str, _Tables] = {}

    def count(self, root: str, word: str) -> Floats:
        """Expected occurrences of a word, by context (or one value for all)."""
        return self._tables(root).count[:, self._targets[word]]

    def directed(self, root: str, first: str, second: str, window: int) -> Floats:
        """Expected number of times `second` follows `first` at distance 1..window inside the sentence, by context."""
        found: Floats = self._tables(root).pairs[:, :window, self._pairs[first, second]].sum(axis=1)
        return found

    def _tables(self, symbol: str) -> _Tables:
        if symbol not in self._cache:
            self._cache[symbol] = self._mixture(symbol) if symbol in self._rules else self._word(symbol)
        return self._cache[symbol]

    def _word(self, word: str) -> _Tables:
        length, place = np.zeros((1, WINDOW)), np.zeros((1, WINDOW, len(self._targets)))
        length[0, 0 if word in PUNCTUATION else 1] = 1.0
        if word not in PUNCTUATION:
            place[0, 0, self._targets[ANY]] = 1.0
            if word in self._targets:
                place[0, 0, self._targets[word]] = 1.0
        return _Tables(length, place, place, np.zeros((1, WINDOW, len(self._pairs))), place[:, 0])

    def _mixture(self, name: str) -> _Tables:
        parts: list[list[Floats]] = [[], [], [], [], []]
        for rule in self._rules[name]:
            tables = self._tables(rule.symbols[0])
            for symbol in rule.symbols[1:]:
                tables = self._join(tables, self._tables(symbol))
            for part, table in zip(parts, vars(tables).values(), strict=True):
                part.append(rule.probability.reshape(-1, *[1] * (table.ndim - 1)) * table)
        return _Tables(*(_sum(part) for part in parts))

    def _join(self, a: _Tables, b: _Tables) -> _Tables:
        n = max(len(a.length), len(b.length))
        length = np.zeros((n, WINDOW))
        left, right = a.left + np.zeros((n, 1, 1)), b.right + np.zeros((n, 1, 1))
        pairs = a.pairs + b.pairs
        # Most words never stand here: only the columns of those that do are worked on.
        in_a, in_b = a.right.max(axis=(0, 1)) > 0, b.left.max(axis=(0, 1)) > 0
        of_a, of_b = np.flatnonzero(in_a), np.flatnonzero(in_b)
        met = np.flatnonzero(in_a[self._first] & in_b[self._second])
        a_words, b_words = a.right[:, :, of_a], b.left[:, :, of_b]
        a_last, b_first = a.right[:, :, self._first[met]], b.left[:, :, self._second[met]]
        for m in range(WINDOW):
            stop = WINDOW - m
            length[:, m:] += a.length[:, [m]] * b.length[:, :stop]
            left[:, m:, of_b] += a.length[:, [m], None] * b_words[:, :stop]
            right[:, m:, of_a] += b.length[:, [m], None] * a_words[:, :stop]
            pairs[:, m:, met] += a_last[:, [m]] * b_first[:, :stop]
        return _Tables(length, left, right, pairs, a.count + b.count)


def _sum(tables: list[Floats]) -> Floats:
    total = tables[0]
    for table in tables[1:]:
        total = total + table
    return total
