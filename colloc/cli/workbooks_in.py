"""Tables in XLSX files that users bring: the first worksheet, every cell as text."""

from __future__ import annotations

import importlib
import re
import zipfile
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from colloc.errors import DataError, MissingExtraError, NoInputError

LARGEST_UNPACKED = 512 * 2**20
"""Bytes of the unpacked file: more is refused before it is read."""
_ESCAPED = re.compile(r"_x([0-9A-Fa-f]{4})_")


def read_workbook(path: Path) -> Iterator[tuple[str, dict[str, str]]]:
    """Place (``FILE:ROW``) and cells by column of each row that holds anything.

    Raises
    ------
    DataError
        For a file that is no workbook, a formula, or a header with a name twice.
    MissingExtraError
        Where openpyxl is not installed.
    """
    try:
        # openpyxl reads XML through defusedxml where that is there.
        importlib.import_module("defusedxml")
        import openpyxl
    except ImportError as error:
        raise MissingExtraError("reading XLSX needs openpyxl and defusedxml: pip install 'colloc[sheets]'") from error
    _check_size(path)
    try:
        book = openpyxl.load_workbook(path, data_only=False)
    except Exception as error:
        raise DataError(f"{path}: cannot be read as XLSX ({error}); save it again, or as CSV") from error
    sheet = book.worksheets[0]
    rows = sheet.iter_rows()
    header = next(rows, ())
    names = [_text(cell, f"{path}:1") for cell in header]
    twice = sorted({name for name in names if name and names.count(name) > 1})
    if twice:
        raise DataError(f"{path}:1: the header names {', '.join(map(repr, twice))} twice; rename one")
    for number, row in enumerate(rows, 2):
        place = f"{path}:{number}"
        cells = {name: _text(cell, f"{place}, column {name}") for name, cell in zip(names, row, strict=True) if name}
        if any(cells.values()):
            yield place, cells


def _check_size(path: Path) -> None:
    try:
        with zipfile.ZipFile(path) as archive:
            size = sum(item.file_size for item in archive.infolist())
    except FileNotFoundError as error:
        raise NoInputError(f"{path}: no such file") from error
    except (OSError, zipfile.BadZipFile) as error:
        raise DataError(f"{path}: not an XLSX file ({error})") from error
    if size > LARGEST_UNPACKED:
        raise DataError(f"{path}: {size:,} bytes unpacked; a sheet of decisions has at most {LARGEST_UNPACKED:,}")


def _text(cell: Any, place: str) -> str:
    value = cell.value
    if value is None:
        return ""
    if cell.data_type == "f":
        raise DataError(f"{place}: a formula; write its text, with an apostrophe before it")
    if isinstance(value, bool):
        return str(value).upper()
    if isinstance(value, float) and value.is_integer():
        return str(int(value))
    # Characters that XML cannot hold are written _xHHHH_ (ECMA-376 part 1, 22.4.2.4).
    return _ESCAPED.sub(lambda match: chr(int(match[1], 16)), value) if isinstance(value, str) else str(value)
