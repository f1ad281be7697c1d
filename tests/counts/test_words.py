"""Words, documents and dispersion from the stream."""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import numpy as np
import pytest

from colloc.counts import words
from colloc.counts.words import slice_dispersion, slice_word_counts
from colloc.records import NO_TERM
from tests.counts import stores

pytestmark = pytest.mark.usefixtures("loops")


@pytest.mark.parametrize("sparsest", [0, 1000], ids=["sorted", "tables"])
def test_words_and_documents_are_plain_counts(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, sparsest: int) -> None:
    """Oracle: Python's Counter over the documents; blocks cut inside documents, one word of a document in each."""
    monkeypatch.setattr(words, "_SPARSEST", sparsest)
    text = stores.random_text(seed=21, tokens=2500, types=80, n_documents=9, sentence=9.0)
    chosen = {"": range(9), "half=a": range(0, 9, 2), "half=b": range(1, 9, 2)}
    for blocks in ([], [10, 11, 12, 1000, 1001, 2499], range(100, 2500, 100)):
        path = tmp_path / f"s{len(blocks)}"
        with stores.make_store(path, text, list(blocks)) as store:
            for where, numbers in chosen.items():
                found = slice_word_counts(store, "form", where)
                parts = [text.types[begin:stop].tolist() for begin, stop in text.document_bounds()]
                tokens = Counter(kind for number in numbers for kind in parts[number])
                holding = Counter(kind for number in numbers for kind in set(parts[number]))
                assert found.tokens.tolist() == [tokens[kind] for kind in range(80)]
                assert found.documents.tolist() == [holding[kind] for kind in range(80)]


def test_dispersion_by_its_definition(tmp_path: Path) -> None:
    """DP = half the sum of abs(v - s) over all documents; DPnorm = DP / (1 - min s) (Lijffijt & Gries 2012)."""
    text = stores.random_text(seed=22, tokens=1500, types=60, n_documents=7)
    with stores.make_store(tmp_path / "s", text, [200, 900]) as store:
        dp, dp_norm = slice_dispersion(store, "form")
    sizes = np.array([stop - begin for begin, stop in text.document_bounds()])
    shares = sizes / sizes.sum()
    for kind in range(60):
        counts = np.array([(text.types[begin:stop] == kind).sum() for begin, stop in text.document_bounds()])
        if counts.sum() == 0:
            assert np.isnan(dp[kind])
            assert np.isnan(dp_norm[kind])
            continue
        expected = np.abs(counts / counts.sum() - shares).sum() / 2
        assert dp[kind] == pytest.approx(expected, abs=1e-12)
        assert dp_norm[kind] == pytest.approx(expected / (1 - shares.min()), abs=1e-12)


def test_dispersion_needs_two_documents(tmp_path: Path) -> None:
    text = stores.random_text(seed=22, tokens=100, types=20, n_documents=1)
    with stores.make_store(tmp_path / "s", text) as store:
        dp, dp_norm = slice_dispersion(store, "form")
    there = np.bincount(text.types, minlength=20) > 0
    assert np.allclose(dp[there], 0.0)
    assert np.isnan(dp_norm).all()


def test_removed_tokens_are_no_words(tmp_path: Path) -> None:
    text = stores.random_text(seed=23, tokens=300, types=20, n_documents=3)
    text.types[text.documents[1] : text.documents[2]] = NO_TERM
    with stores.make_store(tmp_path / "s", text, [50, 150]) as store:
        found = slice_word_counts(store, "form", "id=d0,d1")
    expected = np.bincount(text.types[: text.documents[1]], minlength=20)
    assert found.tokens.tolist() == expected.tolist()
    assert found.documents.tolist() == (expected > 0).astype(int).tolist()
