"""Tokens, sentences and paragraphs of a stretch: the rules, the tailoring, the errors."""

from __future__ import annotations

import time

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from colloc.errors import DataError, UsageError
from colloc.records import Segments
from colloc.settings import SegmentSettings
from colloc.tokens import patterns
from colloc.tokens.abbreviations import ALWAYS, BEFORE_NUMBERS, INITIALS
from colloc.tokens.segmenter import Segmenter
from tests.tokens import slow_rules, texts

pytestmark = pytest.mark.usefixtures("both_ways")


def segment(text: str, **options: object) -> Segments:
    return Segmenter(SegmentSettings(**options)).segment(text)  # type: ignore[arg-type]


def words(text: str, **options: object) -> list[str]:
    found = segment(text, **options)
    return [text[start:end] for start, end in zip(found.starts.tolist(), found.ends.tolist(), strict=True)]


def sentences(text: str, **options: object) -> list[list[str]]:
    return _units(text, "sentences", options)


def paragraphs(text: str, **options: object) -> list[list[str]]:
    return _units(text, "paragraphs", options)


def _units(text: str, kind: str, options: dict[str, object]) -> list[list[str]]:
    tokens = words(text, **options)
    first = getattr(segment(text, **options), kind).tolist()
    return [tokens[start:end] for start, end in zip(first, [*first[1:], len(tokens)], strict=True)]


@settings(max_examples=300)
@given(texts.mixed)
def test_without_tailoring_it_is_the_standard(text: str) -> None:
    found = segment(text, tailored=False)
    spans = slow_rules.words(text)
    starts = [start for start, _ in spans]
    assert list(zip(found.starts.tolist(), found.ends.tolist(), strict=True)) == spans
    assert found.sentences.tolist() == slow_rules.first_tokens(starts, slow_rules.sentence_boundaries(text))
    line_ends = [
        place for place in range(len(text) + 1) if slow_rules.regex.search(slow_rules.LINE_END + r"\Z", text[:place])
    ]
    assert found.paragraphs.tolist() == slow_rules.first_tokens(starts, [0, *line_ends])
    assert found.dropped == 0
    assert found.closed


@settings(max_examples=300)
@given(texts.mixed)
def test_hyphens_and_wrapped_lines_follow_their_definitions(text: str) -> None:
    found = segment(text, addresses="split", line_ends="space", abbreviations=False)
    spans = slow_rules.words(text, hyphens=True)
    unwrapped = slow_rules.unwrapped(text)
    breaks = slow_rules.sentence_boundaries(unwrapped)
    assert list(zip(found.starts.tolist(), found.ends.tolist(), strict=True)) == spans
    assert found.sentences.tolist() == slow_rules.first_tokens([start for start, _ in spans], breaks)


@given(texts.mixed)
def test_tokens_are_ordered_apart_and_verbatim(text: str) -> None:
    found = segment(text)
    edges = [edge for span in zip(found.starts.tolist(), found.ends.tolist(), strict=True) for edge in span]
    assert edges == sorted(edges)
    assert all(start < end for start, end in zip(edges[0::2], edges[1::2], strict=True))
    assert all(0 <= edge <= len(text) for edge in edges)
    assert found.text is text
    assert all(
        slow_rules.regex.search(r"[\p{L}\p{N}]", text[start:end])
        for start, end in zip(edges[0::2], edges[1::2], strict=True)
    )


@pytest.mark.parametrize("text", ["", " ", "\n", "...", "_ __ -", "\u0301", "\u200d\u2764"])
def test_text_without_a_word(text: str) -> None:
    found = segment(text)
    assert (len(found), len(found.sentences), len(found.paragraphs), found.closed) == (0, 0, 0, True)


@pytest.mark.parametrize(
    "text",
    [
        *["!\u200d\u2139", "x\u200d\u24c2", "\u200d\u2139 a", "\n\u200d\u2139", "a!\u200d\u2764\u200d\u2139 b"],
        *["!\uff9e", "\uff9e", "\n\uff9e\u0301 x", "!\u0301\uff9e-a", "\u24c2 \u24c2\u24c2 _\u02d7", "_\u0301_a"],
        *["カ-a", "a-\u0301b", "\u0301-a", "カ_a", "א'", 'א"', 'א"\u0301א', 'a"b', "א'-b", "..\u00ad.\u00ad"],
    ],
)
def test_rare_meetings_of_rules(text: str) -> None:
    """Joiners before letter-like pictographs, marks that are letters, segments of connectors alone."""
    found = segment(text, addresses="split")
    assert list(zip(found.starts.tolist(), found.ends.tolist(), strict=True)) == slow_rules.words(text, hyphens=True)


def test_hyphens() -> None:
    text = "well-known x\u2010y a\u2011b 1914-1918 a--b -c d- e\u2013f re-\u00adtry"
    kept = ["well-known", "x\u2010y", "a\u2011b", "1914-1918", "a", "b", "c", "d", "e", "f", "re-\u00adtry"]
    assert words(text) == kept
    assert words("well-known a-b-c", hyphens="split") == ["well", "known", "a", "b", "c"]


def test_numbers() -> None:
    text = "3 ships, 1,200.50 tons, 2nd of 1912, \u2167 \u00b2 x2"
    assert words(text)[:4] == ["3", "ships", "1,200.50", "tons"]
    assert words(text, numbers="drop") == ["ships", "tons", "2nd", "of", "x2"]


@pytest.mark.parametrize(
    ("text", "kept"),
    [
        ("See http://a.org/b?c=D.", ["See", "http://a.org/b?c=D"]),
        ("(http://a.org/x_(y)) and", ["http://a.org/x_(y)", "and"]),
        ("<https://a.org/>, www.b.co.uk!", ["https://a.org/", "www.b.co.uk"]),
        ("mail jo.o'neil+x@mail-1.example.org.", ["mail", "jo.o'neil+x@mail-1.example.org"]),
        ("ftp://x@y.org:21/z me@", ["ftp://x@y.org:21/z", "me"]),
        ("a@b 5@ @c ://x www. w3 awww.x", ["a", "b", "5", "c", "x", "www", "w3", "awww.x"]),
        ("see:http://a.b", ["see", "http://a.b"]),
        ("at http://a.org/?u=http://b.org/www.c@d.org x", ["at", "http://a.org/?u=http://b.org/www.c@d.org", "x"]),
        ("www.a.org:http://b.org", ["www.a.org", "http://b.org"]),
        ("x_www.a.org", ["x_www.a.org"]),
        ("пиши почта@пример.рф", ["пиши", "почта@пример.рф"]),
        ("one@a.org,two@a.org", ["one@a.org", "two@a.org"]),
        ("http://a.org/ü–ö “http://b.org”", ["http://a.org/ü–ö", "http://b.org"]),
    ],
)
def test_addresses(text: str, kept: list[str]) -> None:
    """Invented addresses; the forms are those of RFC 3986 and RFC 5322."""
    assert words(text) == kept
    marked = [word for word in kept if "://" in word or "@" in word or word.startswith("www.")]
    assert words(text, addresses="drop") == [word for word in kept if word not in marked]
    assert words(text, addresses="split") == [text[a:b] for a, b in slow_rules.words(text, hyphens=True)]


def test_no_sentence_ends_inside_an_address() -> None:
    text = "At http://a.org/go?To=B now. Next."
    assert [len(sentence) for sentence in sentences(text)] == [3, 1]
    assert [len(sentence) for sentence in sentences(text, addresses="drop")] == [2, 1]


def test_crafted_addresses_take_linear_time() -> None:
    pieces = [",www.", "a://", "://", "x@", "@", "a@b.", "(www.", "a.b-c@d", "http://)"]
    for piece in [*pieces, *(f"{left}{right}" for left in pieces for right in pieces)]:
        text = piece * (20_000 // len(piece))
        began = time.process_time()
        segment(text)
        segment(text + "://x")
        # Quadratic behaviour would take minutes.
        assert time.process_time() - began < 2, piece


def test_abbreviations() -> None:
    text = "Dr. Gray met J. R. Poe. No. 5 is on p. 12. He said no. Then e.g. Ann left. Ask Mr.\n\nPoe went."
    lengths = [len(sentence) for sentence in sentences(text)]
    assert lengths == [6, 6, 3, 4, 2, 2]
    assert len(sentences(text, abbreviations=False)) > 9


def test_every_listed_abbreviation_works_before_a_capital_and_a_number() -> None:
    assert max(map(len, " ".join([*ALWAYS.values(), *BEFORE_NUMBERS.values()]).split())) < 12
    for word in [*INITIALS, *" ".join(ALWAYS.values()).split()]:
        assert len(sentences(f"so ({word}. Anna) here")) == 1, word
        assert len(sentences(f"so x{word}{word}. Anna here")) == 2, word
    for word in " ".join(BEFORE_NUMBERS.values()).split():
        assert len(sentences(f"so {word}. 12 here")) == 1, word


def test_line_ends() -> None:
    text = "One two\nthree. Four\r\n\r\nFive\r\nsix\u2029seven\n \t\neight\n"
    assert [len(part) for part in paragraphs(text, line_ends="space")] == [4, 2, 1, 1]
    assert [len(part) for part in sentences(text, line_ends="space")] == [3, 1, 2, 1, 1]
    assert [len(part) for part in paragraphs(text)] == [2, 2, 1, 1, 1, 1]


def test_too_long_tokens_are_left_out_and_counted() -> None:
    found = segment("aa bbbb cc ddddd", max_token=3)
    assert found.dropped == 2
    assert found.starts.tolist() == [0, 8]


def test_a_stretch_that_begins_inside_a_sentence() -> None:
    segmenter = Segmenter(SegmentSettings())
    inside = segmenter.segment("went on. Then more ", following="w", opening=False)
    assert inside.sentences.tolist() == [2]
    assert inside.paragraphs.tolist() == []
    assert not inside.closed
    assert segmenter.segment("done. ", following="A").closed
    assert not segmenter.segment("done. ", following="a").closed
    assert segmenter.segment("  ", following="x", opening=True).closed
    assert not segmenter.segment("  ", following="x", opening=False).closed
    cut = segmenter.segment("half a wo", following="rd")
    assert (cut.ends.tolist(), cut.closed) == ([4, 6, 9], False)


def test_pattern() -> None:
    text = "Ab-c 12 x_y\nend. Next"
    assert words(text, pattern=r"\p{L}+") == ["Ab", "c", "x", "y", "end", "Next"]
    assert words(text, pattern=r"[^,]+") == ["Ab-c 12 x_y", "end. Next"]
    assert words(text, pattern=r"\S+", numbers="drop") == ["Ab-c", "x_y", "end.", "Next"]
    assert [len(part) for part in sentences(text, pattern=r"\w+")] == [4, 1, 1]
    assert words(text, pattern=r"(?<=x)_?|y") == ["_", "y"]
    assert words("\n\na b\nc\r\n\n\nd\n", pattern=r"[^,]+", line_ends="space") == ["a b\nc", "d"]


def test_pattern_errors(monkeypatch: pytest.MonkeyPatch) -> None:
    with pytest.raises(UsageError, match=r"'\(a' is not a valid regular expression"):
        Segmenter(SegmentSettings(pattern="(a"))
    with pytest.raises(UsageError, match=r"'a\*' matches the empty string"):
        Segmenter(SegmentSettings(pattern="a*"))
    monkeypatch.setattr(patterns, "SECONDS", 0.05)
    with pytest.raises(DataError, match=r"took longer than 0.05 s on a paragraph of 41 characters .* make it simpler"):
        segment("a" * 40 + "!", pattern=r"(?:a|a)*(?:a|a)*(?:a|b|ab)*(?=c)c|(a+)+\d")


@given(st.text(alphabet=texts.CHARACTERS, max_size=30))
def test_repeating_the_text_as_a_new_paragraph_repeats_the_tokens(text: str) -> None:
    once, twice = segment(text), segment(f"{text}\n\u2029{text}")
    shift = len(text) + 2
    assert twice.starts.tolist() == once.starts.tolist() + [start + shift for start in once.starts.tolist()]
    assert twice.sentences.tolist() == once.sentences.tolist() + [
        number + len(once) for number in once.sentences.tolist()
    ]
