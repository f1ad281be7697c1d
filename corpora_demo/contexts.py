"""What a document's wording depends on: genre, year, topic and one keeper's habit.

A *context* is one combination of them. Every probability of the grammar is a
number or a *curve*: one value for each context. Curves are linear in the year,
so they are the same to the last bit on every machine.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from corpora_demo.vocabulary import AUTHORS, HABIT_AUTHOR, TOPICS

FIRST_YEAR, LAST_YEAR = 1871, 1890
GENRES = ("log", "notice")
YEARS = tuple(range(FIRST_YEAR, LAST_YEAR + 1))
BODY_SENTENCES = {"log": (18, 30), "notice": (16, 26)}
"""Least and largest number of sentences of a document between its opening and its closing one, all equally likely."""

SHARES: dict[str, tuple[float, float]] = {
    "paraffin": (0.05, 0.95),
    "steamer": (0.15, 0.85),
    "steam_launch": (0.10, 0.75),
    "signal_flags": (0.85, 0.25),
}
"""Curves that go straight from a probability in the first year to one in the last."""


def authors_of(genre: str, year: int) -> list[str]:
    """Names of those who write in a genre and year, each document's author being one of them with equal chance."""
    return [a.name for a in AUTHORS if a.genre == genre and a.first_year <= year <= a.last_year]


@dataclass(frozen=True)
class Contexts:
    """All contexts, as columns of equal length."""

    genre: NDArray[np.int64]
    year: NDArray[np.int64]
    topic: NDArray[np.int64]
    habit: NDArray[np.int64]
    share: NDArray[np.float64]
    """Probability that a document has this context; sums to 1."""

    def __len__(self) -> int:
        return len(self.genre)

    @cached_property
    def _numbers(self) -> dict[tuple[int, int, int, int], int]:
        columns = (self.genre.tolist(), self.year.tolist(), self.topic.tolist(), self.habit.tolist())
        return {key: number for number, key in enumerate(zip(*columns, strict=True))}

    def number(self, genre: str, year: int, topic: int, habit: bool) -> int:
        """Number of one context."""
        return self._numbers[GENRES.index(genre), year, topic, int(habit)]

    def curve(self, name: str) -> NDArray[np.float64]:
        """Values of a curve, one a context; ``not_NAME`` is one minus it, ``topic_NAME`` 1 within that topic."""
        if name.startswith("not_"):
            return 1.0 - self.curve(name.removeprefix("not_"))
        if name == "habit":
            return self.habit.astype(np.float64)
        if name.startswith("topic_"):
            topic = name.removeprefix("topic_")
            for g, genre in enumerate(GENRES):
                if topic in TOPICS[genre]:
                    own: NDArray[np.bool_] = (self.genre == g) & (self.topic == list(TOPICS[genre]).index(topic))
                    return own.astype(np.float64)
        if name not in SHARES:
            raise ValueError(f"no curve is called {name}")
        start, end = SHARES[name]
        passed: NDArray[np.float64] = (self.year - FIRST_YEAR) / (LAST_YEAR - FIRST_YEAR)
        values: NDArray[np.float64] = start + (end - start) * passed
        return values

    def sentence_weights(self) -> NDArray[np.float64]:
        """Expected number of body sentences that one document adds in each context."""
        means = np.array([sum(BODY_SENTENCES[genre]) / 2 for genre in GENRES])
        weights: NDArray[np.float64] = self.share * means[self.genre]
        return weights


def all_contexts() -> Contexts:
    """Genres and years are dealt evenly, topics and authors drawn with equal chances."""
    rows: list[tuple[int, int, int, int, float]] = []
    for g, genre in enumerate(GENRES):
        for year in YEARS:
            names = authors_of(genre, year)
            habit_share = names.count(HABIT_AUTHOR) / len(names)
            for topic in range(len(TOPICS[genre])):
                share = 1 / len(GENRES) / len(YEARS) / len(TOPICS[genre])
                rows.append((g, year, topic, 0, share * (1 - habit_share)))
                if habit_share:
                    rows.append((g, year, topic, 1, share * habit_share))
    genre_, year_, topic_, habit_, share_ = zip(*rows, strict=True)
    return Contexts(np.array(genre_), np.array(year_), np.array(topic_), np.array(habit_), np.array(share_))
