"""The fit and the drawing of the growth measurement, and the table of the benchmark, on made-up figures."""

from __future__ import annotations

from pathlib import Path
from xml.etree import ElementTree

import pytest

from . import growth
from .growth import Point, draw, exponent, write_text
from .report import rows_of, table
from .running import Run
from .subject import Task

POINTS = [Point(n * 10**6, 2e-6 * (n * 10**6) ** 1.1, n * 10**6, n) for n in (1, 10, 100)]


def test_exponent_of_a_power_law() -> None:
    assert exponent([p.tokens for p in POINTS], [p.seconds for p in POINTS]) == pytest.approx(1.1)


def test_times_that_are_all_start_up_are_refused() -> None:
    with pytest.raises(ValueError, match="too small"):
        exponent([1, 2, 3], [0.1, -0.1, 0.2])


def test_the_drawing_is_svg_and_always_the_same(tmp_path: Path) -> None:
    first, second = tmp_path / "a.svg", tmp_path / "b.svg"
    for path in (first, second):
        draw(POINTS, 1.1, 5_000_000, path)
    assert first.read_bytes() == second.read_bytes()
    root = ElementTree.parse(first).getroot()
    assert root.tag == "{http://www.w3.org/2000/svg}svg"
    assert "measured, exponent 1.10" in first.read_text(encoding="utf-8")


def test_generated_text_follows_where_no_real_text_is(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(growth, "real_sources", list)
    assert write_text(tmp_path / "text.txt", 5_000) == 0
    assert len((tmp_path / "text.txt").read_bytes().split()) == 5_000


def test_ratios_stand_beside_the_same_task_and_window() -> None:
    tasks = [
        Task("build", "colloc", 5, Run(2.0, 3.0, 10**8, ""), 4_000_000, 20_000_000),
        Task("build", "other", 5, Run(7.0, 9.0, 3 * 10**8, ""), 4_000_000),
        Task("build", "other", 1, Run(1.0, 1.0, 10**8, "")),
    ]
    rows = rows_of(tasks)
    assert [row["times_colloc"] for row in rows] == [None, 3.5, None]
    assert rows[0]["tokens_per_second"] == 2_000_000
    lines = table(rows).splitlines()
    assert len({len(line) for line in lines}) == 1
    assert [cell.strip() for cell in lines[3].split("|")[1:-1]] == [
        "build",
        "other",
        "5",
        "7.00",
        "9.00",
        "0.57",
        "",
        "300",
        "3.50",
    ]
