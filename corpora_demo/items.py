"""The content of ``truths.json``: each planted item with its true strength, computed by `corpora_demo.truth`."""

from __future__ import annotations

from copy import deepcopy
from functools import cache
from math import log2
from typing import Any

from corpora_demo import planted
from corpora_demo.contexts import FIRST_YEAR, GENRES, LAST_YEAR, YEARS, authors_of
from corpora_demo.expectation import ANY
from corpora_demo.truth import Mask, truth
from corpora_demo.vocabulary import BURSTY_PHRASE, HABIT_AUTHOR, TOPICS

Item = dict[str, Any]


def _rounded(value: float | None) -> float | None:
    return None if value is None else float(f"{value:.6g}")


def _conditional(first: str, second: str, window: int, where: Mask | None = None) -> float | None:
    expected = truth().directed(first, ANY, 1, where)
    return _rounded(truth().directed(first, second, window, where) / expected) if expected else None


def _pair_item(pair: planted.PlantedPair) -> Item:
    adjacent = truth().directed_table(pair.first, pair.second, 1)
    near = truth().symmetric_table(pair.first, pair.second, 5)
    per_million = 1e6 / truth().words(ANY)
    return {
        "kind": pair.kind,
        "words": [pair.first, pair.second],
        "made_by": pair.made_by,
        "next_given_first": _rounded(adjacent.joint / adjacent.first_total),
        "next_overall": _rounded(adjacent.second_total / adjacent.total),
        "pmi_next": _rounded(adjacent.pmi),
        "pmi_window_5": _rounded(near.pmi),
        "within_5_after_each_first": _conditional(pair.first, pair.second, 5),
        "pairs_window_5_per_million_words": _rounded(near.joint * per_million),
        "pairs_window_5_if_independent": _rounded(near.independent * per_million),
    }


def _expression_items() -> list[Item]:
    items: list[Item] = []
    per_million = 1e6 / truth().words(ANY)
    for text, word in planted.EXPRESSIONS:
        rate = truth().directed("further", "notice", 1) if word == "notice" else truth().words(word)
        items.append(
            {
                "kind": "expression",
                "words": text.split(),
                "made_by": "fixed",
                "per_million": _rounded(rate * per_million),
            }
        )
    for text, first, second in planted.DISCONTINUOUS:
        upto = [0.0, *(truth().directed(first, second, d) * per_million for d in range(1, 11))]
        items.append(
            {
                "kind": "discontinuous",
                "words": text.split(),
                "made_by": "fixed but for the gap",
                "measured_by": [first, second],
                "per_million_by_distance": {
                    str(d): _rounded(upto[d] - upto[d - 1]) for d in range(1, 11) if upto[d] - upto[d - 1] > 1e-9
                },
            }
        )
    return items


def _drift_items() -> list[Item]:
    items: list[Item] = []
    where_year = {year: truth().where(year=year) for year in YEARS}
    for rule, old, new in planted.WORD_DRIFTS:
        shares = {y: truth().words(new, w) for y, w in where_year.items()}
        olds = {y: truth().words(old, w) for y, w in where_year.items()}
        items.append(
            {
                "kind": "drift_word",
                "words": [old, new],
                "made_by": f"rule {rule}: the share of the second word grows by the same step each year",
                "direction": "rises",
                "share_by_year": {str(y): _rounded(shares[y] / (shares[y] + olds[y])) for y in YEARS},
            }
        )
    for first, second, given, direction in planted.PAIR_DRIFTS:
        tables = {y: truth().directed_table(first, second, 1, w) for y, w in where_year.items()}
        items.append(
            {
                "kind": "drift_pair",
                "words": [first, second],
                "made_by": "the choice of the other word shifts by the same step each year (or never, where it stays)",
                "direction": direction,
                "given": given,
                "conditional_by_year": {
                    str(y): _rounded(t.joint / (t.first_total if given == "first" else t.second_total))
                    for y, t in tables.items()
                },
                "pmi_next_by_year": {str(y): _rounded(t.pmi) for y, t in tables.items()},
            }
        )
    return items


def _genre_items() -> list[Item]:
    genres = {genre: truth().where(genre=genre) for genre in GENRES}
    items: list[Item] = []
    for word in planted.GENRE_WORDS:
        rates = {genre: truth().per_million(word, where) for genre, where in genres.items()}
        log_rate, notice_rate = rates.values()
        ratio = log2(log_rate / notice_rate) if log_rate and notice_rate else None
        items.append(
            {
                "kind": "genre_word",
                "words": [word],
                "made_by": "the rules of the two genres",
                "per_million": {genre: _rounded(rate) for genre, rate in rates.items()},
                "log2_ratio": _rounded(ratio),
            }
        )
    for first, second in planted.GENRE_PAIRS:
        items.append(
            {
                "kind": "genre_pair",
                "words": [first, second],
                "made_by": "the rules of the two genres",
                "next_given_first": {g: _conditional(first, second, 1, where) for g, where in genres.items()},
            }
        )
    return items


def _document_items() -> list[Item]:
    items: list[Item] = []
    for topic, first, second in planted.TOPIC_PAIRS:
        whole = truth().symmetric_table(first, second, 5)
        inside = truth().symmetric_table(first, second, 5, truth().where(topic=topic))
        items.append(
            {
                "kind": "topic",
                "words": [first, second],
                "made_by": f"drawn independently in documents on one topic ({topic})",
                "share_of_documents_on_topic": _rounded(
                    1 / len(GENRES) / next(len(t) for t in TOPICS.values() if topic in t)
                ),
                "pmi_window_5": _rounded(whole.pmi),
                "pmi_window_5_inside_topic": _rounded(inside.pmi),
            }
        )
    habit_years = [year for year in YEARS if HABIT_AUTHOR in authors_of("log", year)]
    items.append(
        {
            "kind": "habit",
            "words": planted.HABIT_PHRASE.split(),
            "made_by": "a phrase of one author, in many documents of that author",
            "author": HABIT_AUTHOR,
            "years": [habit_years[0], habit_years[-1]],
            "per_million": _rounded(truth().per_million(planted.HABIT_WORD)),
        }
    )
    first, second = planted.BURST_WORDS
    chance = truth().directed_table(first, second, 1)
    items.append(
        {
            "kind": "burst",
            "words": BURSTY_PHRASE.split(),
            "made_by": "forty sentences of the one talkative document; the values are those of all others",
            "measured_by": [first, second],
            "next_given_first": _rounded(chance.joint / chance.first_total),
            "pmi_next": _rounded(chance.pmi),
        }
    )
    return items


@cache
def _truths() -> Item:
    return {
        "about": "True strength of what is planted in the demo corpora; values without the talkative document.",
        "method": "analytic: expected counts of the rules, exact to rounding; nothing is simulated or counted",
        "pmi": "bits, pair margins, inside sentences; 'next': directed window 1, 'window_5': symmetric window 5",
        "years": [FIRST_YEAR, LAST_YEAR],
        "words_per_document": {g: _rounded(truth().words(ANY, truth().where(genre=g))) for g in GENRES},
        "items": [
            *map(_pair_item, planted.PAIRS),
            *_expression_items(),
            *_drift_items(),
            *_genre_items(),
            *_document_items(),
        ],
    }


def truths() -> Item:
    """What is planted and how strong it truly is: the content of ``truths.json`` (a fresh copy)."""
    return deepcopy(_truths())
