"""Intervals of PMI against the truth: how often the 95 % interval covers it, on simulated corpora.

Sources of the truth: for the demo generator the expected counts computed from its rules (`corpora_demo.truth`), for
text that clusters by topic the moments of the Dirichlet distribution (`simulating.Topical`); no samples in either.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import pytest

from colloc.answers.sureness.documents import SOUND_DOCUMENTS, SOUND_JOINT
from corpora_demo import planted
from corpora_demo.truth import truth
from tests.sureness.simulating import Corpus, Estimates, Topical, demo_corpus, estimates

TOPICAL = Topical()
DEMO_DOCUMENTS = 300
CLASSES = (
    (SOUND_JOINT, np.inf, SOUND_DOCUMENTS, np.inf),
    (SOUND_JOINT, np.inf, 1, SOUND_DOCUMENTS),
    (10, SOUND_JOINT, 1, np.inf),
    (5, 10, 1, np.inf),
    (2, 5, 1, np.inf),
    (1, 2, 1, np.inf),
)
"""Joint count from and below, documents from and below."""


def demo_pairs() -> tuple[list[tuple[str, str]], np.ndarray]:
    """The planted pairs that can occur, and their true PMI with window 5."""
    pairs = [(pair.first, pair.second) for pair in planted.PAIRS]
    pairs += [(first, second) for first, second, _, _ in planted.PAIR_DRIFTS]
    pairs += [(first, second) for _, first, second in planted.TOPIC_PAIRS + planted.DISCONTINUOUS]
    pairs = list(dict.fromkeys([*pairs, planted.BURST_WORDS]))
    values = [truth().symmetric_table(first, second, 5).pmi for first, second in pairs]
    known = [(pair, value) for pair, value in zip(pairs, values, strict=True) if value is not None]
    return [pair for pair, _ in known], np.array([value for _, value in known])


def demo_estimates(simulations: int, *, bursty: bool) -> Iterator[Estimates]:
    pairs, _ = demo_pairs()
    numbers: dict[str, int] = {}
    first = np.array([numbers.setdefault(x, len(numbers)) for x, _ in pairs], np.uint32)
    second = np.array([numbers.setdefault(y, len(numbers)) for _, y in pairs], np.uint32)
    for seed in range(simulations):
        corpus = demo_corpus(1000 + seed, DEMO_DOCUMENTS, bursty=bursty, numbers=numbers)
        yield estimates(corpus, first, second, len(numbers))


def topical_pairs() -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    random = np.random.default_rng(5)
    first, second = (random.integers(0, TOPICAL.words, 150).astype(np.uint32) for _ in range(2))
    return first, second, TOPICAL.pmi(first, second)


def topical_estimates(simulations: int, n_documents: int, longest: int) -> Iterator[Estimates]:
    first, second, _ = topical_pairs()
    for seed in range(simulations):
        yield estimates(TOPICAL.corpus(seed, n_documents, longest), first, second, TOPICAL.words)


class Coverage:
    """Shares of intervals that cover the truth, by class of joint count and documents."""

    def __init__(self, found: Iterator[Estimates], true: np.ndarray) -> None:
        rows = list(found)
        self.joint = np.array([row.joint for row in rows])
        self.documents = np.array([row.documents for row in rows])
        self.jackknife = np.array([(row.jackknife.low <= true) & (true <= row.jackknife.high) for row in rows])
        self.formula = np.array([(row.formula.low <= true) & (true <= row.formula.high) for row in rows])

    def chosen(self, joint_from: float, joint_below: float, docs_from: float, docs_below: float) -> np.ndarray:
        wide = (self.joint >= joint_from) & (self.joint < joint_below)
        return wide & (self.documents >= docs_from) & (self.documents < docs_below)

    def tell(self, name: str) -> None:
        print(f"\n{name}")
        for limits in CLASSES:
            rows = self.chosen(*limits)
            if rows.any():
                shares = f"jackknife {self.jackknife[rows].mean():.3f}, formula {self.formula[rows].mean():.3f}"
                print(f"  joint {limits[0]}..{limits[1]} documents {limits[2]}..{limits[3]}: {shares} of {rows.sum()}")

    def sound(self) -> tuple[float, float]:
        """Coverage of jackknife and formula where the tool trusts the interval."""
        rows = self.chosen(*CLASSES[0])
        return float(self.jackknife[rows].mean()), float(self.formula[rows].mean())


@pytest.mark.parametrize("bursty", [False, True])
def test_demo_corpora(bursty: bool) -> None:
    coverage = Coverage(demo_estimates(15, bursty=bursty), demo_pairs()[1])
    # some 360 intervals; those of one corpus are nearly independent: standard error 0.012
    assert 0.91 < coverage.sound()[0] < 0.99
    if bursty:
        # one document makes this pair: the formula is sure of it and wrong, leaving out documents is not
        talkative = demo_pairs()[0].index(planted.BURST_WORDS)
        assert (coverage.joint[:, talkative] >= 20).all()
        assert coverage.formula[:, talkative].mean() < 0.1
        assert coverage.jackknife[:, talkative].mean() > 0.8


def test_clustered_text() -> None:
    jackknife, formula = Coverage(topical_estimates(60, 60, 400), topical_pairs()[2]).sound()
    # some 1,000 intervals, standard error below 0.01
    assert 0.92 < jackknife < 0.98
    assert formula < 0.88


@pytest.mark.long
@pytest.mark.parametrize("bursty", [False, True])
def test_demo_corpora_long(bursty: bool) -> None:
    coverage = Coverage(demo_estimates(400, bursty=bursty), demo_pairs()[1])
    coverage.tell(f"demo, bursty {bursty}, 400 corpora")
    jackknife, _ = coverage.sound()
    assert 0.92 <= jackknife <= 0.98
    sound = coverage.chosen(*CLASSES[0])
    for pair, (first, second) in enumerate(demo_pairs()[0]):
        rows = sound[:, pair]
        if rows.sum() >= 300:
            own = coverage.jackknife[rows, pair].mean()
            print(f"  {first} {second}: {own:.3f} of {rows.sum()}, formula {coverage.formula[rows, pair].mean():.3f}")
            assert 0.9 <= own <= 0.995


@pytest.mark.long
@pytest.mark.parametrize(("n_documents", "longest"), [(100, 150), (300, 150), (60, 400), (300, 400)])
def test_clustered_text_long(n_documents: int, longest: int) -> None:
    coverage = Coverage(topical_estimates(1000, n_documents, longest), topical_pairs()[2])
    coverage.tell(f"clustered, {n_documents} documents of up to {longest} words, 1000 corpora")
    jackknife, formula = coverage.sound()
    assert 0.92 <= jackknife <= 0.98
    assert formula < 0.9


def test_a_corpus_is_what_it_says() -> None:
    corpus: Corpus = TOPICAL.corpus(1, 20)
    assert corpus.documents.max() == 19
    assert len(corpus.sentences) == 20
    numbers: dict[str, int] = {}
    demo = demo_corpus(1, 12, bursty=False, numbers=numbers)
    assert demo.documents.max() == 11
    assert demo.sentences[0] == 0
    assert len(demo.terms) > 1000
