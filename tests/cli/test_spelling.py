"""Near spellings of words that a store does not know, against a plain search through all its words."""

from __future__ import annotations

import difflib
import random
from pathlib import Path

import pytest

import colloc
from colloc.answers import spelling
from colloc.answers.spelling import near_spellings, not_seen
from colloc.errors import NotSeenError
from colloc.store.opening import open_for_reading

from .conftest import Run

WORDS = (
    "fog",
    "foggy",
    "frog",
    "forge",
    "fig",
    "harbour",
    "harbours",
    "keeper",
    "o'clock",
    "straße",
    "\U0001d555og",
    "été",
)


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("spelling") / "a.colloc"
    text = " ".join(word for place, word in enumerate(WORDS) for _ in range(place + 1))
    colloc.build(path, documents=[{"text": f"{text}. The fog horn of the harbour.", "kind": "log"}])
    return path


def alike(word: str, words: list[str]) -> list[str]:
    """The rule, word by word: the same first character, a length that differs by two at most, three quarters alike."""
    close = [other for other in words if other[0] == word[0] and abs(len(other) - len(word)) <= 2]
    ratio = {other: difflib.SequenceMatcher(None, other, word).ratio() for other in close}
    return [other for other in close if ratio[other] >= 0.75]


def test_words_spelled_alike_are_found(store: Path) -> None:
    chance = random.Random(5)
    with open_for_reading(store) as opened:
        every = colloc.words(opened, limit=0)["word"].tolist()
        found = 0
        for _ in range(300):
            letters = list(chance.choice(WORDS))
            letters[chance.randrange(1, len(letters))] = chance.choice("aeoxr'")
            word = "".join(letters)
            near = near_spellings(opened, "fold", word, most=50)
            assert set(near) == set(alike(word.casefold(), every)), word
            found += len(near)
        assert found > 200
        assert near_spellings(opened, "fold", "HARBOR") == ["harbour", "harbours"]
        for nothing in ("", "\ud800x", "zzzz", "\U0010ffff\U0010ffff"):
            assert near_spellings(opened, "fold", nothing) == []
        assert near_spellings(opened, "fold", "\U0001d555oog") == ["\U0001d555og"]


def test_the_most_frequent_are_compared_where_there_are_many(store: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(spelling, "_COMPARED", 2)
    with open_for_reading(store) as opened:
        # fig and forge are the most frequent of those of their shape (fog, foggy, frog, forge, fig)
        assert near_spellings(opened, "fold", "forgy") == ["forge"]
        assert near_spellings(opened, "fold", "fogy") == []


def test_two_kinds_of_apostrophes_are_told_at_build(run: Run, tmp_path: Path) -> None:
    (tmp_path / "a.txt").write_text("Don’t go. Don't stay. It’s late, o'clock; it's ’tis.", encoding="utf-8")
    apart = run("build", tmp_path / "apart", tmp_path / "a.txt")
    assert apart.err == (
        "colloc: 2 words stand with a curly and with a straight apostrophe and are counted apart; "
        "`build --fold apostrophes` takes them for one\n"
    )
    assert run("build", tmp_path / "quiet", tmp_path / "a.txt", "-q").err == ""
    joined = run("build", tmp_path / "joined", tmp_path / "a.txt", "--fold", "apostrophes")
    assert joined.err == ""
    counts = {
        store: dict(zip(*(colloc.words(tmp_path / store)[name].tolist() for name in ("word", "count")), strict=True))
        for store in ("apart", "joined")
    }
    assert (counts["apart"]["don't"], counts["apart"]["don’t"], counts["joined"]["don't"]) == (1, 1, 2)
    assert "don’t" not in counts["joined"]
    # asked for in either spelling, and kept apart as they are written
    assert run("around", tmp_path / "joined", "DON’T", "--min-count", 1, "--any-strength").code == 0
    assert set(colloc.words(tmp_path / "joined", layer="form")["word"]) >= {"Don’t", "Don't"}


def test_messages_name_them(run: Run, store: Path) -> None:
    with open_for_reading(store) as opened:
        assert not_seen(opened, "fold", "harbor").endswith(
            "'harbor' never occurs in layer 'fold'; did you mean 'harbour' or 'harbours'?"
        )
        assert not_seen(opened, "fold", "zebra").endswith(
            f"`colloc words {store} 'zeb*'` lists words that begin like it"
        )
    for command in (("around", store, "harbor"), ("explain", store, "fog", "harbor"), ("lines", store, "harbor")):
        ran = run(*command)
        assert ran.code == 1
        assert "did you mean 'harbour' or 'harbours'?" in ran.err
    part = run("around", store, "harbor", "fog", "zebra")
    assert part.err.splitlines()[-1] == (
        "# 2 unknown in layer 'fold', left out: 'harbor' (did you mean 'harbour' or 'harbours'?), 'zebra'"
    )
    none = run("around", store, "harbor", "zebra")
    assert none.err.endswith("layer 'fold': 'harbor' (did you mean 'harbour' or 'harbours'?), 'zebra'\n")
    assert run("words", store, "harbor").err.splitlines()[-1] == (
        "# no rows; pattern harbor; did you mean 'harbour' or 'harbours'?"
    )
    assert run("words", store, "harbor*").err.splitlines()[-1] != run("words", store, "harbor").err.splitlines()[-1]
    with pytest.raises(NotSeenError, match=r"did you mean 'harbour'"):
        colloc.explain(store, "harbor", "fog")
    assert "explain takes two single words" in run("explain", store, "fog horn", "harbour").err
