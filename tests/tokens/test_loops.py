"""Compiled loops against arrays and against their own plain Python, on text of every class and many scripts."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from colloc.kernels import numbers as number_loop
from colloc.kernels import switch
from colloc.kernels import words as word_loop
from colloc.records import Segments
from colloc.settings import SegmentSettings
from colloc.tokens import numbering, words
from colloc.tokens.classes import code_points, kinds_of
from colloc.tokens.numbering import TypeNumberer
from colloc.tokens.segmenter import Segmenter
from tests.tokens import texts

SETTINGS = [
    SegmentSettings(),
    SegmentSettings(tailored=False),
    SegmentSettings(hyphens="split", addresses="split", line_ends="space"),
    SegmentSettings(hashtags="keep", punctuation="keep", addresses="drop", numbers="drop"),
]
some_text = st.one_of(
    texts.mixed, st.text(max_size=60), st.text(st.sampled_from("abé-'\"א\u05f3カ_.\u0301一\n "), max_size=60)
)


@pytest.fixture(autouse=True, scope="module")
def _switched_back() -> Iterator[None]:
    yield
    switch.use_numpy()


def turn(on: bool, patch: pytest.MonkeyPatch) -> None:
    patch.setenv(switch.SWITCH, "1" if on else "0")
    switch.use_numpy()
    assert switch.prefer_compiled(True) is on


def content(found: Segments) -> list[object]:
    arrays = [found.starts, found.ends, found.sentences, found.paragraphs]
    return [*((array.dtype, array.tolist()) for array in arrays), found.closed, found.dropped]


def assert_alike(text: str, settings: SegmentSettings, following: str = "", opening: bool = True) -> Segments:
    segmenter = Segmenter(settings)
    with pytest.MonkeyPatch.context() as patch:
        turn(False, patch)
        arrays = segmenter.segment(text, following, opening)
        turn(True, patch)
        loops = segmenter.segment(text, following, opening)
    assert content(loops) == content(arrays)
    return loops


@settings(max_examples=400)
@given(some_text, st.sampled_from(SETTINGS), st.sampled_from(["", "a", " ", "\u0301", "-"]), st.booleans())
def test_segments_are_those_of_the_arrays(text: str, chosen: SegmentSettings, following: str, opening: bool) -> None:
    assert_alike(text, chosen, following, opening)


@pytest.mark.parametrize("chosen", SETTINGS)
def test_segments_of_prose_of_many_scripts(chosen: SegmentSettings) -> None:
    for text in texts.real_texts():
        assert_alike(text, chosen)


@settings(max_examples=200)
@given(st.lists(some_text, min_size=1, max_size=4), st.booleans())
def test_numbers_are_those_of_the_arrays_in_any_turn(stretches: list[str], first: bool) -> None:
    """One numberer by arrays, one by loops, and one that changes between them with each stretch."""
    segmenter = Segmenter(SegmentSettings())
    numberers = [TypeNumberer() for _ in range(3)]
    with pytest.MonkeyPatch.context() as patch:
        for place, text in enumerate(stretches):
            found = segmenter.segment(text)
            results = []
            for numberer, on in zip(numberers, (False, True, (place % 2 == 0) is first), strict=True):
                turn(on, patch)
                results.append((numberer.number(found).tolist(), numberer.take_new(), numberer.nbytes))
            assert results[0] == results[1] == results[2]


@settings(max_examples=150)
@given(some_text)
def test_the_loop_of_words_is_its_plain_python(text: str) -> None:
    kinds = kinds_of(code_points(text))
    hyphens = np.flatnonzero(np.isin(code_points(text), words.HYPHENS))
    results = []
    for run in (word_loop.word_spans, word_loop.word_spans.python):
        starts, ends = (np.zeros(len(kinds) + 1, np.int64) for _ in range(2))
        count = run(kinds, words._traits(), hyphens, starts, ends)
        results.append((count, starts[:count].tolist(), ends[:count].tolist()))
    assert results[0] == results[1]


@settings(max_examples=60)
@given(st.lists(some_text, min_size=1, max_size=3))
def test_the_loop_of_numbers_is_its_plain_python(stretches: list[str]) -> None:
    segmenter = Segmenter(SegmentSettings())
    numberers = [TypeNumberer(), TypeNumberer()]
    with pytest.MonkeyPatch.context() as patch, np.errstate(over="ignore"):
        turn(True, patch)
        for text in stretches:
            found = segmenter.segment(text)
            compiled = numberers[0].number(found).tolist()
            for loop in (number_loop.find_short, number_loop.number_tokens):
                patch.setattr(numbering, loop.python.__name__, loop.python)
            assert numberers[1].number(found).tolist() == compiled
            for loop in (number_loop.find_short, number_loop.number_tokens):
                patch.setattr(numbering, loop.python.__name__, loop)
            assert numberers[0].take_new() == numberers[1].take_new()
