"""The description of the file is true: its ten-line reader reads what the package wrote; its sizes and names fit."""

from __future__ import annotations

import re
from collections import Counter
from pathlib import Path
from typing import Any

import pytest

from colloc.store.database import schema
from colloc.store.opening import open_for_reading

from .making import WINDOW, small_store, table_of, write_tally

PAGE = Path(__file__).parents[2] / "docs" / "file-format.md"


@pytest.fixture(scope="module")
def text() -> str:
    return PAGE.read_text(encoding="utf-8")


def _reader(text: str) -> tuple[str, Any]:
    (code,) = re.findall(r"```python\n(.*?)```", text, re.DOTALL)
    names: dict[str, Any] = {}
    exec(compile(code, str(PAGE), "exec"), names)
    return code, names["read_pairs"]


def test_the_reader_reads_all_pairs(text: str, tmp_path: Path) -> None:
    path = tmp_path / "a.colloc"
    with small_store(path) as store:
        # Counts beyond a byte, terms beyond two and three bytes, and a change that takes pairs away.
        large = {(3, 70_000): 300, (70_000, 3): 1, (5, 5): 2**40, (1, 2**24 + 7): 1, (0, 1): 256}
        write_tally(store, WINDOW, {**large, (2, 4): 9}, pairs_a_page=2)
        write_tally(store, WINDOW, {(2, 4): -9, (3, 70_000): 1}, delta=True)
        store.make_durable()
    code, read_pairs = _reader(text)
    assert len(code.strip().splitlines()) == 10
    assert "colloc" not in code
    cells: Counter[tuple[int, int]] = Counter()
    for low, high, forward, backward in read_pairs(path, 1):
        for x, y, ahead, back in zip(low.tolist(), high.tolist(), forward.tolist(), backward.tolist(), strict=True):
            cells[x, y] += ahead
            cells[y, x] += back
    assert {pair: count for pair, count in cells.items() if count} == {**large, (3, 70_000): 301}


def test_the_reader_agrees_with_the_package(text: str, tmp_path: Path) -> None:
    with small_store(tmp_path / "a.colloc") as store:
        expected = table_of(store, WINDOW)
        store.make_durable()
    _, read_pairs = _reader(text)
    cells: Counter[tuple[int, int]] = Counter()
    for columns in read_pairs(tmp_path / "a.colloc", 1):
        for x, y, ahead, back in zip(*(column.tolist() for column in columns), strict=True):
            cells[x, y] += ahead
            cells[y, x] += back
    assert {pair: count for pair, count in cells.items() if count} == expected


def test_every_table_is_described(text: str, tmp_path: Path) -> None:
    small_store(tmp_path / "a.colloc").close()
    with open_for_reading(tmp_path / "a.colloc") as store:
        tables = {name for (name,) in store.rows("SELECT name FROM sqlite_schema WHERE type = 'table'")}
        levels = store.value("PRAGMA journal_mode")
    described = set(re.findall(r"^\| `(\w+)` \|", text, re.MULTILINE))
    assert described == {name for name in tables if not name.startswith("sqlite_")}
    assert levels == "wal"
    assert f"0x{schema.APPLICATION_ID:X}" in text
    assert f"schema, {schema.SCHEMA_VERSION}." in text.replace("\n", " ")
