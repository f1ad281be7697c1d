"""Tables read the quick way and the careful way give what the standard library's reader gives."""

from __future__ import annotations

import csv
import io
import random
from pathlib import Path

import pytest

from colloc.cli import tables_in
from colloc.exports.spreadsheets import restore

PLAIN = ["a", "b c", "", "é", "1.5"]
QUOTED = [*PLAIN, 'q"x', "x,y", "l\nm", "'=A1", "z\r\nk"]


@pytest.mark.parametrize("seed", range(40))
def test_tables_of_plain_and_quoted_cells(seed: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Cells, rows and the lines they end on; stretches of four lines, so that quoted cells reach over their ends."""
    monkeypatch.setattr(tables_in, "ROWS_A_PART", 4)
    drawn = random.Random(seed)
    width = drawn.randint(1, 3)
    pool = PLAIN if seed % 2 else QUOTED
    rows = [[drawn.choice(pool) for _ in range(width)] for _ in range(drawn.randint(0, 14))]
    written = io.StringIO()
    writer = csv.writer(written, lineterminator=drawn.choice(["\n", "\r\n"]))
    writer.writerows([[f"c{place}" for place in range(width)], *rows])
    (tmp_path / "t.csv").write_bytes(written.getvalue().encode())
    reader = csv.reader(io.StringIO(written.getvalue(), newline=""))
    next(reader)
    expected = [([restore(cell) for cell in row], reader.line_num) for row in reader if row]
    parts = list(tables_in.read_rows(tmp_path / "t.csv"))
    cells = [list(row) for part in parts for row in zip(*part.columns.values(), strict=True)]
    assert cells == [row for row, _ in expected]
    assert [line for part in parts for line in part.lines] == [line for _, line in expected]
    assert parts
