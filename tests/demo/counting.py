"""A plain counter for the demo texts, on purpose independent of ``colloc``: regular expressions and loops."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable, Iterator
from typing import Any

WORD = re.compile(r"[a-z]+(?:'[a-z]+)?")


def sentences(text: str) -> Iterator[list[str]]:
    """Lower-case words of each sentence; in these texts a full stop ends a sentence and stands nowhere else."""
    for part in text.lower().split("."):
        words = WORD.findall(part)
        if words:
            yield words


class Counted:
    """Counts of some documents: words, and ordered pairs at distance 1..window inside sentences."""

    def __init__(self, documents: Iterable[dict[str, Any]], window: int = 1) -> None:
        self.words: Counter[str] = Counter()
        self.pairs: Counter[tuple[str, str]] = Counter()
        self.followed: Counter[str] = Counter()
        """Occurrences of a word that some word follows in its sentence."""
        self.documents = 0
        for document in documents:
            self.documents += 1
            for words in sentences(document["text"]):
                self.words.update(words)
                self.followed.update(words[:-1])
                for distance in range(1, window + 1):
                    self.pairs.update(zip(words, words[distance:], strict=False))
        self.n_words = self.words.total()

    def symmetric_expected(self, first: str, second: str) -> float:
        """Pairs of two words in either order, were they independent: row sum times column sum over the total."""
        row = sum(count * ((x == first) + (y == first)) for (x, y), count in self.pairs.items())
        column = sum(count * ((x == second) + (y == second)) for (x, y), count in self.pairs.items())
        return row * column / (2 * self.pairs.total())

    def symmetric(self, first: str, second: str) -> int:
        """Pairs of two words in either order."""
        return self.pairs[first, second] + self.pairs[second, first]
