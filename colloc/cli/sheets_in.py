"""Filled-in sheets and lists of decisions, as they come back."""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

from colloc.cli.tables_in import read_rows
from colloc.errors import DataError

if TYPE_CHECKING:
    from colloc.answers.judging.sheets import SheetRow


def is_json_lines(path: Path) -> bool:
    """Whether a file holds decisions as JSON Lines, going by its ending."""
    return path.suffix.lower() in (".jsonl", ".ndjson")


def decision_records(path: Path) -> Iterator[tuple[str, dict[str, Any]]]:
    """Each line's object with its place."""
    for rows in read_rows(path, "jsonl"):
        for number, line in enumerate(rows.lines):
            yield f"{rows.name}:{line}", {name: values[number] for name, values in rows.columns.items()}


def sheet_rows(path: Path) -> Iterator[SheetRow]:
    """The rows of a CSV, TSV or XLSX file, every cell as text."""
    from colloc.answers.judging.sheets import SheetRow

    if path.suffix.lower() == ".xlsx":
        from colloc.cli.workbooks_in import read_workbook

        yield from (SheetRow(place, cells) for place, cells in read_workbook(path))
        return
    for rows in read_rows(path):
        for number, line in enumerate(rows.lines):
            cells = {name: _text(values[number], f"{rows.name}:{line}") for name, values in rows.columns.items()}
            yield SheetRow(f"{rows.name}:{line}", cells)


def _text(value: Any, place: str) -> str:
    if isinstance(value, str) or value is None:
        return value or ""
    if isinstance(value, list | dict):
        raise DataError(f"{place}: a cell of a sheet is text, not {json.dumps(value)[:40]}")
    return str(value)
