"""Stop words: lists with them are lists without, less the rows that hold one."""

from __future__ import annotations

import sys
from pathlib import Path

import pytest
import stopwordsiso

import colloc
from colloc.errors import DataError, MissingExtraError, NoInputError, UsageError

SENTENCES = [
    "The keeper drinks strong tea in the harbour.",
    "He eats fresh bread and drinks tea.",
    "The harbour has a lighthouse and the keeper has bread.",
    "Tea and bread: the keeper of the harbour eats and drinks.",
]


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("stop") / "s.colloc"
    colloc.build(path, documents=SENTENCES * 3, jobs=1)
    return path


def rows(path: Path, **options: object) -> list[tuple[str, str]]:
    found = colloc.pairs(path, min_count=1, any_strength=True, limit=0, **options)  # type: ignore[arg-type]
    return list(zip(found["first"], found["second"], strict=True))


def test_words_of_a_language(store: Path) -> None:
    unwanted = stopwordsiso.stopwords("en")
    everything = rows(store)
    shown = rows(store, stop="en")
    assert shown == [row for row in everything if not set(row) & unwanted]
    assert 0 < len(shown) < len(everything)


def test_words_of_a_file_fold_alike_in_every_layer(store: Path, tmp_path: Path) -> None:
    listed = tmp_path / "stop.txt"
    listed.write_text("\ufeffTHE\n\n Tea \n", encoding="utf-8")
    for layer in ("fold", "form"):
        everything = rows(store, layer=layer)
        shown = rows(store, layer=layer, stop=[str(listed)])
        assert shown == [row for row in everything if not {word.lower() for word in row} & {"the", "tea"}]
        assert 0 < len(shown) < len(everything)


def test_the_most_frequent_words(store: Path) -> None:
    frequent = [row["word"] for row in colloc.words(store, limit=3).to_dicts()]
    shown = rows(store, stop=["top:3"])
    assert shown == [row for row in rows(store) if not set(row) & set(frequent)]


def test_the_word_asked_for_may_be_a_stop_word(store: Path) -> None:
    found = colloc.around(store, "the", min_count=1, any_strength=True, stop="en")
    assert len(found) > 0
    assert not set(found["second"]) & stopwordsiso.stopwords("en")


def test_counts_stay(store: Path) -> None:
    everything = {(row["first"], row["second"]): row for row in colloc.pairs(store, min_count=1, limit=0).to_dicts()}
    for row in colloc.pairs(store, min_count=1, limit=0, stop="top:4").to_dicts():
        assert row == everything[row["first"], row["second"]]


@pytest.mark.parametrize(
    ("stop", "error", "message"),
    [
        ("top:0", UsageError, "write top:N"),
        ("top:many", UsageError, "write top:N"),
        ("xx", UsageError, "no stop words for the language 'xx'"),
        ("nowhere.txt", NoInputError, "nowhere.txt: no such file"),
    ],
)
def test_what_is_no_list(store: Path, stop: str, error: type[Exception], message: str) -> None:
    with pytest.raises(error, match=message):
        rows(store, stop=stop)


def test_a_file_that_is_no_text(store: Path, tmp_path: Path) -> None:
    (tmp_path / "stop.bin").write_bytes(b"\xff\xfe\xff")
    with pytest.raises(DataError, match=r"stop\.bin: not UTF-8"):
        rows(store, stop=str(tmp_path / "stop.bin"))


def test_without_the_library(store: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "stopwordsiso", None)
    with pytest.raises(MissingExtraError, match=r"pip install 'colloc\[stop\]'"):
        rows(store, stop="en")


def test_words_without_a_letter_and_pairs_of_one_word(tmp_path: Path) -> None:
    path = tmp_path / "numbers.colloc"
    colloc.build(path, documents=["Tut tut, 12 ships of 1871; tut, 3.5 knots, 12 men, Nr5."] * 3, jobs=1)
    everything = rows(path)
    numbers = {"12", "1871", "3.5"}
    assert numbers < {word for row in everything for word in row}
    assert rows(path, stop="numbers") == [row for row in everything if not set(row) & numbers]
    assert ("tut", "tut") in everything
    assert rows(path, no_self=True) == [row for row in everything if row[0] != row[1]]
    assert rows(path, no_self=True, stop=["numbers"], layer="form") == [
        row for row in rows(path, layer="form") if row[0] != row[1] and not set(row) & numbers
    ]
    assert colloc.pairs(path, no_self=True).settings["no_self"] is True
