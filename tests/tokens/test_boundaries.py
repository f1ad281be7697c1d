"""Word and sentence boundaries of UAX #29 against the official cases, the rules and another library."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
import regex
import unicode_segmentation_rs
from hypothesis import given, settings

from colloc.tokens.classes import classes, code_points, kinds_of
from colloc.tokens.make_classes import make_table
from colloc.tokens.sentences import sentence_boundaries
from colloc.tokens.words import word_boundaries, word_tokens
from tests.tokens import slow_rules, texts

pytestmark = pytest.mark.usefixtures("both_ways")

AUXILIARY = Path("/usr/share/unicode/auxiliary")

# The tables are of Unicode 17.0, the official files of Debian 12 of 15.0. Up to 16.0 U+2701 UPPER
# BLADE SCISSORS was Extended_Pictographic (emoji-data.txt); without that WB3c does not apply to
# these two cases. All others of 15.0 hold in 17.0 as they stand.
CHANGED_IN_17 = {
    "\u2701\u200d\u2701": [0, 2, 3],
    "a\u200d\u2701": [0, 2, 3],
}


def official_cases(name: str) -> list[tuple[str, list[int]]]:
    """Cases of a break test file: text and the offsets marked with a division sign."""
    path = AUXILIARY / name
    if not path.is_file():
        pytest.fail(f"{path} is missing: install the Debian package unicode-data (apt-get install unicode-data)")
    cases = []
    for line in path.read_text(encoding="utf-8").splitlines():
        marks = line.partition("#")[0].split()
        text, breaks = "", []
        for mark in marks:
            if mark == "÷":
                breaks.append(len(text))
            elif mark != "×":
                text += chr(int(mark, 16))
        if marks:
            cases.append((text, breaks))
    return cases


@pytest.mark.parametrize(
    ("name", "boundaries", "least"),
    [("WordBreakTest.txt", word_boundaries, 1823), ("SentenceBreakTest.txt", sentence_boundaries, 502)],
)
def test_every_official_case(name: str, boundaries: Callable[[str], np.ndarray], least: int) -> None:
    cases = official_cases(name)
    assert len(cases) >= least
    differing = {text: boundaries(text).tolist() for text, breaks in cases if boundaries(text).tolist() != breaks}
    older = {text for text, breaks in cases if CHANGED_IN_17.get(text, breaks) != breaks}
    assert differing == {text: breaks for text, breaks in CHANGED_IN_17.items() if text in older}


def test_words_of_every_official_case() -> None:
    """Segments between the boundaries of the file that hold a letter or digit, and no others."""
    for text, listed in official_cases("WordBreakTest.txt"):
        breaks = CHANGED_IN_17.get(text, listed)
        spoken = [(start, end) for start, end in pairwise(breaks) if regex.search(r"[\p{L}\p{N}]", text[start:end])]
        starts, ends = word_tokens(kinds_of(code_points(text)))
        assert list(zip(starts.tolist(), ends.tolist(), strict=True)) == spoken, text


def test_the_generated_text_reaches_every_class() -> None:
    assert texts.all_classes_are_reached() == set()


@settings(max_examples=400)
@given(texts.mixed)
def test_words_follow_the_rules(text: str) -> None:
    assert word_boundaries(text).tolist() == slow_rules.word_boundaries(text)


@settings(max_examples=400)
@given(texts.mixed)
def test_sentences_follow_the_rules(text: str) -> None:
    assert sentence_boundaries(text).tolist() == slow_rules.sentence_boundaries(text)


@pytest.mark.parametrize("gap", [")" * 100, " " * 100, ")" * 40 + " " * 40, "\u00ad" * 50, "1" * 100, "9 (" * 40])
def test_long_runs_between_terminator_and_letter(gap: str) -> None:
    for letter in "aAא":
        text = f"One.{gap}{letter} two?{gap}{letter}"
        assert sentence_boundaries(text).tolist() == slow_rules.sentence_boundaries(text)


@pytest.mark.parametrize("text", texts.real_texts())
def test_agrees_with_another_library(text: str) -> None:
    """unicode-segmentation-rs: the Rust crate unicode-segmentation, Unicode 17."""
    words = unicode_segmentation_rs.split_word_bounds(text)
    assert np.cumsum([0, *map(len, words)]).tolist() == word_boundaries(text).tolist()
    # The crate's sentence iterator leaves out sentences without a letter or digit; those that it gives must be ours.
    bounds = sentence_boundaries(text).tolist()
    ours = [text[start:end] for start, end in pairwise(bounds)]
    spoken = [sentence for sentence in ours if regex.search(r"[\p{Alphabetic}\p{N}]", sentence)]
    assert unicode_segmentation_rs.unicode_sentences(text) == spoken


def test_the_table_is_what_the_properties_say() -> None:
    """Against the installed `regex`; where that knows a newer Unicode, only code points that we take for unassigned
    may differ: a change to older ones means that the table must be made anew (``make_classes``)."""
    table = make_table()
    ours = classes()
    kinds: list[tuple[str, str, bool, str]] = [tuple(kind) for kind in table["kinds"]]  # type: ignore[attr-defined]
    lengths = np.diff([*table["starts"], 0x110000])  # type: ignore[misc]
    theirs = np.repeat(table["runs"], lengths)  # type: ignore[call-overload]
    differing = np.zeros(0x110000, bool)
    for column, tables in ((0, ours.word), (1, ours.sentence)):
        for name, mine in tables.items():
            expected = np.array([kind[column] == name for kind in kinds])
            differing |= mine[ours.kind_of] != expected[theirs]
    differing |= ours.pictographic[ours.kind_of] != np.array([kind[2] for kind in kinds])[theirs]
    differing |= ours.spoken[ours.kind_of] != np.array([kind[3] in ("L", "N") for kind in kinds])[theirs]
    differing |= ours.letter[ours.kind_of] != np.array([kind[3] == "L" for kind in kinds])[theirs]
    unassigned = int(ours.kind_of[0x0378])  # U+0378 is kept free
    assert np.flatnonzero(differing & (ours.kind_of != unassigned)).tolist() == []


@pytest.mark.parametrize("text", ["abc", "é", "ab\u0100", "a\U00020000", "\ud800x", "\udfff\U0001f600", ""])
def test_code_points_and_kinds(text: str) -> None:
    points = code_points(text)
    assert points.tolist() == [ord(character) for character in text]
    assert kinds_of(points).tolist() == [classes().kind_of[ord(character)] for character in text]
