"""Pages: nothing of the text acts as markup, nothing is fetched, and what can be measured of readability is."""

from __future__ import annotations

import re
from html.parser import HTMLParser
from importlib.resources import files
from pathlib import Path

import pytest

import colloc
from colloc.exports.pages.card import card_page
from colloc.exports.pages.lines import lines_page

HOSTILE = (
    "Sea <script>alert(1)</script> & \"sea\" <img src=x onerror='alert(2)'> fog. "
    "</style></bdi><b>Sea</b> &amp; fog \u202e sea fog\x07 ]]> sea-fog."
)
VOID = {"meta", "img", "br", "line", "rect", "hr", "link"}


class Reader(HTMLParser):
    """Tags, attributes and text of a page, and whether every element is closed in order."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.open: list[str] = []
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.text = ""
        self.unclosed: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        if not self.open or self.open.pop() != tag:
            self.unclosed.append(tag)

    def handle_data(self, data: str) -> None:
        if self.open and self.open[-1] != "style":
            self.text += data


def read(page: bytes) -> Reader:
    reader = Reader()
    reader.feed(page.decode())
    reader.close()
    return reader


@pytest.fixture(scope="module")
def hostile(tmp_path_factory: pytest.TempPathFactory) -> Path:
    import json

    folder = tmp_path_factory.mktemp("hostile")
    record = {"id": "<i>one</i>\"'", "<u>key</u>": "<s>value</s>", "text": HOSTILE}
    other = {"id": "two", "<u>key</u>": "other", "text": "The sea lay under fog. Fog on the sea again."}
    (folder / "a.jsonl").write_text("\n".join(map(json.dumps, (record, other))), encoding="utf-8")
    colloc.build(folder / "a.colloc", [str(folder / "a.jsonl")], jobs=1)
    return folder / "a.colloc"


def pages(store: Path) -> dict[str, bytes]:
    card = colloc.explain(store, "sea", "fog", inside="document")
    return {
        "card": card_page(card),
        "lines": lines_page(colloc.lines(store, "sea", "fog", inside="document")),
        "one word": lines_page(colloc.lines(store, "sea", sentences=True)),
    }


def test_text_is_text(hostile: Path) -> None:
    for name, page in pages(hostile).items():
        reader = read(page)
        assert not reader.unclosed, name
        assert not reader.open, name
        tags = {tag for tag, _ in reader.tags}
        assert not tags & {"script", "img", "b", "i", "u", "s", "iframe", "link", "object"}, name
        assert "<script>alert(1)</script>" in reader.text
        assert "\x07" not in reader.text
        attributes = [key for _, attrs in reader.tags for key in attrs]
        assert not [key for key in attributes if key.startswith("on")]


def test_nothing_is_fetched(hostile: Path) -> None:
    for page in pages(hostile).values():
        text = page.decode()
        reader = read(page)
        assert not [attrs for _, attrs in reader.tags if {"src", "href", "action", "data"} & attrs.keys()]
        style = files("colloc.exports.pages").joinpath("page.css").read_text(encoding="utf-8")
        assert "url(" not in style
        assert "@import" not in style
        (policy,) = [
            attrs["content"] for _, attrs in reader.tags if attrs.get("http-equiv") == "Content-Security-Policy"
        ]
        assert policy is not None
        assert policy.startswith("default-src 'none'")
        assert text.startswith("<!doctype html>")
        assert '<html lang="en">' in text


def test_the_match_is_marked_once_a_line(hostile: Path) -> None:
    answer = colloc.lines(hostile, "sea", "fog", inside="document")
    page = lines_page(answer).decode()
    assert page.count("<mark>") == page.count('<span class="partner">') == len(answer)
    for row in answer:
        assert f"<mark>{row['match']}</mark>" in page


def luminance(colour: str) -> float:
    """Relative luminance (Web Content Accessibility Guidelines 2.2)."""
    channels = [int(colour[place : place + 2], 16) / 255 for place in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    low, high = sorted([luminance(one), luminance(other)])
    return (high + 0.05) / (low + 0.05)


def test_contrast_of_letters_and_ground() -> None:
    """At least 4.5:1 for text and 3:1 for marks and lines that carry meaning (WCAG 2.2, 1.4.3 and 1.4.11)."""
    style = files("colloc.exports.pages").joinpath("page.css").read_text(encoding="utf-8")
    colours = dict(re.findall(r"--(\w+): (#[0-9a-f]{6});", style))
    assert contrast("#000000", "#ffffff") == pytest.approx(21)
    for letters in ("ink", "soft"):
        for ground in ("paper", "shade", "mark"):
            assert contrast(colours[letters], colours[ground]) >= 4.5
    (bars,) = re.findall(r"\.chart \.fill \{ fill: (#[0-9a-f]{6})", style)
    assert contrast(bars, colours["paper"]) >= 3


def test_the_sheet_is_for_paper_and_small_screens() -> None:
    style = files("colloc.exports.pages").joinpath("page.css").read_text(encoding="utf-8")
    for rule in ("@page { margin: 11mm; size: A4; }", "@media print", "@media (max-width: 640px)"):
        assert rule in style


def test_a_card_holds_what_it_promises(hostile: Path) -> None:
    card = colloc.explain(hostile, "sea", "fog", inside="document")
    text = " ".join(read(card_page(card)).text.split())
    assert card.sentence() in text
    for statement in card.statements:
        assert statement in text
    for heading in (
        "Best example lines",
        "Observed and expected counts",
        "Positions of",
        "Measures",
        "Intervals, 95 %",
        "Spread over documents",
        "Forms and order",
        "By <u>key</u>",
    ):
        assert heading in text
    for title in card.measures["title"]:
        assert title in text
