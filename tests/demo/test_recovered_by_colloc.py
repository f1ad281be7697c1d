"""What is planted in the demo texts comes out of the program itself, within the intervals of its own counts.

The truths come from the generator's probabilities (``corpora_demo/truths.json``), not from any counting. Intervals are
at 99.9 %: the text is fixed, so what passes once passes always.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.stats import binomtest

import colloc
from colloc.answers.columns import Columns
from corpora_demo.generate import identifier, talkative_number

ROOT = Path(__file__).parents[2]
Items = list[dict[str, Any]]


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The demo without its talkative document, which the truths leave out."""
    path = tmp_path_factory.mktemp("demo") / "demo.colloc"
    colloc.build(path, [str(ROOT / "corpora_demo" / name) for name in ("logbooks.jsonl", "notices.jsonl")], jobs=1)
    colloc.remove(path, identifiers=[identifier(talkative_number(600))])
    return path


def row_of(table: Columns, second: str) -> dict[str, Any]:
    return next((row for row in table.to_dicts() if row["second"] == second), {})


def chosen(items: Items, *kinds: str) -> Items:
    return [item for item in items if item["kind"] in kinds]


def test_the_talkative_document_is_the_one_removed(store: Path) -> None:
    rows = row_of(colloc.around(store, ["green"], window=1, directed=True, limit=0, min_count=1), "lamp")
    assert rows["joint"] < 20


def test_next_words(items: Items, store: Path) -> None:
    for item in chosen(items, "adjacent", "company"):
        first, second = item["words"]
        row = row_of(colloc.around(store, [first], window=1, directed=True, limit=0, min_count=1), second)
        interval = binomtest(row["joint"], row["first_total"]).proportion_ci(0.999)
        assert interval.low <= item["next_given_first"] <= interval.high, item["words"]
        # log2 of the ratio of two proportions: standard errors of the joint count and of the second margin.
        error = (1 / row["joint"] + 1 / row["second_total"]) ** 0.5 / np.log(2)
        assert row["pmi"] == pytest.approx(item["pmi_next"], abs=3.3 * error), item["words"]


def test_words_near_each_other(items: Items, store: Path) -> None:
    for item in chosen(items, "adjacent", "windowed", "company"):
        first, second = item["words"]
        row = row_of(colloc.around(store, [first], limit=0, min_count=1), second)
        error = (1 / row["joint"] + 10 / row["first_total"] + 10 / row["second_total"]) ** 0.5 / np.log(2)
        assert row["pmi"] == pytest.approx(item["pmi_window_5"], abs=3.3 * error), item["words"]


def test_avoided_words_are_listed_as_avoiding(items: Items, store: Path) -> None:
    for item in chosen(items, "avoided"):
        first, second = item["words"]
        found = colloc.around(store, [first], avoid=True, limit=0)
        row = row_of(found, second)
        if item["pairs_window_5_per_million_words"] < item["pairs_window_5_if_independent"] / 4:
            assert row, f"{first} and {second} should be among the avoided"
            assert row["joint"] < row["expected"] / 4


def test_drifts_have_the_direction_that_was_planted(items: Items, store: Path) -> None:
    for item in chosen(items, "drift_word"):
        old, new = item["words"]
        shares = []
        for years in ("1871..1877", "1878..1884", "1885..1890"):
            counts = {
                word: int(colloc.words(store, pattern=word, where=[f"year={years}"], limit=1)["count"][0])
                for word in (old, new)
            }
            shares.append(counts[new] / (counts[old] + counts[new]))
        assert shares == sorted(shares), item["words"]
        assert shares[-1] > shares[0] + 0.4


def test_genre_words(items: Items, store: Path) -> None:
    for item in chosen(items, "genre_word"):
        (word,) = item["words"]
        for genre, rate in item["per_million"].items():
            found = colloc.words(store, pattern=word, where=[f"genre={genre}"], limit=1)
            rate_found = float(found["per_million"][0]) if len(found) else 0.0
            counted = int(found["count"][0]) if len(found) else 0
            assert rate_found == pytest.approx(rate, rel=4 / max(counted, 1) ** 0.5 + 0.02, abs=40), (word, genre)


def test_topical_words_attract_each_other_less_than_collocations(items: Items, store: Path) -> None:
    strongest = colloc.pairs(store, measure="g2", limit=60)
    listed = {frozenset(pair) for pair in zip(strongest["first"], strongest["second"], strict=True)}
    assert frozenset(("thick", "fog")) in listed
    for item in chosen(items, "topic"):
        assert frozenset(item["words"]) not in listed
