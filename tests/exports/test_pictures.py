"""Pictures are read back: what they draw, that they say what it is, and that equal answers make equal files."""

from __future__ import annotations

import json
import re
import struct
import xml.etree.ElementTree as ET
from pathlib import Path

import pytest

import colloc
from colloc.errors import CannotCreateError, UsageError
from colloc.exports.pictures.canvas import shorten
from colloc.exports.pictures.network import circle, draw_network

CORPORA = Path(__file__).resolve().parents[2] / "corpora_demo"
SVG = "{http://www.w3.org/2000/svg}"


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("pictures")
    lines = (CORPORA / "logbooks.jsonl").read_text(encoding="utf-8").splitlines()[:12]
    (folder / "logs.jsonl").write_text("\n".join(lines), encoding="utf-8")
    colloc.build(folder / "logs.colloc", [str(folder / "logs.jsonl")], jobs=1)
    colloc.floors(folder / "logs.colloc")
    return folder / "logs.colloc"


def texts(path: Path) -> list[str]:
    """All text of an SVG file, which stays text."""
    return ["".join(element.itertext()).strip() for element in ET.parse(path).iter(f"{SVG}text")]


def drawn(store: Path, folder: Path, kind: str) -> Path:
    path = folder / f"{kind}.svg"
    if kind in ("positions", "spread", "both"):
        answer: object = colloc.explain(store, "thick", "fog")
    elif kind == "network":
        answer = colloc.around(store, "fog")
    else:
        answer = colloc.pairs(store, limit=200)
    colloc.picture(answer, path, kind, store=store)  # type: ignore[arg-type]
    return path


@pytest.mark.parametrize(
    ("kind", "labels"),
    [
        ("positions", ["pairs of tokens", "distance from ‘thick’ (words; minus: before it)"]),
        ("spread", ["pairs of tokens", "if spread as all words are", "counted"]),
        ("both", ["pairs of tokens", "distance from ‘thick’ (words; minus: before it)"]),
        (
            "frequency",
            [
                "expected joint count, if the words were independent (pairs of tokens, logarithmic)",
                "Normalised pointwise mutual information",
                "99 % floor, words shuffled within documents",
                "99 % floor, words shuffled across documents",
            ],
        ),
        ("network", ["Strongest company of ‘fog’", "fog"]),
    ],
)
def test_pictures_say_what_they_show(store: Path, tmp_path: Path, kind: str, labels: list[str]) -> None:
    path = drawn(store, tmp_path, kind)
    found = texts(path)
    for label in labels:
        assert label in found
    first = path.read_bytes()
    path.unlink()
    assert drawn(store, tmp_path, kind).read_bytes() == first
    assert b"<script" not in first
    # Shades of grey and patterns only: nothing is told by hue (the three parts of each colour are close together).
    for colour in set(re.findall(rb"#[0-9a-f]{6}", first)):
        parts = [int(colour[place : place + 2], 16) for place in (1, 3, 5)]
        assert max(parts) - min(parts) <= 40


def test_numbers_of_a_profile_stand_at_its_bars(store: Path, tmp_path: Path) -> None:
    card = colloc.explain(store, "thick", "fog")
    found = texts(drawn(store, tmp_path, "positions"))
    assert f"{card.positions['count'].max():,}" in found
    assert [text for text in found if text in ("−5", "5", "0")]


def test_png_has_the_size_of_the_figure(store: Path, tmp_path: Path) -> None:
    colloc.picture(colloc.explain(store, "thick", "fog"), tmp_path / "a.png", "positions", store=store)
    data = (tmp_path / "a.png").read_bytes()
    assert data[:8] == b"\x89PNG\r\n\x1a\n"
    # PNG (ISO/IEC 15948): width and height follow the name of the first chunk. 7.2 by 3.2 inches at 150 dots.
    assert struct.unpack(">II", data[16:24]) == (1080, 480)


def test_hostile_words_stay_words(tmp_path: Path) -> None:
    record = {"id": "a", "text": "$x_1$ fog <b>. $x_1$ fog. $x_1$ fog. x_1 fog & fog x_1."}
    (tmp_path / "a.jsonl").write_text(json.dumps(record), encoding="utf-8")
    colloc.build(tmp_path / "a.colloc", [str(tmp_path / "a.jsonl")], jobs=1)
    colloc.picture(
        colloc.around(tmp_path / "a.colloc", "fog", min_count=1, any_strength=True),
        tmp_path / "a.svg",
        store=tmp_path / "a.colloc",
    )
    assert any("x_1" in text for text in texts(tmp_path / "a.svg"))
    assert shorten("a\nb\x07c" + "d" * 40, 10) == "a b cdddd…"


def test_what_cannot_be_drawn(store: Path, tmp_path: Path) -> None:
    card, company = colloc.explain(store, "thick", "fog"), colloc.around(store, ["fog", "rain"])
    with pytest.raises(UsageError, match=r"ends in \.svg or \.png"):
        colloc.picture(card, tmp_path / "a.pdf", store=store)
    with pytest.raises(UsageError, match="a card is drawn as"):
        colloc.picture(card, tmp_path / "a.svg", "network", store=store)
    with pytest.raises(UsageError, match="drawn as frequency or network"):
        colloc.picture(company, tmp_path / "a.svg", "both", store=store)
    with pytest.raises(UsageError, match="around one word"):
        colloc.picture(company, tmp_path / "a.svg", "network", store=store)
    with pytest.raises(UsageError, match="no rows"):
        colloc.picture(colloc.pairs(store, min_count=10**6), tmp_path / "a.svg", store=store)
    with pytest.raises(CannotCreateError):
        colloc.picture(card, tmp_path / "nowhere" / "a.svg", store=store)
    assert list(tmp_path.iterdir()) == []


def test_partners_that_hold_together_stand_side_by_side() -> None:
    links = {(0, 3): 0.5, (1, 2): 0.4, (0, 1): 0.1}
    order = circle(4, links)
    assert sorted(order) == [0, 1, 2, 3]
    assert abs(order.index(0) - order.index(3)) == 1
    assert abs(order.index(1) - order.index(2)) == 1


def test_the_title_speaks_of_chance_and_dashes_only_where_they_are_drawn(tmp_path: Path) -> None:
    store = tmp_path / "a.colloc"
    (tmp_path / "a.txt").write_text("thick fog lay. thick fog came. fog lay. " * 9, encoding="utf-8")
    colloc.build(store, [str(tmp_path / "a.txt")], jobs=1)
    pairs = colloc.pairs(store, min_count=1, any_strength=True)
    lacking = colloc.picture(pairs, tmp_path / "p.svg", "frequency", store=store)
    assert lacking is not None
    assert "no chance floors of npmi" in lacking
    assert "Strength against expected count" in texts(tmp_path / "p.svg")
    company = colloc.around(store, "fog", min_count=1, any_strength=True)
    for links, dashed in (({}, False), ({(0, 1): 0.5}, True)):
        draw_network(company, "npmi", links, tmp_path / "n.svg")
        assert any("Dashed" in text for text in texts(tmp_path / "n.svg")) is dashed
