"""The true strength of what is planted, computed from the rules (`corpora_demo.expectation`), never from the output.

All values are those of an endless corpus without the talkative document. PMI is in
bits, with pair margins: the observation is a pair of words at distance 1..window in
one sentence, and the margins are the row and column sums of all such pairs.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from math import log2

import numpy as np
from numpy.typing import NDArray

from corpora_demo import planted
from corpora_demo.contexts import GENRES
from corpora_demo.expectation import ANY, Expectation
from corpora_demo.grammar import Floats
from corpora_demo.model import ROOTS, Model, model

Mask = NDArray[np.bool_]


@dataclass(frozen=True)
class ExpectedTable:
    """A 2x2 table by its margins, as expected numbers in one document."""

    joint: float
    first_total: float
    second_total: float
    total: float

    @property
    def independent(self) -> float:
        """The joint number if the two words paid no heed to each other."""
        return self.first_total * self.second_total / self.total

    @property
    def pmi(self) -> float | None:
        """log2 of joint over independent; None where the pair cannot occur."""
        return log2(self.joint / self.independent) if self.joint > 0 else None


class Truth:
    """Expected numbers in one document of the whole language, or of the documents that a mask of contexts picks."""

    def __init__(self, language: Model, pairs: list[tuple[str, str]]) -> None:
        self._contexts = language.contexts
        self._expectation = Expectation(language.rules, pairs)

    def where(self, *, genre: str | None = None, year: int | None = None, topic: str | None = None) -> Mask:
        """Contexts of one genre, year or topic."""
        chosen = np.ones(len(self._contexts), dtype=np.bool_)
        if genre is not None:
            chosen &= self._contexts.genre == GENRES.index(genre)
        if year is not None:
            chosen &= self._contexts.year == year
        if topic is not None:
            chosen &= self._contexts.curve(f"topic_{topic}") > 0
        return chosen

    def words(self, word: str, where: Mask | None = None) -> float:
        """Expected occurrences of a word in one document."""
        return self._sum(lambda root: self._expectation.count(root, word), where)

    def per_million(self, word: str, where: Mask | None = None) -> float:
        """Expected occurrences in a million words."""
        return 1e6 * self.words(word, where) / self.words(ANY, where)

    def directed(self, first: str, second: str, window: int, where: Mask | None = None) -> float:
        """Expected number of pairs in one document, `second` after `first`."""
        return self._sum(lambda root: self._expectation.directed(root, first, second, window), where)

    def directed_table(self, first: str, second: str, window: int, where: Mask | None = None) -> ExpectedTable:
        """The table of ordered pairs."""
        cells = ((first, second), (first, ANY), (ANY, second), (ANY, ANY))
        return ExpectedTable(*(self.directed(x, y, window, where) for x, y in cells))

    def symmetric_table(self, first: str, second: str, window: int, where: Mask | None = None) -> ExpectedTable:
        """The table of pairs in either order (first and second differ)."""
        cells = ((first, second), (first, ANY), (ANY, second), (ANY, ANY))
        both = [self.directed(x, y, window, where) + self.directed(y, x, window, where) for x, y in cells]
        return ExpectedTable(*both)

    def _sum(self, value: Callable[[str], Floats], where: Mask | None) -> float:
        contexts, total = self._contexts, 0.0
        for g, genre in enumerate(GENRES):
            chosen = contexts.genre == g
            if where is not None:
                chosen = chosen & where
            opening, body, closing = ROOTS[genre]
            for root, weights in (
                (opening, contexts.share),
                (body, contexts.sentence_weights()),
                (closing, contexts.share),
            ):
                total += float((np.broadcast_to(value(root), len(contexts)) * weights)[chosen].sum())
        return total / float(contexts.share.sum() if where is None else contexts.share[where].sum())


def _pairs() -> list[tuple[str, str]]:
    pairs = [(p.first, p.second) for p in planted.PAIRS]
    pairs += [(x, y) for x, y, _, _ in planted.PAIR_DRIFTS] + list(planted.GENRE_PAIRS)
    pairs += [(x, y) for _, x, y in planted.TOPIC_PAIRS + planted.DISCONTINUOUS] + [planted.BURST_WORDS]
    pairs += [("further", "notice")]
    single = [w for _, w in planted.EXPRESSIONS] + [*planted.GENRE_WORDS, planted.HABIT_WORD]
    pairs += [(word, ANY) for word in single]
    pairs += [(word, ANY) for _, old, new in planted.WORD_DRIFTS for word in (old, new)]
    return pairs + [(y, x) for x, y in pairs]


@cache
def truth() -> Truth:
    """Expected numbers for everything planted, computed at the first call and kept."""
    return Truth(model(), _pairs())
