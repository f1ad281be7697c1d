"""Tables in XLSX files that users bring: the first worksheet, every cell as text, to the character.

The file is a ZIP archive of XML parts (ECMA-376): the workbook names its sheets, whose
cells hold numbers, texts of their own, or places in a list of shared texts.
"""

from __future__ import annotations

import posixpath
import re
import zipfile
from collections.abc import Iterator
from pathlib import Path
from xml.etree import ElementTree

from colloc.errors import DataError, NoInputError

LARGEST_PART = 256 * 2**20
"""Bytes of one unpacked part: more is refused before it is read."""
_MAIN = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"
_RELATION = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}id"
_ESCAPED = re.compile(r"_x([0-9A-Fa-f]{4})_")


def read_workbook(path: Path) -> Iterator[tuple[str, dict[str, str]]]:
    """Place (``FILE:ROW``) and cells by column of each row that holds anything.

    Raises
    ------
    DataError
        For a file that is no workbook, a formula, or a header with a name twice.
    """
    try:
        with zipfile.ZipFile(path) as archive:
            shared = _shared_texts(archive, path)
            rows = list(_rows(_part(archive, _first_sheet(archive, path), path), shared, path))
    except FileNotFoundError as error:
        raise NoInputError(f"{path}: no such file") from error
    except (OSError, zipfile.BadZipFile, KeyError, ElementTree.ParseError, ValueError, IndexError) as error:
        raise DataError(f"{path}: not an XLSX file ({error}); save it again, or as CSV") from error
    header = rows[0][1] if rows else {}
    names = {column: name for column, name in header.items() if name}
    twice = sorted({name for name in names.values() if list(names.values()).count(name) > 1})
    if twice:
        raise DataError(f"{path}:1: the header names {', '.join(map(repr, twice))} twice; rename one")
    for number, cells in rows[1:]:
        named = {name: cells.get(column, "") for column, name in names.items()}
        if any(named.values()):
            yield f"{path}:{number}", named


def _part(archive: zipfile.ZipFile, name: str, path: Path) -> ElementTree.Element:
    size = archive.getinfo(name).file_size
    if size > LARGEST_PART:
        raise DataError(f"{path}: {size:,} bytes unpacked; a sheet of decisions has at most {LARGEST_PART:,}")
    data = archive.read(name)
    # No part of the format declares entities; without UTF-16 the declaration cannot hide.
    if b"<!" in data.replace(b"<!--", b"") or b"\0" in data:
        raise DataError(f"{path}: holds XML declarations that no XLSX file needs; save it again, or as CSV")
    return ElementTree.fromstring(data)


def _first_sheet(archive: zipfile.ZipFile, path: Path) -> str:
    book = _part(archive, "xl/workbook.xml", path)
    sheet = next(book.iter(f"{_MAIN}sheet"), None)
    if sheet is None:
        raise DataError(f"{path}: a workbook without a sheet")
    for relation in _part(archive, "xl/_rels/workbook.xml.rels", path):
        if relation.get("Id") == sheet.get(_RELATION):
            target = relation.get("Target", "")
            return target[1:] if target.startswith("/") else posixpath.normpath(f"xl/{target}")
    raise DataError(f"{path}: a workbook that lacks its first sheet")


def _shared_texts(archive: zipfile.ZipFile, path: Path) -> list[str]:
    if "xl/sharedStrings.xml" not in archive.namelist():
        return []
    return [_joined(item) for item in _part(archive, "xl/sharedStrings.xml", path).iter(f"{_MAIN}si")]


def _joined(item: ElementTree.Element) -> str:
    """The runs of a text; readings beside it (rPh) are no part of it."""
    direct = [part for part in item if part.tag in (f"{_MAIN}t", f"{_MAIN}r")]
    texts = [part if part.tag == f"{_MAIN}t" else part.find(f"{_MAIN}t") for part in direct]
    whole = "".join(part.text or "" for part in texts if part is not None)
    # Characters that XML cannot hold are written _xHHHH_, and so is the underscore before what looks like that
    # (ECMA-376 part 1, 22.4.2.4).
    return _ESCAPED.sub(lambda match: chr(int(match[1], 16)), whole)


def _rows(sheet: ElementTree.Element, shared: list[str], path: Path) -> Iterator[tuple[int, dict[int, str]]]:
    number = 0
    for row in sheet.iter(f"{_MAIN}row"):
        number = int(row.get("r", number + 1))
        cells: dict[int, str] = {}
        column = 0
        for cell in row.iter(f"{_MAIN}c"):
            column = _column(cell.get("r"), column + 1)
            cells[column] = _text(cell, shared, f"{path}:{number}, cell {cell.get('r', column)}")
        yield number, cells


def _column(reference: str | None, following: int) -> int:
    """``AB12`` as 28."""
    if reference is None:
        return following
    column = 0
    for letter in reference.rstrip("0123456789"):
        column = column * 26 + ord(letter) - ord("A") + 1
    return column


def _text(cell: ElementTree.Element, shared: list[str], place: str) -> str:
    if cell.find(f"{_MAIN}f") is not None:
        raise DataError(f"{place}: a formula; write its text, with an apostrophe before it")
    kind = cell.get("t", "n")
    if kind == "inlineStr":
        inline = cell.find(f"{_MAIN}is")
        return "" if inline is None else _joined(inline)
    value = cell.findtext(f"{_MAIN}v") or ""
    if kind == "s":
        return shared[int(value)]
    if kind == "b":
        return "TRUE" if value == "1" else "FALSE"
    return value
