"""Cuts: segmenting the parts gives what segmenting the whole gives."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from colloc.records import Segments
from colloc.settings import SegmentSettings
from colloc.tokens.cutting import is_hard_break, safe_cut
from colloc.tokens.segmenter import Segmenter
from tests.tokens import texts

pytestmark = pytest.mark.usefixtures("both_ways")

CHOICES = [
    SegmentSettings(),
    SegmentSettings(tailored=False),
    SegmentSettings(line_ends="space", numbers="drop", addresses="drop"),
    SegmentSettings(hyphens="split", addresses="split", max_token=3),
    SegmentSettings(pattern=r"\w+ \w+|\S+"),
    SegmentSettings(pattern=r"\p{L}+", line_ends="space"),
]
chosen = st.sampled_from(CHOICES)
long_text = st.lists(st.one_of(texts.prose, texts.plain, texts.any_class), max_size=8).map("".join)


def in_parts(text: str, choice: SegmentSettings, cuts: list[int]) -> list[Segments]:
    segmenter = Segmenter(choice)
    parts, opening = [], True
    for start, end in itertools.pairwise([0, *cuts, len(text)]):
        part = segmenter.segment(text[start:end], text[end : end + 1], opening)
        parts.append(part)
        opening = part.closed
    return parts


def assert_same(text: str, choice: SegmentSettings, cuts: list[int]) -> None:
    whole = Segmenter(choice).segment(text)
    parts = in_parts(text, choice, cuts)
    characters = np.cumsum([0, *(len(part.text) for part in parts)])
    tokens = np.cumsum([0, *map(len, parts)])

    def joined(name: str, shifts: np.ndarray) -> list[int]:
        return [int(v) + int(shift) for part, shift in zip(parts, shifts, strict=False) for v in getattr(part, name)]

    assert joined("starts", characters) == whole.starts.tolist()
    assert joined("ends", characters) == whole.ends.tolist()
    assert joined("sentences", tokens) == whole.sentences.tolist()
    assert joined("paragraphs", tokens) == whole.paragraphs.tolist()
    assert sum(part.dropped for part in parts) == whole.dropped


@settings(max_examples=200)
@given(long_text, chosen, st.data())
def test_safe_cuts_change_nothing(text: str, choice: SegmentSettings, data: st.DataObject) -> None:
    cuts: list[int] = []
    seen = 0
    while seen < len(text):
        seen = data.draw(st.integers(seen + 1, len(text)))
        start = cuts[-1] if cuts else 0
        least = data.draw(st.integers(0, 3))
        cut = safe_cut(text[start:seen], choice, least)
        assert cut == 0 or least < cut <= seen - start
        if cut:
            cuts.append(start + cut)
    assert_same(text, choice, cuts)


@settings(max_examples=120)
@given(long_text, chosen)
def test_every_hard_break_is_safe(text: str, choice: SegmentSettings) -> None:
    cuts = [position for position in range(-1, len(text) + 2) if is_hard_break(text, position, choice)]
    assert_same(text, choice, cuts)
    for cut in cuts:
        assert_same(text, choice, [cut])
        assert safe_cut(text[:cut], choice) == cut or text[cut - 1] == "\r"


def test_where_hard_breaks_are() -> None:
    text = "a.\r\nb\n\nc\u2029d \x0c e\r"
    wrapped = SegmentSettings(line_ends="space")
    places = range(len(text) + 1)
    assert [place for place in places if is_hard_break(text, place, SegmentSettings())] == [4, 6, 7, 9]
    assert [place for place in places if is_hard_break(text, place, wrapped)] == [7, 9]


def test_one_line_end_after_a_paragraph_separator_is_no_blank_line() -> None:
    text = "x\u2029y\nz"
    wrapped = SegmentSettings(line_ends="space")
    assert [place for place in range(len(text) + 1) if is_hard_break(text, place, wrapped)] == [2]


def test_a_word_that_will_be_left_out_makes_no_safe_place() -> None:
    """With "abcdef" left out, "gh" begins the second sentence but no paragraph."""
    text = "One. abcdef gh"
    assert safe_cut(text, SegmentSettings()) == 12
    assert safe_cut(text, SegmentSettings(max_token=5)) == 0


@pytest.mark.parametrize(
    ("text", "at_least", "cut"),
    [
        ("One two. Three\nFour five six", 0, 15),
        ("One two. Three\nFour five six", 15, 25),
        ("One two. Three\nFour five six", 20, 25),
        ("One two. Three\nFour five six", 25, 0),
        ("It ended. Then", 0, 0),
        ("x" * 50, 0, 0),
        ("a b c d\r", 0, 6),
        ("a\n\r", 0, 2),
        ("", 0, 0),
        ("\n", 0, 1),
    ],
)
def test_examples(text: str, at_least: int, cut: int) -> None:
    assert safe_cut(text, SegmentSettings(), at_least) == cut


def test_a_cut_far_back_is_found() -> None:
    wrapped = SegmentSettings(line_ends="space")
    assert safe_cut("some plain words\n \n" + "1. " * 30_000, wrapped) == 19
    assert safe_cut("some plain words " + "1. " * 30_000, SegmentSettings()) == 11
    assert safe_cut("1. " * 30_000, SegmentSettings()) == 0
    assert safe_cut("a b c\nd", SegmentSettings(pattern="x")) == 6
    assert safe_cut("a b c d", SegmentSettings(pattern="x")) == 0
