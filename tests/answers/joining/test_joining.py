"""Expressions joined in text: against a slow search word by word, and as people would expect it by eye."""

from __future__ import annotations

import re
from datetime import UTC, datetime
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

import colloc
from colloc.answers.joining.layers import layer_of_words
from colloc.answers.joining.listed import Expression, expressions_of
from colloc.answers.joining.rewriting import STRETCH, Joined, Joiner
from colloc.errors import DataError, UsageError
from colloc.settings import SegmentSettings
from colloc.store import decisions
from colloc.store.opening import open_for_writing
from colloc.store.vocabulary import layer_map, term_texts
from colloc.verbs.joining import accepted_pairs


def joiner(*expressions: str, **options: object) -> Joiner:
    return Joiner(expressions_of("x", expressions), SegmentSettings(), **options)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("expressions", "text", "expected"),
    [
        (["north sea"], "The North Sea, the north  sea.", "The North_Sea, the north_sea."),
        (["north sea", "north sea fog"], "north sea fog and north sea", "north_sea_fog and north_sea"),
        (["a b", "b c d"], "a b c d", "a b_c_d"),
        (["a b\t1", "b c\t2"], "a b c", "a b_c"),
        (["a b\t2", "b c\t1"], "a b c", "a_b c"),
        (["a b", "b a"], "a b a b a", "a_b a_b a"),
        (["in the * of"], "in the dark of night, in the of of", "in_the_dark_of night, in_the_of_of"),
        (["* sea"], "sea sea north, sea", "sea_sea north, sea"),
        (["north sea"], "north, sea north-sea north\nsea north. sea", "north, sea north-sea north\nsea north. sea"),
        (["l'an dernier"], "L'an dernier", "L'an_dernier"),
        (["straße ende"], "STRASSE ende", "STRASSE_ende"),
        (["a b"], "", ""),
        (["a b"], "none here", "none here"),
    ],
)
def test_by_eye(expressions: list[str], text: str, expected: str) -> None:
    assert joiner(*expressions).join(text).text == expected


def test_options() -> None:
    assert joiner("north sea", joiner="~~").join("north sea").text == "north~~sea"
    assert joiner("north sea", joiner="").join("north sea").text == "northsea"
    assert joiner("North Sea", layer="form").join("north sea North Sea").text == "north sea North_Sea"
    across = joiner("north sea", across_lines=True)
    assert across.join("north\nsea north \r\n sea north\n\nsea").text == "north_sea north_sea north\n\nsea"


WORDS = st.sampled_from(["a", "b", "c", "d"])
GAPS = st.sampled_from([" ", " ", " ", "  ", ", ", "\n", "\u00a0", " \t"])


def slow(expressions: list[Expression], text: str) -> str:
    """Longest first, then by score, then by place; each word used once; one place after the other."""
    words = [(found.start(), found.end()) for found in re.finditer(r"\w+", text)]
    found = []
    for expression in expressions:
        for start in range(len(words) - len(expression.words) + 1):
            spans = words[start : start + len(expression.words)]
            gaps = [text[one[1] : other[0]] for one, other in pairwise(spans)]
            fits = all(w in ("*", text[a:b]) for w, (a, b) in zip(expression.words, spans, strict=True))
            if fits and all(gap and not gap.strip() and "\n" not in gap for gap in gaps):
                found.append((-len(spans), -expression.score, start))
    used: set[int] = set()
    gaps_joined = set()
    for length, _, start in sorted(found):
        places = range(start, start - length)
        if used.isdisjoint(places):
            used.update(places)
            gaps_joined.update(places[:-1])
    pieces, done = [], 0
    for place in sorted(gaps_joined):
        pieces.append(text[done : words[place][1]])
        done = words[place + 1][0]
    return "_".join([*pieces, text[done:]])


@given(
    st.lists(
        st.tuples(st.lists(WORDS | st.just("*"), min_size=2, max_size=4), st.integers(0, 3)), min_size=1, max_size=8
    ),
    st.lists(st.tuples(WORDS, GAPS), max_size=25),
)
@example([(["*", "*"], 0), (["a", "*", "a"], 1)], [("a", " "), ("b", " "), ("a", " "), ("b", " ")])
def test_as_a_slow_search_has_it(drawn: list[tuple[list[str], int]], parts: list[tuple[str, str]]) -> None:
    best: dict[tuple[str, ...], int] = {}
    for words, score in drawn:
        best[tuple(words)] = max(score, best.get(tuple(words), 0))
    expressions = [Expression(words, float(score)) for words, score in best.items()]
    text = "".join(word + gap for word, gap in parts)
    ready = Joiner(expressions, SegmentSettings())
    joined = ready.join(text)
    assert joined.text == slow(expressions, text)
    check_spans(ready, text, joined)


def check_spans(ready: Joiner, text: str, joined: Joined) -> None:
    """Each span holds its expression in both texts."""
    for (start, end, new_start, new_end), number in zip(joined.spans.tolist(), joined.numbers.tolist(), strict=True):
        words = ready.expressions[number].words
        for found in (text[start:end].split(), joined.text[new_start:new_end].split("_")):
            assert len(found) == len(words)
            assert all(wanted in ("*", word.lower()) for wanted, word in zip(words, found, strict=True))


def test_many_texts_are_each_alone() -> None:
    ready = joiner("north sea", "sea fog")
    texts = ["the north sea", "", "sea", "fog north sea", "North\u2003Sea fog"]
    alone = [ready.join(text) for text in texts]
    for lot in (texts, [*texts, "a\u2029b north sea"]):
        for one, other in zip(alone, ready.join_many(lot), strict=False):
            assert one.text == other.text
            np.testing.assert_array_equal(one.spans, other.spans)
            np.testing.assert_array_equal(one.numbers, other.numbers)


@pytest.mark.parametrize("line", [True, False])
def test_a_long_text_in_pieces_is_the_whole(line: bool) -> None:
    """Longer than what is worked on at a time, cut anywhere, with and without line ends."""
    text = ("the North Sea fog came. " * 9 + ("\n" if line else "")) * (STRETCH // 150)
    assert len(text) > STRETCH
    ready = joiner("north sea", "sea fog came")
    whole = ready.join(text)
    cut = STRETCH // 2 + 7
    parts = list(ready.join_stream(text[i : i + cut] for i in range(0, len(text), cut)))
    assert len(parts) > 1
    assert "".join(part.text for part in parts) == whole.text
    np.testing.assert_array_equal(np.concatenate([part.spans for part in parts]), whole.spans)
    check_spans(ready, text, Joined(whole.text, whole.spans[-50:], whole.numbers[-50:]))


@pytest.mark.parametrize(
    ("line", "message"),
    [
        ("alone", "x:1: an expression has two words or more"),
        ("a b\thigh", "x:1: the score 'high' is no number"),
        ("", "no expression"),
    ],
)
def test_lists_that_are_none(line: str, message: str) -> None:
    with pytest.raises(DataError, match=message):
        expressions_of("x", [line])


def test_accepted_in_the_store(tmp_path: Path) -> None:
    (tmp_path / "a.txt").write_text("Thick fog at dawn. Heavy rain at dawn.\n", encoding="utf-8")
    path = tmp_path / "s.colloc"
    colloc.build(path, str(tmp_path / "a.txt"), jobs=1)
    with pytest.raises(UsageError, match="no expression of the layer 'fold' is accepted"):
        colloc.join(path, "thick fog")
    now = datetime(2026, 1, 1, tzinfo=UTC).isoformat()
    made = [
        decisions.Decision("fold", kind, words, verdict, judge, now)
        for kind, words, verdict, judge in (
            ("expression", ("thick", "fog"), "accept", "Ann"),
            ("directed", ("at", "dawn"), "accept", "Ann"),
            ("directed", ("heavy", "rain"), "accept", "Ann"),
            ("directed", ("heavy", "rain"), "reject", "Ben"),
            ("pair", ("fog", "rain"), "accept", "Ann"),
        )
    ]
    with open_for_writing(path, "test") as store, store.transaction():
        decisions.append(store, made)
    assert accepted_pairs(path) == 1
    assert accepted_pairs(path, layer="form") == 0
    assert colloc.join(path, "Thick fog at dawn, heavy rain").text == "Thick_fog at_dawn, heavy rain"
    assert [one.text for one in colloc.join(path, ["at dawn", "x"], ["at dawn"], joiner="+")] == ["at+dawn", "x"]
    with pytest.raises(UsageError, match="has the layer lemma where the store was built with --lemma, which it was"):
        colloc.join(path, "x", ["a b"], layer="lemma")
    with pytest.raises(
        UsageError, match=r"running text has the layers form, fold, and .* lemma and lemma_fold; not 'u"
    ):
        colloc.join(path, "x", ["a b"], layer="upos")


def test_by_lemma(tmp_path: Path) -> None:
    """Words of the text become lemmas as the store makes them; expressions are written in lemmas."""
    sentence = "The captains drank cups of strong teas; Cups of tea stood there."
    (tmp_path / "a.txt").write_text(sentence, encoding="utf-8")
    path = tmp_path / "s.colloc"
    settings = SegmentSettings(lemma="en")
    colloc.build(path, str(tmp_path / "a.txt"), segment=settings, tally=colloc.TallySpec(layer="lemma"), jobs=1)
    joined = "The captains drank cups_of_strong_teas; Cups_of_tea stood there."
    for layer in (None, "lemma", "lemma_fold"):
        assert colloc.join(path, sentence, ["cup of tea", "cup of strong tea"], layer=layer).text == joined
    assert colloc.join(path, sentence, ["cups of tea"], layer="lemma").text == sentence
    assert colloc.join(path, sentence, ["cups of tea"], layer="fold").text.endswith("; Cups_of_tea stood there.")
    with colloc.open_store(path) as store:
        called = layer_of_words("lemma", settings)
        forms, lemmas = (term_texts(store, layer) for layer in ("form", "lemma"))
        of_type = layer_map(store, "lemma")
        assert [called(form) for form in forms] == [lemmas[term] for term in of_type.tolist()]
    with pytest.raises(UsageError, match="no dictionary of lemmas"):
        Joiner([Expression(("a", "b"))], SegmentSettings(lemma="xx"), layer="lemma")
