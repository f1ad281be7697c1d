"""A grammar without recursion, compiled to arrays, and vectorised sampling of sentences from it.

Rules are written as ``NAME: "weight | symbols..."`` lines. A weight is a number, a
curve of `corpora_demo.contexts`, or ``number*curve``; the weights of a name are
scaled to sum to 1 in each context. Names in capitals stand for other rules, anything
else is a word or a punctuation mark. Rules of a sentence are chosen independently of
one another, which makes every expected count computable (`corpora_demo.expectation`).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from corpora_demo.contexts import Contexts
from corpora_demo.vocabulary import NO_AN, SILENT_H, STATIONS

PUNCTUATION = frozenset(",;:.")
ARTICLE = "a(n)"
"""Written 'a' or 'an', as the next word wants."""
STATION = "@station"
"""Written as the name of the document's station."""

IntArray = NDArray[np.int64]
Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Rule:
    """One way to write a name: its symbols, and its probability in each context (or a single number)."""

    name: str
    symbols: tuple[str, ...]
    probability: Floats  # shape (contexts,) or (1,)


def read_rules(texts: Mapping[str, str], contexts: Contexts) -> dict[str, list[Rule]]:
    """Parse rule lines; raises ValueError naming the rule that is wrong."""
    rules: dict[str, list[Rule]] = {}
    for name, text in texts.items():
        lines = [line.strip() for line in text.strip().splitlines()]
        weights, bodies = [], []
        for line in lines:
            weight, bar, body = line.partition("|")
            if not bar or not body.split():
                raise ValueError(f"{name}: a rule is 'weight | symbols', not {line!r}")
            try:
                weights.append(_weight(weight.strip(), contexts))
            except ValueError as error:
                raise ValueError(f"{name}: {error}") from error
            bodies.append(tuple(body.split()))
        total = np.add.reduce(np.broadcast_arrays(*weights))
        # A name of one topic is never reached in the others: there any probabilities will do.
        safe = np.where(total > 0, total, 1.0)
        rules[name] = [Rule(name, body, weight / safe) for weight, body in zip(weights, bodies, strict=True)]
    for name, choices in rules.items():
        for rule in choices:
            for symbol in rule.symbols:
                if symbol.isupper() and len(symbol) > 1 and symbol not in rules:
                    raise ValueError(f"{name}: no rule is called {symbol}")
    return rules


def _weight(text: str, contexts: Contexts) -> Floats:
    number, star, curve = text.partition("*")
    if star:
        return float(number) * contexts.curve(curve)
    try:
        return np.array([float(text)])
    except ValueError:
        return contexts.curve(text)


class Sampler:
    """Draws sentences. Only ``Generator.random`` is used, whose stream numpy keeps the same between versions."""

    def __init__(self, rules: Mapping[str, list[Rule]], contexts: Contexts) -> None:
        self.names = {name: number for number, name in enumerate(rules)}
        flat = [rule for choices in rules.values() for rule in choices]
        words = {symbol for rule in flat for symbol in rule.symbols if symbol not in rules}
        self.words = [*sorted(words - {ARTICLE, STATION} | set(STATIONS) | {"a", "an"}), ARTICLE, STATION]
        self.word_numbers = {word: number for number, word in enumerate(self.words)}
        n_words, n_rules = len(self.words), len(flat)
        codes = self.word_numbers | {name: n_words + number for name, number in self.names.items()}
        self._symbols: IntArray = np.array([codes[symbol] for rule in flat for symbol in rule.symbols])
        self._lengths: IntArray = np.array([len(rule.symbols) for rule in flat])
        self._starts: IntArray = np.cumsum(self._lengths) - self._lengths
        self._last_rule: IntArray = np.cumsum([len(choices) for choices in rules.values()]) - 1
        # One ascending table for all contexts and names: entry = group number + cumulated probability.
        thresholds = np.empty((len(contexts), n_rules))
        for number, choices in enumerate(rules.values()):
            stop = int(self._last_rule[number]) + 1
            block = thresholds[:, stop - len(choices) : stop]
            for column, rule in enumerate(choices):
                block[:, column] = rule.probability
            np.cumsum(block, axis=1, out=block)
            block[:, -1] = 1.0
            block += np.arange(len(contexts))[:, None] * len(rules) + number
        self._thresholds = thresholds.ravel()
        self._n_rules, self._n_names = n_rules, len(rules)
        plain = [word if word in PUNCTUATION else " " + word for word in self.words]
        upper = [word[0].upper() + word[1:] for word in self.words]
        self._pieces = np.array(plain + [" " + w for w in upper] + ["\n" + w for w in upper], dtype=object)
        vowel = [(w[0].lower() in "aeiou" and w not in NO_AN) or w in SILENT_H for w in self.words]
        self._vowel: NDArray[np.bool_] = np.array(vowel)

    def sample(self, random: np.random.Generator, roots: IntArray, contexts: IntArray) -> tuple[IntArray, IntArray]:
        """Write one sentence for each root (number of a rule name) and context.

        Returns the word numbers of all sentences in a row, and for each word the
        number of its sentence.
        """
        n_words = len(self.words)
        symbols, sentences = roots + n_words, np.arange(len(roots))
        while True:
            (where,) = np.nonzero(symbols >= n_words)
            if not len(where):
                return symbols, sentences
            names = symbols[where] - n_words
            context = contexts[sentences[where]]
            group = context * self._n_names + names
            found = np.searchsorted(self._thresholds, group + random.random(len(where)), side="right")
            rule = np.minimum(found - context * self._n_rules, self._last_rule[names])
            lengths = np.ones(len(symbols), dtype=np.int64)
            lengths[where] = self._lengths[rule]
            # A word is its own expansion of one symbol: it is copied from the front of the pool.
            pool = np.concatenate([symbols, self._symbols])
            starts = np.arange(len(symbols))
            starts[where] = self._starts[rule] + len(symbols)
            offsets = np.repeat(starts - (np.cumsum(lengths) - lengths), lengths)
            symbols, sentences = pool[offsets + np.arange(len(offsets))], np.repeat(sentences, lengths)

    def write(
        self, words: IntArray, sentences: IntArray, stations: IntArray, paragraphs: NDArray[np.bool_]
    ) -> list[str]:
        """Turn word numbers into pieces of text to be joined.

        `stations` holds the word number of the station of each sentence, `paragraphs`
        whether the sentence begins a paragraph.
        """
        words = words.copy()
        at = words == self.word_numbers[STATION]
        words[at] = stations[sentences[at]]
        (articles,) = np.nonzero(words == self.word_numbers[ARTICLE])
        an, a = self.word_numbers["an"], self.word_numbers["a"]
        words[articles] = np.where(self._vowel[words[articles + 1]], an, a)
        first = np.flatnonzero(np.diff(sentences, prepend=-1))
        words[first] += len(self.words) * np.where(paragraphs[sentences[first]], 2, 1)
        pieces: list[str] = self._pieces[words].tolist()
        return pieces
