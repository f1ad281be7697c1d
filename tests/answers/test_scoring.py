"""Given pairs: counts and measures as `pairs` gives them, in order, with what is unknown said."""

from __future__ import annotations

import time
from pathlib import Path

import numpy as np
import pytest

import colloc
from colloc.errors import DataError, UsageError
from colloc.measures.catalogue import MEASURES

CORPORA = Path(__file__).resolve().parents[2] / "corpora_demo"


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("scoring") / "demo.colloc"
    colloc.build(path, [str(CORPORA / "notices.jsonl")], jobs=1)
    return path


@pytest.mark.parametrize(
    "options",
    [{}, {"directed": True}, {"window": 2}, {"left": 1, "right": 3}, {"unit": True}, {"margins": "positions"}],
    ids=str,
)
def test_every_pair_as_pairs_lists_it(store: Path, options: dict[str, object]) -> None:
    listed = colloc.pairs(store, min_count=3, limit=0, show=["g2"], any_strength=True, **options)[:500]  # type: ignore[arg-type]
    order = np.random.default_rng(1).permutation(len(listed))
    shuffled = listed.take(order).select(["first", "second"])
    found = colloc.score(store, shuffled, show=["npmi", "g2"], **options)
    for name in ("first", "second", "joint", "first_total", "second_total", "total", "expected", "g2"):
        np.testing.assert_array_equal(found[name], listed[name][order])
    assert not any(found["unknown"])


def test_tokens_margins_bear_the_pmi_family_only(store: Path) -> None:
    found = colloc.score(store, [("fog", "sea")], margins="tokens")
    assert "pmi" in found
    assert "g2" not in found
    with pytest.raises(UsageError, match="needs the cells"):
        colloc.score(store, [("fog", "sea")], margins="tokens", show=["g2"])


def test_unknown_words_and_pairs_never_met(store: Path) -> None:
    rare = colloc.words(store, sort="count", limit=0)["word"][-1]
    pairs = [
        ("passengers", "the"),
        ("kraken", "the"),
        ("the", "kraken"),
        ("kraken", "squid"),
        ("passengers", rare),
        ("The", "passengers"),
    ]
    found = colloc.score(store, pairs)
    assert found["unknown"].tolist() == ["", "first", "second", "both", "", ""]
    assert list(zip(found["first"], found["second"], strict=True)) == pairs
    assert np.isnan(found["pmi"][1:4]).all()
    assert found["joint"].tolist()[1:4] == [0, 0, 0]
    assert (found["joint"][4], found["pmi"][4], found["npmi"][4]) == (0, -np.inf, -1)
    assert found["g2"][0] == found["g2"][5]
    assert found["joint"].dtype.kind == "i"
    assert set(MEASURES) - set(found.names) == {"fisher_p", "fisher_log10_p"}
    assert len(colloc.score(store, [])) == 0


@pytest.mark.parametrize(
    "options", [{}, {"directed": True}, {"unit": True}, {"margins": "tokens"}, {"margins": "positions"}], ids=str
)
def test_a_known_word_keeps_its_total_beside_an_unknown_one(store: Path, options: dict[str, object]) -> None:
    pairs = [("passengers", "the"), ("kraken", "the"), ("passengers", "squid"), ("kraken", "squid")]
    found = colloc.score(store, pairs, show=["pmi"], **options)
    first, second = found["first_total"].tolist(), found["second_total"].tolist()
    assert first[0] > 0 < second[0]
    assert first[1:] == [0, first[0], 0]
    assert second[1:] == [second[0], 0, 0]


def test_many_words_are_numbered_as_few(store: Path) -> None:
    """Many are looked up in a table of all words, few one by one: also folded, unknown ones and what is no text."""
    words = ["the", "The", "kraken", "PASSENGERS", "", None, 7, "straße"] * 1000
    table = {"first": words, "second": words[3:] + words[:3]}
    many = colloc.score(store, table, show=["pmi"])
    few = colloc.score(store, {name: values[:8] for name, values in table.items()}, show=["pmi"])
    for name in many.names:
        np.testing.assert_array_equal(many[name][:8], few[name])
        np.testing.assert_array_equal(many[name], np.tile(few[name], 1000))
    assert few["unknown"].tolist()[:3] == ["", "second", "both"]


def test_other_columns_pass_through(store: Path) -> None:
    found = colloc.score(store, {"n": [1, 2], "first": ["the", "a"], "second": ["passengers", "boat"]}, show=["pmi"])
    assert found.names[:4] == ("n", "first", "second", "unknown")
    with pytest.raises(DataError, match="no column second; there are first"):
        colloc.score(store, {"first": ["a"]})


def test_lots_one_after_the_other_are_one_lot(store: Path) -> None:
    words = colloc.words(store, limit=0)["word"]
    random = np.random.default_rng(4)
    first, second = (random.choice(words, 12_000).astype(object) for _ in range(2))
    first[5], second[9] = "The", "KRAKEN"
    whole = colloc.score(store, {"first": first, "second": second}, show=["npmi"])
    with colloc.scorer(store, show=["npmi"]) as scorer:
        parts = [scorer.score({"first": first[i : i + 500], "second": second[i : i + 500]}) for i in (0, 500)]
    for start, part in zip((0, 500), parts, strict=True):
        for name in part.names:
            np.testing.assert_array_equal(part[name], whole[name][start : start + 500])
    assert whole["unknown"][9] == "second"
    assert whole["unknown"][5] == ""


@pytest.mark.bench
def test_a_million_pairs_take_seconds(store: Path) -> None:
    words = colloc.words(store, limit=0)["word"]
    random = np.random.default_rng(4)
    first, second = (random.choice(words, 1_000_000) for _ in range(2))
    begin = time.process_time()
    colloc.score(store, {"first": first, "second": second})
    assert time.process_time() - begin < 5
