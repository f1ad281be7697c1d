"""Expected counts against every sentence of a small grammar, written out one by one, and against a long simulation."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator

import numpy as np
import pytest

from corpora_demo.contexts import all_contexts
from corpora_demo.expectation import ANY, WINDOW, Expectation
from corpora_demo.generate import documents
from corpora_demo.grammar import PUNCTUATION, Rule, read_rules
from corpora_demo.items import truths
from corpora_demo.truth import truth

from .counting import Counted

SMALL = {
    "SENTENCE": "3 | the NOUN , PHRASE , sank .\n1 | PHRASE and PHRASE .\n0.5*paraffin | NOUN .",
    "PHRASE": "2 | a red NOUN\n1 | NOUN\n4 | red red NOUN of the PLACE",
    "NOUN": "1 | boat\nparaffin | lamp\n2 | red boat",
    "PLACE": "1 | bay\n3 | long NAME bay of the boat",
    "NAME": "1 | x y z\n1 | q",
}


def written_out(
    rules: dict[str, list[Rule]], symbols: tuple[str, ...], context: int
) -> Iterator[tuple[list[str], float]]:
    """Every sentence and its probability."""
    if not symbols:
        yield [], 1.0
        return
    head, rest = symbols[0], symbols[1:]
    heads: Iterator[tuple[list[str], float]] = iter([([head], 1.0)])
    if head in rules:
        heads = (
            (words, chance * float(rule.probability[context if len(rule.probability) > 1 else 0]))
            for rule in rules[head]
            for words, chance in written_out(rules, rule.symbols, context)
        )
    tails = list(written_out(rules, rest, context))
    for words, chance in heads:
        for tail, tail_chance in tails:
            yield words + tail, chance * tail_chance


@pytest.mark.parametrize("context", [0, 40])
def test_expectations_equal_writing_everything_out(context: int) -> None:
    rules = read_rules(SMALL, all_contexts())
    pairs = [("red", "boat"), ("boat", "red"), ("red", "red"), ("a", "lamp"), ("the", "bay"), ("sank", "the")]
    expectation = Expectation(rules, pairs)
    by_distance: dict[tuple[str, str, int], float] = defaultdict(float)
    counts: dict[str, float] = defaultdict(float)
    total = 0.0
    for symbols, chance in written_out(rules, ("SENTENCE",), context):
        total += chance
        words = [symbol for symbol in symbols if symbol not in PUNCTUATION]
        for i, x in enumerate(words):
            counts[x] += chance
            counts[ANY] += chance
            for j in range(i + 1, len(words)):
                for pair in ((x, words[j]), (x, ANY), (ANY, words[j]), (ANY, ANY)):
                    by_distance[(*pair, j - i)] += chance
    assert total == pytest.approx(1.0)
    margins = [(x, ANY) for x, _ in pairs] + [(ANY, y) for _, y in pairs] + [(ANY, ANY)]
    for x, y in pairs + margins:
        for window in (1, 2, 5, WINDOW):
            true = sum(by_distance[x, y, distance] for distance in range(1, window + 1))
            values = expectation.directed("SENTENCE", x, y, window)
            assert float(values[context if len(values) > 1 else 0]) == pytest.approx(true, rel=1e-10), (x, y, window)
    for word in ("red", "lamp", ANY):
        values = expectation.count("SENTENCE", word)
        assert float(values[context if len(values) > 1 else 0]) == pytest.approx(counts[word])


def test_a_rule_that_is_wrong_is_named() -> None:
    contexts = all_contexts()
    with pytest.raises(ValueError, match=r"A: a rule is 'weight \| symbols', not 'no bar'"):
        read_rules({"A": "no bar"}, contexts)
    with pytest.raises(ValueError, match="A: no rule is called MISSING"):
        read_rules({"A": "1 | the MISSING"}, contexts)
    with pytest.raises(ValueError, match="A: no curve is called moon"):
        read_rules({"A": "2*moon | the"}, contexts)


def test_a_long_simulation_agrees() -> None:
    """A larger corpus of another seed: each planted pair within 4 standard errors over groups of documents."""
    made = list(documents(20_260, 2_000, bursty=False))
    groups = [Counted(made[start::40], window=5) for start in range(40)]
    planted = [item for item in truths()["items"] if item["kind"] in {"adjacent", "windowed", "company", "avoided"}]
    for first, second in [item["words"] for item in planted]:
        rates = np.array([group.symmetric(first, second) / group.documents for group in groups])
        error = rates.std(ddof=1) / len(groups) ** 0.5
        assert abs(rates.mean() - truth().symmetric_table(first, second, 5).joint) <= 4 * error, (first, second)
    words = np.array([group.n_words / group.documents for group in groups])
    assert words.mean() == pytest.approx(truth().words(ANY), abs=4 * words.std(ddof=1) / len(groups) ** 0.5)
