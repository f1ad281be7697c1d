"""Folding by language and lemmas by dictionary, in whole stores: layers and the words that are asked for."""

from __future__ import annotations

import sys
from collections import Counter
from pathlib import Path

import pytest
from simplemma import lemmatize

import colloc
from colloc.errors import MissingExtraError, UsageError
from colloc.settings import SegmentSettings

TEXT = "The ships sailed. A ship sails; Ships saw leaves. He left the harbour: harbours were better. "


def build(folder: Path, texts: list[str], settings: SegmentSettings) -> Path:
    path = folder / "s.colloc"
    colloc.build(path, documents=texts, segment=settings, jobs=1)
    return path


def test_folding_reaches_the_layer_and_the_question(tmp_path: Path) -> None:
    texts = ["قال مُحَمَّد في المدرسة ثم قال محمد في المدرسه"]
    path = build(tmp_path, texts, SegmentSettings(folding=("arabic",)))
    counts = {row["word"]: row["count"] for row in colloc.words(path).to_dicts()}
    assert counts == {"قال": 2, "محمد": 2, "في": 2, "المدرسه": 2, "ثم": 1}
    answers = [
        colloc.around(path, word, min_count=1, any_strength=True).to_dicts() for word in ("محمد", "مُحَمَّد", "محـمد")
    ]
    assert answers[0] == answers[1] == answers[2]
    assert answers[0]


def test_turkish_casing(tmp_path: Path) -> None:
    path = build(tmp_path, ["IŞIK ışık Işık ISIK isik"], SegmentSettings(folding=("turkish",)))
    assert {row["word"]: row["count"] for row in colloc.words(path).to_dicts()} == {"ışık": 3, "ısık": 1, "isik": 1}


def test_lemmas_are_those_of_the_dictionary(tmp_path: Path) -> None:
    """Beside the library itself, asked for every token (the store asks once for each type)."""
    path = build(tmp_path, [TEXT * 3], SegmentSettings(lemma="en"))
    counts = {row["word"]: row["count"] for row in colloc.words(path, layer="lemma").to_dicts()}
    tokens = [token.strip(".;:") for token in (TEXT * 3).split()]
    assert counts == Counter(lemmatize(token, lang="en") for token in tokens)
    assert counts["ship"] == 9
    assert counts["see"] == 3  # saw: the verb, wherever it stands
    pairs = colloc.pairs(path, layer="lemma", min_count=1)
    assert {("ship", "sail")} <= set(zip(pairs["first"], pairs["second"], strict=True)) | set(
        zip(pairs["second"], pairs["first"], strict=True)
    )


def test_added_words_get_lemmas_too(tmp_path: Path) -> None:
    """What a store answers after `add` is what one build of both texts answers, in the layer and in its tables."""
    path = build(tmp_path, [TEXT], SegmentSettings(lemma="en"))
    colloc.tally(path, layer="lemma", window=2)
    colloc.add(path, documents=["Mice left the houses. She sees ships."])
    (tmp_path / "whole").mkdir()
    whole = build(tmp_path / "whole", [TEXT, "Mice left the houses. She sees ships."], SegmentSettings(lemma="en"))
    for answer in (
        lambda store: colloc.words(store, layer="lemma", limit=0),
        lambda store: colloc.pairs(store, layer="lemma", window=2, min_count=1, limit=0),
    ):
        assert answer(path).to_dicts() == answer(whole).to_dicts()
    assert {"mouse", "house"} <= set(colloc.words(path, layer="lemma", limit=0)["word"])


def test_without_a_language_there_are_no_lemmas(tmp_path: Path) -> None:
    path = build(tmp_path, [TEXT], SegmentSettings())
    with pytest.raises(UsageError, match="carry nothing for the layer 'lemma'; build it from annotated text, or with"):
        colloc.tally(path, layer="lemma")


@pytest.mark.parametrize(
    ("settings", "message"),
    [
        (SegmentSettings(lemma="xx"), "no dictionary of lemmas for the language 'xx'"),
        (SegmentSettings(folding=("greek-to-me",)), "unknown folding 'greek-to-me'"),
    ],
)
def test_wrong_choices_are_said_before_anything_is_read(
    tmp_path: Path, settings: SegmentSettings, message: str
) -> None:
    with pytest.raises(UsageError, match=message):
        build(tmp_path, [TEXT], settings)
    assert not (tmp_path / "s.colloc").exists()


def test_without_the_library(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from colloc.tokens.folding.lemmas import lemmatizer

    lemmatizer.cache_clear()
    monkeypatch.setitem(sys.modules, "simplemma", None)
    with pytest.raises(MissingExtraError, match=r"pip install 'colloc\[lemma\]'"):
        build(tmp_path, [TEXT], SegmentSettings(lemma="en"))
