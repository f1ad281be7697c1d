"""The generated stream behaves as its law says; real text keeps its words."""

from __future__ import annotations

import io
from collections import Counter
from pathlib import Path

import numpy as np
import pytest

from .texts import EXPONENT, OFFSET, draw_ranks, spell, write_real, write_stream


def stream(tokens: int, seed: int = 1) -> bytes:
    out = io.BytesIO()
    write_stream(out, tokens=tokens, seed=seed)
    return out.getvalue()


def test_the_stream_has_the_words_asked_for_and_repeats_itself() -> None:
    text = stream(30_000)
    assert len(text.split()) == 30_000
    assert text.endswith(b".\n")
    assert text == stream(30_000)
    assert text != stream(30_000, seed=2)


def test_spelling_tells_every_rank_apart() -> None:
    ranks = np.concatenate([np.arange(70_000), 64 ** np.arange(1, 5), 64 ** np.arange(2, 6) - 1])
    words = spell(ranks, np.zeros(len(ranks), bool)).split()
    assert len(words) == len(ranks)
    assert len(set(words)) == len(np.unique(ranks))
    assert {len(word) for word in words[:64]} == {2}


def test_frequencies_follow_the_law() -> None:
    """P(rank >= r) = (OFFSET / (OFFSET + r))^(EXPONENT - 1); within five standard errors of a binomial share."""
    ranks = draw_ranks(np.random.default_rng(3), 200_000)
    for rank in (1, 10, 100, 10_000):
        share = (OFFSET / (OFFSET + rank)) ** (EXPONENT - 1)
        assert abs((ranks >= rank).mean() - share) < 5 * np.sqrt(share * (1 - share) / len(ranks))


def test_the_vocabulary_grows_with_the_text() -> None:
    """Types ~ N^(1/EXPONENT) for an unbounded Zipf law (Herdan-Heaps); the offset bends it at small sizes."""
    ranks = draw_ranks(np.random.default_rng(4), 2_000_000)
    sizes = np.array([125_000, 500_000, 2_000_000])
    types = [len(np.unique(ranks[:size])) for size in sizes]
    slope = np.polyfit(np.log(sizes), np.log(types), 1)[0]
    assert slope == pytest.approx(1 / EXPONENT, abs=0.04)


def test_sentence_lengths() -> None:
    lengths = Counter(len(line.split()) for line in stream(100_000).splitlines())
    mean = sum(length * count for length, count in lengths.items()) / lengths.total()
    assert 18 < mean < 22


def test_real_text_comes_one_sentence_a_line(tmp_path: Path) -> None:
    source = tmp_path / "a.txt"
    source.write_text('It rained. "Go in!" she said. He went at 3.5 knots.\n\nMr. Owl slept.\n', encoding="utf-8")
    out = io.BytesIO()
    assert write_real(out, [source]) == 14
    assert out.getvalue().decode().splitlines() == [
        "It rained.",
        '"Go in!" she said.',
        "He went at 3.5 knots.",
        "Mr.",
        "Owl slept.",
    ]
    out = io.BytesIO()
    assert write_real(out, [source], tokens=5) == 11
