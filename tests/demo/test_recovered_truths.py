"""What is planted is found again in the committed text by plain counting.

Intervals are exact binomial (Clopper & Pearson 1934, by scipy) or Poisson at 99.9 %:
the text is fixed, so a test that passes once passes always, and about sixty
intervals leave room for no more than chance.
"""

from __future__ import annotations

from collections import Counter
from typing import Any

import pytest
from scipy.stats import binomtest, poisson, spearmanr

from corpora_demo.generate import BURST_SENTENCES

from .counting import Counted, sentences

CONFIDENCE = 0.999
Documents = list[dict[str, Any]]
Items = list[dict[str, Any]]


@pytest.fixture(scope="module")
def adjacent(ordinary: Documents) -> Counted:
    return Counted(ordinary)


@pytest.fixture(scope="module")
def near(ordinary: Documents) -> Counted:
    return Counted(ordinary, window=5)


def of_kind(items: Items, *kinds: str) -> Items:
    found = [item for item in items if item["kind"] in kinds]
    assert {item["kind"] for item in found} == set(kinds)
    return found


def assert_probability(found: int, of: int, true: float, what: object) -> None:
    interval = binomtest(found, of).proportion_ci(CONFIDENCE)
    assert interval.low <= true <= interval.high, f"{what}: {found} of {of}, true {true}"


def assert_rate(found: int, expected: float, what: object) -> None:
    low, high = poisson.interval(CONFIDENCE, expected)
    assert low <= found <= high, f"{what}: {found}, expected {expected}"


def test_next_word_probabilities(items: Items, adjacent: Counted) -> None:
    for item in of_kind(items, "adjacent", "company", "avoided", "burst"):
        first, second = item.get("measured_by", item["words"])
        of = adjacent.followed[first]
        assert of >= 40, item["words"]
        assert_probability(adjacent.pairs[first, second], of, item["next_given_first"], item["words"])


def test_windowed_pairs(items: Items, near: Counted) -> None:
    for item in of_kind(items, "windowed"):
        first, second = item["words"]
        of = near.followed[first]
        assert_probability(near.pairs[first, second], of, item["within_5_after_each_first"], item["words"])
        assert near.symmetric(first, second) > 5 * near.symmetric_expected(first, second)


def test_pairs_and_independence_within_five_words(items: Items, near: Counted) -> None:
    for item in of_kind(items, "adjacent", "windowed", "company", "avoided"):
        first, second = item["words"]
        millions = near.n_words / 1e6
        assert_rate(near.symmetric(first, second), item["pairs_window_5_per_million_words"] * millions, item["words"])
        # Each margin has a standard error of about 1/sqrt(f), and the two may err together.
        error = near.words[first] ** -0.5 + near.words[second] ** -0.5
        true = item["pairs_window_5_if_independent"] * millions
        assert near.symmetric_expected(first, second) == pytest.approx(true, rel=3.3 * error), item["words"]


def test_avoided_pairs_are_far_below_expectation(items: Items, near: Counted) -> None:
    for item in of_kind(items, "avoided"):
        first, second = item["words"]
        assert min(near.words[first], near.words[second]) >= 200
        expected, found = near.symmetric_expected(first, second), near.symmetric(first, second)
        assert expected > 5
        if item["pairs_window_5_per_million_words"] == 0:
            assert found == 0
            assert poisson.cdf(found, expected) < 0.005
        else:
            assert 0 < found < expected


def test_near_synonyms_keep_different_company(adjacent: Counted) -> None:
    for noun, usual, unusual in (
        ("breeze", "brisk", "swift"),
        ("trade", "brisk", "swift"),
        ("tide", "swift", "brisk"),
        ("current", "swift", "brisk"),
        ("passage", "swift", "brisk"),
    ):
        assert adjacent.pairs[usual, noun] > 15
        assert adjacent.pairs[unusual, noun] == 0
    both = adjacent.pairs["brisk", "pace"], adjacent.pairs["swift", "pace"]
    assert_probability(both[0], sum(both), 0.5, "brisk or swift pace")


def test_expressions(items: Items, ordinary: Documents) -> None:
    texts = [" ".join(words) for document in ordinary for words in sentences(document["text"])]
    n_words = sum(text.count(" ") + 1 for text in texts)
    for item in of_kind(items, "expression", "habit"):
        phrase = " ".join(item["words"])
        found = sum(f" {text} ".count(f" {phrase} ") for text in texts)
        assert_rate(found, item["per_million"] * n_words / 1e6, phrase)


def test_expressions_with_a_gap(items: Items, ordinary: Documents) -> None:
    all_words = [words for document in ordinary for words in sentences(document["text"])]
    millions = sum(map(len, all_words)) / 1e6
    for item in of_kind(items, "discontinuous"):
        first, second = item["measured_by"]
        true = {int(distance): rate * millions for distance, rate in item["per_million_by_distance"].items()}
        found = Counter(
            j - i
            for words in all_words
            if first in words
            for i in range(len(words))
            for j in range(i + 1, min(i + 11, len(words)))
            if (words[i], words[j]) == (first, second)
        )
        assert found.keys() <= true.keys(), item["words"]
        for distance, expected in true.items():
            assert_rate(found[distance], expected, (item["words"], distance))


def by_year(documents: Documents) -> dict[int, Counted]:
    years = sorted({document["year"] for document in documents})
    return {year: Counted(d for d in documents if d["year"] == year) for year in years}


def test_drifts(items: Items, ordinary: Documents) -> None:
    yearly = by_year(ordinary)
    for item in of_kind(items, "drift_word", "drift_pair"):
        first, second = item["words"]
        shares = []
        for year, counted in yearly.items():
            if item["kind"] == "drift_word":
                found, of = counted.words[second], counted.words[first] + counted.words[second]
                true = item["share_by_year"][str(year)]
            else:
                found = counted.pairs[first, second]
                of = counted.followed[first] if item["given"] == "first" else counted.words[second]
                true = item["conditional_by_year"][str(year)]
            assert_probability(found, of, true, (item["words"], year))
            shares.append(found / of)
        # 20 years, t with 18 degrees of freedom: above 0.7 is beyond chance (p < 0.001), below 0.5 not (p > 0.02).
        rho = float(spearmanr(list(yearly), shares).statistic)
        low, high = {"rises": (0.7, 1.0), "falls": (-1.0, -0.7), "stays": (-0.5, 0.5)}[item["direction"]]
        assert low <= rho <= high, (item["words"], rho)


def test_genres(items: Items, ordinary: Documents) -> None:
    genres = {genre: Counted(d for d in ordinary if d["genre"] == genre) for genre in ("log", "notice")}
    for item in of_kind(items, "genre_word", "genre_pair"):
        for genre, counted in genres.items():
            if item["kind"] == "genre_word":
                (word,) = item["words"]
                true = item["per_million"][genre] / 1e6
                assert_probability(counted.words[word], counted.n_words, true, (word, genre))
            else:
                first, second = item["words"]
                true = item["next_given_first"][genre]
                assert_probability(counted.pairs[first, second], counted.followed[first], true, (first, second, genre))


def test_topical_words_share_documents_and_no_more(items: Items, ordinary: Documents) -> None:
    for item in of_kind(items, "topic"):
        first, second = item["words"]
        holders = [{w for s in sentences(d["text"]) for w in s} for d in ordinary]
        n_first = sum(first in words for words in holders)
        n_second = sum(second in words for words in holders)
        both = sum(first in words and second in words for words in holders)
        assert both > 3 * n_first * n_second / len(holders)
        on_topic = Counted((d for d, w in zip(ordinary, holders, strict=True) if first in w or second in w), window=5)
        assert abs(item["pmi_window_5_inside_topic"]) < 0.3
        assert item["pmi_window_5"] > 2
        # Inside their documents they meet in a sentence about as often as independent words would.
        assert_rate(on_topic.symmetric(first, second), on_topic.symmetric_expected(first, second), item["words"])


def test_habit_belongs_to_one_author(items: Items, committed: Documents) -> None:
    (item,) = of_kind(items, "habit")
    holders = [document for document in committed if " ".join(item["words"]) in document["text"].lower()]
    assert {document["author"] for document in holders} == {item["author"]}
    assert len(holders) > 10


def test_burst_is_one_document(items: Items, committed: Documents, adjacent: Counted) -> None:
    (item,) = of_kind(items, "burst")
    counts = {d["id"]: d["text"].lower().count(" ".join(item["words"])) for d in committed}
    assert {identifier: count for identifier, count in counts.items() if count} == {"log-0151": BURST_SENTENCES}
    first, second = item["measured_by"]
    assert min(adjacent.words[first], adjacent.words[second]) >= 50
    assert adjacent.pairs[first, second] < BURST_SENTENCES / 4
