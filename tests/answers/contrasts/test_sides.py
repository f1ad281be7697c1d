"""Slices count what a store of only those documents counts, and the values of a key add up to the whole."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest

import colloc
from colloc.answers.columns import Columns
from colloc.errors import UsageError
from colloc.store.opening import Store


def words_of(store: Store, **more: str) -> dict[str, int]:
    answer = colloc.words(store, limit=0, **more)
    return dict(zip(answer["word"], answer["count"].tolist(), strict=True))


def pairs_of(store: Store, **more: str) -> dict[tuple[str, str], tuple[float, ...]]:
    answer = colloc.pairs(store, limit=0, min_count=1, any_strength=True, show=[], measure="joint", **more)
    return {
        (min(row["first"], row["second"]), max(row["first"], row["second"])): (
            row["joint"],
            *sorted((row["first_total"], row["second_total"])),
            row["total"],
        )
        for row in answer
    }


def test_a_slice_counts_as_a_store_of_its_documents(talkative: Store, logs_only: Store) -> None:
    assert words_of(talkative, where="genre=log") == words_of(logs_only)
    assert pairs_of(talkative, where="genre=log") == pairs_of(logs_only)


def test_the_complement_is_the_rest(talkative: Store) -> None:
    assert words_of(talkative, where="not (genre=log)") == words_of(talkative, where="genre=notice")
    assert pairs_of(talkative, where="not (genre=log)") == pairs_of(talkative, where="genre=notice")


def test_values_of_a_key_add_up_to_the_whole(talkative: Store) -> None:
    words: Counter[str] = Counter()
    joint: Counter[tuple[str, str]] = Counter()
    for where in ("year=..1874", "year=1875..1884", "year=1885.."):
        words.update(words_of(talkative, where=where))
        joint.update({pair: int(numbers[0]) for pair, numbers in pairs_of(talkative, where=where).items()})
    assert words == words_of(talkative)
    assert joint == {pair: int(numbers[0]) for pair, numbers in pairs_of(talkative).items()}
    table = colloc.documents_by(talkative, "year")
    assert table["tokens"].sum() == sum(words.values())
    assert table["documents"].sum() == 601


def test_both_sides_of_a_contrast_are_the_slices(talkative: Store, logs_only: Store) -> None:
    answer = colloc.contrast(talkative, this="genre=log", limit=0, min_count=1)
    logs, notices = words_of(logs_only), words_of(talkative, where="genre=notice")
    assert counts(answer, "word", "count_this") == logs
    assert counts(answer, "word", "count_that") == notices
    assert set(answer["word"]) == set(logs) | set(notices)


def counts(answer: Columns, name: str, column: str) -> dict[str, int]:
    return {word: count for word, count in zip(answer[name], answer[column].tolist(), strict=True) if count}


@pytest.mark.parametrize("directed", [False, True])
def test_pairs_of_both_sides(talkative: Store, logs_only: Store, directed: bool) -> None:
    answer = colloc.contrast(talkative, this="genre=log", pairs=True, limit=0, min_count=2, directed=directed)
    alone = colloc.pairs(
        logs_only, limit=0, min_count=1, any_strength=True, show=[], measure="joint", directed=directed
    )

    def key(row: dict[str, str]) -> tuple[str, ...]:
        words = (row["first"], row["second"])
        return words if directed else tuple(sorted(words))

    expected = {key(row): row["joint"] for row in alone}
    found = {key(row): row["joint_this"] for row in answer}
    assert all(found[pair] == expected.get(pair, 0) for pair in found)
    assert {pair for pair, joint in expected.items() if joint >= 2} <= found.keys()
    assert np.all(answer["joint_this"] + answer["joint_that"] >= 2)


@pytest.mark.parametrize(
    ("sides", "message"),
    [
        ({"this": "genre=log", "that": "year=1880"}, "documents fit both"),
        ({"this": "genre=poem"}, "no document fits 'genre=poem'"),
        ({"this": "genre=log,notice"}, "no document fits"),
        ({"that": "genre=log"}, "name one thing"),
        ({"this": "genre=log", "by": "year"}, "not --this and --by"),
        ({"by": "colour"}, "no document has the key 'colour'; keys: author, genre, station, year"),
        ({"by": "genre", "where": "genre=log"}, "has only one value here"),
        ({"this": "genre=log", "sort": "association"}, "sorted by one of"),
        ({"this": "genre=log", "first": "fog"}, "needs both words"),
        ({"words": ["fog"]}, "give --word twice"),
        ({"words": ["fog", "Fog"]}, "are the same word"),
        ({"reference": "tlh"}, "no general word frequencies"),
        ({"this": "genre=log", "pairs": True, "margins": "tokens"}, "no cells|does not have"),
    ],
)
def test_what_cannot_be_compared(talkative: Store, sides: dict[str, object], message: str) -> None:
    with pytest.raises(UsageError, match=message):
        colloc.contrast(talkative, **sides)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    "counting",
    [{"unit": True}, {"margins": "positions"}, {"left": 1, "right": 3}, {"layer": "form", "window": 2}],
    ids=str,
)
def test_every_way_of_counting_is_that_of_the_slices(talkative: Store, counting: dict[str, object]) -> None:
    answer = colloc.contrast(talkative, this="genre=log", pairs=True, limit=4, **counting)  # type: ignore[arg-type]
    for row in answer:
        for side, where in (("this", "genre=log"), ("that", "genre=notice")):
            beside = colloc.around(
                talkative,
                row["first"],
                where=where,
                limit=0,
                min_count=1,
                any_strength=True,
                **counting,  # type: ignore[arg-type]
            )
            found = {one["second"]: one for one in beside}
            if row[f"joint_{side}"]:
                assert found[row["second"]]["joint"] == row[f"joint_{side}"]
                assert found[row["second"]]["pmi"] == pytest.approx(row[f"pmi_{side}"])
            else:
                assert row["second"] not in found
