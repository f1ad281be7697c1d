"""``lines`` and ``explain`` from the command line: what a terminal shows, formats, exit codes."""

from __future__ import annotations

import csv
import html
import io
import json
import re
import shutil
import unicodedata
from pathlib import Path

import pytest

import colloc

from .conftest import Run

TEXTS = {
    "english": "The sea was calm. A long wave came over the sea wall, and the sea rose. Was the sea ever still?",
    "arabic": "كان البحر هادئا في الصباح. ثم هبت ريح قوية على البحر وعاد الصيادون إلى الميناء. هل رأيت البحر؟",
    "hebrew": "הים היה שקט בבוקר. אחר כך נשבה רוח חזקה מן הים והדייגים חזרו לנמל.",
    "japanese": "海は静かだった。「海へ行こう」と彼は言った。漁師たちは海から帰ってきた。",
    "combining": "O\u0301 mar, o\u0301 mar salgado, e o ma\u0301r de ale\u0301m; o mar.",
    "controls": "A sea \x1b[31mred\x1b[0m and \u202esea\u202c turned.",
}
WORDS = {"english": "sea", "arabic": "البحر", "hebrew": "הים", "japanese": "海", "combining": "mar", "controls": "sea"}


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("showing")
    records = [json.dumps({"id": name, "year": 1900, "text": text}) for name, text in TEXTS.items()]
    (folder / "a.jsonl").write_text("\n".join(records), encoding="utf-8")
    colloc.build(folder / "a.colloc", [str(folder / "a.jsonl")], jobs=1)
    return folder / "a.colloc"


def columns(text: str) -> int:
    """Display columns by UAX #11 and the width rule of combining marks, written out for these scripts."""
    wide = sum(2 if unicodedata.east_asian_width(character) in "WF" else 1 for character in text)
    return wide - sum(unicodedata.category(character) in ("Mn", "Cf") for character in text)


def word_columns(line: str, word: str) -> set[int]:
    """Columns where the word begins; isolates stand in logical order, from left to right."""
    return {columns(line[: match.start()]) for match in re.finditer(re.escape(word), line)}


@pytest.mark.parametrize("width", [60, 80, 120])
@pytest.mark.parametrize("name", TEXTS)
def test_matches_stand_under_each_other(
    run: Run, store: Path, monkeypatch: pytest.MonkeyPatch, name: str, width: int
) -> None:
    monkeypatch.setenv("COLUMNS", str(width))
    done = run("lines", store, WORDS[name], "--where", f"id={name}", "--layer", "form", "-q")
    assert done.code == 0
    head, *lines = done.out.splitlines()
    assert head.split() == ["document", "word"]
    assert len(lines) == {"english": 4, "arabic": 3, "hebrew": 2, "japanese": 3, "combining": 3, "controls": 1}[name]
    if name in ("arabic", "hebrew"):
        # What is read first stands on the right: the cell that begins with the match ends in one column.
        assert all(line.split("\u2068")[1].startswith(WORDS[name]) for line in lines)
        assert len({columns(line[: line.index("\u2069")]) for line in lines}) == 1
    else:
        assert set.intersection(*(word_columns(line, WORDS[name]) for line in lines))
    for line in lines:
        assert columns(line) <= width
        # Nothing in the text steers the terminal, and every isolate is closed.
        assert not set(line) & {"\x1b", "\u202e", "\u202c"}
        assert line.count("\u2068") == line.count("\u2069")


def test_right_to_left_lines_read_from_the_right(run: Run, store: Path) -> None:
    done = run("lines", store, WORDS["arabic"], "-q", "-n", 1)
    cells = [cell.strip("\u2068\u2069 ") for cell in done.out.strip().split("\u2068")[1:]]
    assert cells[1:] == ["كان"]
    assert cells[0].startswith("البحر هادئا في الصباح")


def test_lines_are_spaced_as_the_text_is(run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """No space between a word and its comma: what stands in a line stands in the text, but for runs of spaces."""
    monkeypatch.setenv("COLUMNS", "200")
    texts = {
        "a": 'The sea, the "sea" and (sea): sea-side\n sea!  A  sea.',
        "b": "海は静かだった。「海へ行こう」と彼は言った。",
    }
    records = [json.dumps({"id": name, "text": text}) for name, text in texts.items()]
    (tmp_path / "a.jsonl").write_text("\n".join(records), encoding="utf-8")
    colloc.build(tmp_path / "a.colloc", [str(tmp_path / "a.jsonl")], jobs=1)
    for name, word in (("a", "sea"), ("b", "海")):
        asked = ("lines", tmp_path / "a.colloc", word, "-q")
        rows = json.loads(run(*asked, "-f", "json").out)["rows"]
        page = run(*asked, "-f", "html").out
        shown = run(*asked).out.splitlines()[1:]
        for row, line in zip(rows, shown, strict=True):
            whole = row["before"] + row["match"] + row["after"]
            assert whole in texts[name]
            place, text = line.split(maxsplit=2)[1:]
            assert int(place) == row["token"] + 1
            assert text == " ".join(whole.split())
            before, rest = html.escape(row["before"]), html.escape(row["after"])
            assert f'<bdi>{before}</bdi></span><span class="rest"><bdi><mark>{word}</mark>{rest}</bdi>' in page
            assert f", word {place}</span>" in page


def test_a_word_has_one_number_for_readers(run: Run, store: Path) -> None:
    """Counted from 1 in lines, whole sentences and pages; an offset from 0 where programs read it."""
    asked = ("lines", store, "rose", "-q")
    place = TEXTS["english"].rstrip("?").replace(".", "").replace(",", "").split().index("rose") + 1
    assert run(*asked).out.splitlines()[1].split()[:2] == ["english", str(place)]
    assert run(*asked, "--sentences").out.splitlines()[0] == f"english, word {place}"
    assert f"english, word {place}<" in run(*asked, "-f", "html").out
    assert json.loads(run(*asked, "-f", "jsonl").out)["token"] == place - 1


def test_whole_sentences_are_running_text(run: Run, store: Path) -> None:
    assert '<ol class="lines running">' in run("lines", store, "sea", "--sentences", "-q", "-f", "html").out
    assert '<ol class="lines">' in run("lines", store, "sea", "-q", "-f", "html").out


def test_formats_hold_the_same_lines(run: Run, store: Path, tmp_path: Path) -> None:
    asked = ("lines", store, "sea", "wave", "--inside", "document", "-w", 9, "-q", "-f")
    rows = [json.loads(line) for line in run(*asked, "jsonl").out.splitlines()]
    whole = json.loads(run(*asked, "json").out)
    assert whole["rows"] == rows
    assert whole["settings"]["found"] == len(rows) == 3
    table = list(csv.DictReader(io.StringIO(run(*asked, "csv").out)))
    assert [{key: str(value) for key, value in row.items()} for row in rows] == table
    names = "document token character year before match after partner partner_character distance"
    assert list(rows[0]) == names.split()
    text = TEXTS["english"]
    for row in rows:
        assert text[row["character"] :].startswith(row["match"])
    page = run(*asked, "html").out
    assert page.startswith("<!doctype html>")
    assert page.count("<mark>") == 3
    done = run(*asked, "html", "-o", tmp_path / "a.html", "--settings-beside")
    assert done.out == ""
    assert (tmp_path / "a.html").read_text(encoding="utf-8") == page
    assert json.loads((tmp_path / "a.html.settings.json").read_text(encoding="utf-8"))["command"] == "lines"


def test_how_many_there_are_is_said(run: Run, store: Path) -> None:
    done = run("lines", store, "sea", "-n", 2)
    assert len(done.out.splitlines()) == 3
    assert "found 5; in documents 2; shown 2" in done.err


def test_metadata_beside_the_document(run: Run, store: Path) -> None:
    assert run("lines", store, "wave", "-q", "--keys", "year").out.split()[:6] == [
        "document",
        "year",
        "word",
        "english",
        "1900",
        "7",
    ]
    done = run("lines", store, "wave", "--keys", "author")
    assert done.code == 2
    assert "no document has the key 'author'" in done.err


def test_sentences_are_wrapped(run: Run, store: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "60")
    done = run("lines", store, "wave", "sea", "--best", "-q")
    assert done.out.splitlines() == [
        "english, word 7",
        "    A long [wave] came over the [sea] wall, and the sea",
        "    rose.",
    ]
    japanese = run("lines", store, "漁", "--sentences", "-q").out.splitlines()
    assert japanese[1:] == ["    [漁]師たちは海から帰ってきた。"]


@pytest.mark.parametrize(
    ("arguments", "code", "message"),
    [
        (("lines", "xyzzy"), 1, "never occurs"),
        (("lines", "calm", "wave"), 1, "wider window"),
        (("explain", "xyzzy", "sea"), 1, "colloc words"),
        (("lines", "sea", "--best", "--sort", "random"), 2, "leave out --sort"),
        (("lines", "sea", "-w", 3, "--left", 2), 2, "go together"),
        (("explain", "sea", "wave", "--plot", "a.gif"), 2, "ends in .svg or .png"),
        (("pairs", "--plot", "a.gif"), 2, "ends in .svg or .png"),
        (("lines", "sea", "--where", "author=x"), 2, "no document has the key"),
    ],
)
def test_errors(run: Run, store: Path, arguments: tuple[object, ...], code: int, message: str) -> None:
    done = run(arguments[0], store, *arguments[1:])
    assert done.code == code
    assert message in done.err
    assert done.out == ""
    assert len([line for line in done.err.splitlines() if line.startswith("colloc:")]) == 1


@pytest.mark.parametrize("width", [80, 120])
def test_the_card_fits_the_terminal(run: Run, store: Path, monkeypatch: pytest.MonkeyPatch, width: int) -> None:
    monkeypatch.setenv("COLUMNS", str(width))
    done = run("explain", store, "sea", "wave", "--inside", "document", "-w", 9, "-q")
    assert done.code == 0
    lines = done.out.splitlines()
    assert lines[0] == "sea + wave"
    assert lines[2] == "‘wave’ stands within 9 words of ‘sea’ in 3 of 5 cases."
    assert [line for line in lines if columns(line) > width] == []
    for title in ("Measures", "Intervals (95 %)", "Chance", "Spread over documents", "Forms and order", "Examples"):
        assert title in lines


def test_the_card_as_json_and_page(run: Run, store: Path) -> None:
    card = json.loads(run("explain", store, "sea", "wave", "-f", "json", "-q").out)
    assert card["sentence"].startswith("‘wave’ stands within 5 words of ‘sea’")
    assert {"table", "cells", "information", "measures", "intervals", "tests", "spread", "positions"} <= card.keys()
    page = run("explain", store, "sea", "wave", "-f", "html", "-q").out
    assert card["sentence"] in page


def test_pictures_from_the_command_line(run: Run, store: Path, tmp_path: Path) -> None:
    made = [
        ("explain", "sea", "wave", "--inside", "document", "--plot", tmp_path / "card.svg"),
        ("explain", "sea", "wave", "--plot", tmp_path / "spread.png", "--plot-as", "spread"),
        ("around", "sea", "--min-count", 1, "--any-strength", "--plot", tmp_path / "company.svg"),
        ("pairs", "--min-count", 1, "--plot", tmp_path / "pairs.png"),
    ]
    for command, *rest in made:
        done = run(command, store, *rest, "-q")
        assert (done.code, done.err) == (0, "")
        assert done.out
    assert sorted(path.name for path in tmp_path.iterdir()) == ["card.svg", "company.svg", "pairs.png", "spread.png"]


def test_written_pictures_are_told(run: Run, store: Path, tmp_path: Path) -> None:
    bare = run("pairs", store, "--min-count", 1, "--plot", tmp_path / "p.png").err
    assert f"# {tmp_path}/p.png: picture written; no chance floors of npmi are kept: `colloc floors {store}`" in bare
    card = run("explain", store, "sea", "wave", "--plot", tmp_path / "c.svg").err
    assert card.endswith(f"# {tmp_path}/c.svg: picture written\n")
    kept = tmp_path / "kept.colloc"
    shutil.copy(store, kept)
    assert run("floors", kept).code == 0
    with_floors = run("pairs", kept, "--min-count", 1, "--plot", tmp_path / "p.svg").err
    assert with_floors.endswith(f"# {tmp_path}/p.svg: picture written\n")
    assert "Strength against chance" in (tmp_path / "p.svg").read_text(encoding="utf-8")
