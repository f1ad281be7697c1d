"""Tables on a terminal: nothing is wider than it, nothing is left out unsaid, and a pipe has every column."""

from __future__ import annotations

import fcntl
import os
import pty
import re
import struct
import subprocess
import sys
import termios
from pathlib import Path

import numpy as np
import pytest

import colloc
from colloc.answers.columns import Columns
from colloc.answers.plain import Grid, width
from colloc.cli.fitting import fitting, left_out_line
from colloc.cli.kwic import kwic_lines

LINES = ("Thick fog at dawn. The thick fog came in from the sea.", "Thick fog again. The sea was calm at dawn.")


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("fitting") / "a.colloc"
    colloc.build(path, documents=[{"text": text, "year": str(1871 + place)} for place, text in enumerate(LINES * 12)])
    return path


def on_terminal(columns: int, *arguments: object, environment: dict[str, str] | None = None) -> list[str]:
    """Lines on a terminal of that many columns."""
    ours, theirs = pty.openpty()
    fcntl.ioctl(theirs, termios.TIOCSWINSZ, struct.pack("HHHH", 24, columns, 0, 0))
    clean = {name: value for name, value in os.environ.items() if name != "COLUMNS"}
    running = subprocess.Popen(
        [sys.executable, "-m", "colloc", *map(str, arguments)],
        stdout=theirs,
        stderr=subprocess.DEVNULL,
        env=clean | (environment or {}),
    )
    os.close(theirs)
    data = b""
    while True:
        try:
            piece = os.read(ours, 1 << 16)
        except OSError:  # how Linux tells that the other end is closed
            break
        if not piece:
            break
        data += piece
    os.close(ours)
    assert running.wait() == 0
    return data.decode().replace("\r\n", "\n").splitlines()


def test_what_ranks_stays_and_so_do_the_words() -> None:
    names = ("first", "second", "joint", "pmi", "npmi", "pmi_low", "pmi_high", "sound", "g2", "q_value")
    answer = Columns({name: np.full(3, 1234.5) for name in names}, {"measure": "g2"})
    for room in (24, 40, 80):
        assert {"first", "second", "g2"} <= set(fitting(answer, room))
    assert "g2" not in fitting(Columns(answer.data, {"measure": "pmi"}), 40)


@pytest.mark.parametrize("columns", [64, 80, 120])
def test_half_of_a_line_is_text(columns: int) -> None:
    keys = {key: np.array(["a very long value of metadata"], object) for key in ("author", "title", "place")}
    row = {"document": ["a-long-name-of-a-document"], **keys, "token": np.array([1233])}
    text = {"before": ["so it was said " * 9], "match": ["fog"], "after": [" came in again" * 9]}
    heading, line = kwic_lines(Columns(row | text), columns, list(keys))
    assert width(line) <= columns
    begin = line.index("1234") + 4
    assert width(line[begin:]) >= columns // 2 - 2
    assert line.startswith("a-long-")
    assert heading.startswith("docum")


@pytest.mark.parametrize("columns", [60, 80, 120, 200])
def test_a_table_fits_its_terminal_and_names_what_is_missing(store: Path, columns: int) -> None:
    asked = ("pairs", store, "--sure", "-n", 4)
    lines = on_terminal(columns, *asked)
    assert max(map(len, lines)) <= columns
    note = lines.index(next(line for line in lines if line.startswith("(")))
    assert len({len(line.split()) for line in lines[:note]}) == 1
    said = re.fullmatch(r"\((\d+) more columns?: (.*); a wider window, .*\)", " ".join(lines[note:]))
    assert said is not None
    left_out = said[2].split(", ")
    assert int(said[1]) == len(left_out)
    everything = colloc.pairs(store, sure=True, limit=4).names
    assert sorted([*lines[0].split(), *left_out]) == sorted(everything)


def test_what_fits_is_shown_whole(store: Path) -> None:
    asked = ("pairs", store, "-n", 4, "-q")
    piped = subprocess.run(
        [sys.executable, "-m", "colloc", *map(str, asked)],
        capture_output=True,
        text=True,
        check=True,
        env={**os.environ, "COLUMNS": "40"},
    )
    lines = piped.stdout.splitlines()
    assert tuple(lines[0].split()) == colloc.pairs(store, limit=4).names
    assert on_terminal(150, *asked) == lines
    # the environment overrules the terminal, as elsewhere
    assert on_terminal(40, *asked, environment={"COLUMNS": "150"}) == lines
    assert max(map(len, on_terminal(150, *asked, environment={"COLUMNS": "40"}))) <= 40
    assert on_terminal(40, *asked, "-f", "csv")[0].split(",") == lines[0].split()


def test_wide_is_wide(store: Path) -> None:
    asked = ("contrast", store, "--this", "year=1871..1882", "--min-count", 1, "-n", 2, "-q")
    narrow, wide = on_terminal(70, *asked), on_terminal(70, *asked, "--wide")
    assert max(map(len, wide)) > 70 >= max(map(len, narrow))
    assert "says" in narrow[0].split()


def test_which_columns_go() -> None:
    numbers = np.arange(3)
    names = [
        "first",
        "second",
        "joint",
        "first_total",
        "second_total",
        "total",
        "expected",
        "pmi",
        "pmi_low",
        "pmi_high",
    ]
    answer = Columns({"first": ["a", "b", "霧霧霧"], "second": ["x", "y", "z"]} | dict.fromkeys(names[2:], numbers))
    for room in range(10, 100):
        shown = fitting(answer, room)
        assert shown[:2] == ("first", "second")
        assert [name for name in names if name in shown] == list(shown)
        part = answer.select(shown)
        grid = Grid(shown, [part.is_numeric(name) for name in shown])
        lines = grid.lines([array.tolist() for array in part.data.values()], heading=True)
        assert shown == ("first", "second") or max(map(width, lines)) <= room
        # both ends of an interval, and the whole margins, or none of them
        assert ("pmi_low" in shown) is ("pmi_high" in shown)
        assert ("first_total" in shown) is ("total" in shown)
    assert fitting(answer, 100) == tuple(names)
    assert left_out_line(answer, tuple(names)) == ""
    assert left_out_line(answer, tuple(names[:-1])).startswith("(1 more column: pmi_high; ")
    only = Columns({"item": ["a"], "value": ["a long text " * 20]})
    assert fitting(only, 20) == ("item", "value")
