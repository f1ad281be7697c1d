"""Decisions in a store: appended, never overwritten, read back to the character (the project's own promises)."""

from __future__ import annotations

import gzip
import sqlite3
from dataclasses import replace
from pathlib import Path

import pytest

from colloc.errors import DataError, StoreDamagedError, UsageError
from colloc.store.checking import check
from colloc.store.decisions import Decision, Example, append, from_dict, iterate, newest
from colloc.store.opening import open_for_reading, open_for_writing

from .making import small_store

OLD = Path(__file__).parent / "old_files" / "schema_1.gz"
ONE = Decision(
    "fold", "pair", ("lamp", "oil"), "accept", "Anna", "2026-01-01T10:00:00+00:00", sense="=light", note="\u202e"
)


def test_history_is_kept_and_the_newest_counts(tmp_path: Path) -> None:
    later = replace(ONE, verdict="reject", decided="2026-01-02T10:00:00+00:00")
    turned = replace(ONE, words=("oil", "lamp"), judge="Ben")
    with small_store(tmp_path / "s") as store:
        assert append(store, [later, ONE, turned]) == 3
        assert [one for _, one in iterate(store)] == [later, ONE, turned]
        counting = newest(store)
        assert counting[ONE.key, "Anna"][1] == later, "the latest time counts, not the last row"
        assert turned.key == ONE.key, "a pair has no order"
        assert replace(turned, kind="directed").key != replace(ONE, kind="directed").key
        assert append(store, [ONE, replace(ONE)]) == 0, "the same decision is not added twice"


def test_a_store_of_the_first_schema_has_no_decisions_until_it_is_written(tmp_path: Path) -> None:
    path = tmp_path / "old"
    path.write_bytes(gzip.decompress(OLD.read_bytes()))
    with open_for_reading(path) as store:
        assert list(iterate(store)) == []
        assert newest(store) == {}
    with open_for_writing(path, "test") as store:
        assert append(store, [ONE]) == 1
    with open_for_reading(path) as store:
        assert [one for _, one in iterate(store)] == [ONE]


def test_decisions_as_json_values_come_back() -> None:
    example = Example("log-1", 4, "The lamp burns oil", ((4, 8), (15, 18)))
    full = replace(ONE, labels=("a;b", "[c"), examples=(example,))
    assert from_dict(full.to_dict(), "here") == full
    assert example.place == ("log-1", 8)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"verdict": "perhaps"}, "verdict must be one of"),
        ({"words": ["lamp"]}, "two words"),
        ({"words": "lamp oil"}, "must be a list"),
        ({"judge": " "}, "say who decides"),
        ({"decided": "yesterday"}, "no time in ISO 8601"),
        ({"decided": "2026-01-01"}, "no time zone"),
        ({"labels": ["x", "x"]}, "given twice"),
        ({"note": 5}, "must be text"),
        ({"note": "\ud800"}, "surrogate"),
        ({"colour": "red"}, "unknown keys colour"),
        ({"examples": [{"document": "d", "start": 0, "text": "ab", "marks": [[1, 3]]}]}, "outside its text"),
        ({"examples": [{"document": "d"}]}, "'start' is missing"),
    ],
)
def test_records_that_are_no_decisions(change: dict[str, object], message: str) -> None:
    with pytest.raises(DataError, match=f"^file:3: .*{message}"):
        from_dict(ONE.to_dict() | change, "file:3")


def test_a_kind_that_is_none() -> None:
    with pytest.raises(UsageError, match="kind must be one of"):
        replace(ONE, kind="triple")  # type: ignore[arg-type]


def test_a_damaged_row_is_named(tmp_path: Path) -> None:
    path = tmp_path / "s"
    with small_store(path) as store:
        append(store, [ONE])
    with sqlite3.connect(path) as connection:
        connection.execute("UPDATE decisions SET words = '[1'")
    connection.close()
    with open_for_reading(path) as store, pytest.raises(StoreDamagedError, match="decision 1 cannot be read"):
        list(iterate(store))
    with open_for_reading(path) as store:
        assert [finding.place for finding in check(store)] == ["decisions"]
