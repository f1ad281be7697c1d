"""Tables and lists that users bring: CSV, TSV and JSON Lines, read a stretch at a time."""

from __future__ import annotations

import csv
import json
import sys
from collections import deque
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from itertools import compress, islice, repeat
from operator import contains
from pathlib import Path
from typing import TYPE_CHECKING, Any, BinaryIO, Literal

from colloc.errors import DataError, NoInputError
from colloc.exports.spreadsheets import restore, restore_all

if TYPE_CHECKING:
    from colloc.answers.joining.listed import Expression

TableFormat = Literal["auto", "csv", "tsv", "jsonl"]
ROWS_A_PART = 1 << 18
"""Each part of a list of pairs is scored with one walk through the table: large parts need few."""
LONGEST_FIELD = 1 << 24
"""Characters of one CSV field; the library's own limit is too small for text columns."""


@dataclass(frozen=True, slots=True)
class Rows:
    """A stretch of a table.

    Attributes
    ----------
    name : str
        The file, as errors name it.
    columns : dict of str to list
        Values by column: text from CSV and TSV, JSON values from JSON Lines (None where a row has no such key).
    lines : list of int
        The line of the file on which each row ends.
    """

    name: str
    columns: dict[str, list[Any]]
    lines: list[int]

    def __len__(self) -> int:
        return len(self.lines)


def read_rows(path: Path, file_format: TableFormat = "auto") -> Iterator[Rows]:
    """Stretches of a table; ``-`` is standard input; spreadsheet guards are taken off.

    ``auto`` goes by the file's ending, else by its first line: an opening brace is
    JSON Lines, a tab is TSV, anything else CSV. A table with a header and no rows
    gives one empty stretch.

    Raises
    ------
    NoInputError
        Where the file is missing or empty.
    DataError
        Where a line cannot be read; the message names file and line.
    """
    with opened_input(path) as stream:
        name = "standard input" if str(path) == "-" else str(path)
        lines = _Lines(stream, name)
        first = lines.peek()
        if not first.strip():
            raise NoInputError(f"{name}: the table is empty; it needs a header line and rows")
        chosen = _format_of(path, first) if file_format == "auto" else file_format
        if chosen == "jsonl":
            yield from _json_rows(lines)
        else:
            yield from _delimited_rows(lines, "\t" if chosen == "tsv" else _separator(first))


def read_lines(path: Path) -> list[str]:
    """Lines of a UTF-8 text file without their ends, blank ones left out."""
    with opened_input(path) as stream:
        stripped = (line.strip() for line in _Lines(stream, str(path)))
        return [line for line in stripped if line]


def judged_rows(path: Path) -> list[tuple[str, str, float]]:
    """Word pairs with people's judgements: two words and a number a line.

    Raises
    ------
    NoInputError, DataError
        Where the file is missing, or a line is not of this form.
    """
    from colloc.answers.spaces.judged import judged_pairs

    with opened_input(path) as stream:
        judged = judged_pairs(str(path), _Lines(stream, str(path)))
    return [(*pair, score) for pair, score in zip(judged.pairs, judged.scores.tolist(), strict=True)]


def listed_expressions(path: Path) -> list[Expression]:
    """Expressions of a file, one a line; a score may follow after a tab.

    Raises
    ------
    NoInputError, DataError
        Where the file is missing, or a line is not of this form.
    """
    from colloc.answers.joining.listed import expressions_of

    with opened_input(path) as stream:
        return expressions_of(str(path), _Lines(stream, str(path)))


@contextmanager
def opened_input(path: Path) -> Iterator[BinaryIO]:
    """The bytes of a file, or of standard input for ``-``; NoInputError where it cannot be read."""
    if str(path) == "-":
        yield sys.stdin.buffer
        return
    try:
        stream = path.open("rb")
    except FileNotFoundError as error:
        raise NoInputError(f"{path}: no such file") from error
    except OSError as error:
        raise NoInputError(f"{path}: cannot be read: {error.strerror}") from error
    with stream:
        yield stream


class _Lines:
    """Decoded lines with their ends, counted, a byte order mark taken off."""

    def __init__(self, stream: BinaryIO, name: str) -> None:
        self.name = name
        self.number = 0
        self._stream = stream
        self._ahead: str | None = None
        self._waiting: deque[bytes] = deque()

    @property
    def waiting(self) -> bool:
        """Whether lines of a stretch are still to be read."""
        return bool(self._waiting)

    def stretch(self, count: int) -> list[bytes]:
        """The next lines as they are; they stay to be read, or are passed over."""
        self._waiting.extend(islice(self._stream, count - len(self._waiting)))
        return list(self._waiting)

    def pass_over(self) -> None:
        """Take the lines of the last stretch as read."""
        self.number += len(self._waiting)
        self._waiting.clear()

    def peek(self) -> str:
        self._ahead = self._decode(self._stream.readline()).removeprefix("\ufeff")
        return self._ahead

    def __iter__(self) -> Iterator[str]:
        while True:
            line, self._ahead = self._ahead, None
            if line is None:
                line = self._decode(self._waiting.popleft() if self._waiting else self._stream.readline())
            if not line:
                return
            self.number += 1
            yield line

    def _decode(self, line: bytes) -> str:
        try:
            return line.decode("utf-8")
        except UnicodeDecodeError as error:
            place = f"{self.name}:{self.number + 1}"
            raise DataError(
                f"{place}: not UTF-8 (byte {error.start + 1} of the line); convert the file first"
            ) from error


def _format_of(path: Path, first_line: str) -> TableFormat:
    ending: dict[str, TableFormat] = {".csv": "csv", ".tsv": "tsv", ".jsonl": "jsonl", ".ndjson": "jsonl"}
    if path.suffix.lower() in ending:
        return ending[path.suffix.lower()]
    if first_line.lstrip().startswith("{"):
        return "jsonl"
    return "tsv" if "\t" in first_line else "csv"


def _separator(first_line: str) -> str:
    """Spreadsheets write semicolons where the comma is the decimal sign."""
    return ";" if ";" in first_line and "," not in first_line else ","


def _delimited_rows(lines: _Lines, delimiter: str) -> Iterator[Rows]:
    csv.field_size_limit(LONGEST_FIELD)
    reader = csv.reader(lines, delimiter=delimiter, strict=True)
    names: list[str] = []
    rows: list[list[str]] = []
    ends: list[int] = []
    given = False
    try:
        names = [restore(name.strip()) for name in next(reader)]
        _check_names(names, lines)
        while stretch := lines.stretch(ROWS_A_PART):
            cells = _plain_cells(stretch, delimiter, len(names))
            if cells is not None:
                begin = lines.number + 1
                lines.pass_over()
                given = True
                columns = {name: restore_all(cells[place :: len(names)]) for place, name in enumerate(names)}
                yield Rows(lines.name, columns, list(range(begin, lines.number + 1)))
                continue
            for row in reader:
                if row and len(row) != len(names):
                    raise DataError(
                        f"{lines.name}:{lines.number}: {len(row)} cells where the header has {len(names)}; "
                        f"quote cells that hold the separator"
                    )
                if row:
                    rows.append(row)
                    ends.append(lines.number)
                if not lines.waiting:
                    break
            if rows:
                given = True
                yield _transposed(lines.name, names, rows, ends)
                rows, ends = [], []
    except csv.Error as error:
        raise DataError(f"{lines.name}:{lines.number}: not a table of the expected form: {error}") from error
    if not given:
        yield _transposed(lines.name, names, [], [])


def _plain_cells(stretch: list[bytes], delimiter: str, width: int) -> list[str] | None:
    """All cells of some lines, row by row, where every line is a row of its own with its cells; else None.

    Several times as fast as the library's reader, which takes what is not so plain, and the few lines with quotes.
    """
    quoted = list(compress(range(len(stretch)), map(contains, stretch, repeat(b'"'))))
    if len(quoted) > _FEW:
        return None
    plain = stretch
    if quoted:
        plain = stretch.copy()
        for place in reversed(quoted):
            del plain[place]
    data = b"".join(plain).replace(b"\r\n", b"\n")
    if b"\r" in data or b"\n\n" in data or data.startswith(b"\n"):
        return None
    if {*map(bytes.count, plain, repeat(delimiter.encode()))} - {width - 1}:
        return None
    try:
        text = data.decode("utf-8")
        rows = [_row_alone(stretch[place].decode("utf-8"), delimiter) for place in quoted]
    except (UnicodeDecodeError, csv.Error):
        return None  # the line is named where it is read alone, or goes on in the next
    if any(len(row) != width for row in rows):
        return None
    cells = text.removesuffix("\n").replace("\n", delimiter).split(delimiter) if plain else []
    for place, row in zip(quoted, rows, strict=True):
        cells[place * width : place * width] = row
    return cells


_FEW = 256
"""Lines with quotes of a stretch that are read one by one."""


def _row_alone(line: str, delimiter: str) -> list[str]:
    """The cells of one line; csv.Error where a quoted cell goes on in the next."""
    rows = list(csv.reader([line], delimiter=delimiter, strict=True))
    return rows[0] if len(rows) == 1 else []


def _check_names(names: list[str], lines: _Lines) -> None:
    twice = sorted({name for name in names if names.count(name) > 1})
    if twice:
        raise DataError(f"{lines.name}:1: the header names {', '.join(map(repr, twice))} twice; rename one")


def _transposed(name: str, names: list[str], rows: list[list[str]], ends: list[int]) -> Rows:
    columns = zip(*rows, strict=True) if rows else ((),) * len(names)
    return Rows(name, {column: restore_all(list(values)) for column, values in zip(names, columns, strict=True)}, ends)


def _json_rows(lines: _Lines) -> Iterator[Rows]:
    names: list[str] = []
    rows: list[dict[str, Any]] = []
    ends: list[int] = []
    for line in lines:
        if not line.strip():
            continue
        row = _json_object(line, lines)
        if not names:
            names = list(row)
        elif row.keys() - set(names):
            extra = ", ".join(sorted(map(repr, row.keys() - set(names))))
            raise DataError(f"{lines.name}:{lines.number}: {extra} is not in the first line; give every line all keys")
        rows.append(row)
        ends.append(lines.number)
        if len(rows) == ROWS_A_PART:
            yield _gathered(lines.name, names, rows, ends)
            rows, ends = [], []
    yield _gathered(lines.name, names, rows, ends)


def _json_object(line: str, lines: _Lines) -> dict[str, Any]:
    place = f"{lines.name}:{lines.number}"
    try:
        row = json.loads(line)
    except (json.JSONDecodeError, RecursionError) as error:
        reason = (
            f"{error.msg} at column {error.colno}" if isinstance(error, json.JSONDecodeError) else "nested too deeply"
        )
        raise DataError(f"{place}: not a line of JSON: {reason}") from error
    if not isinstance(row, dict):
        raise DataError(f"{place}: a JSON object is needed on each line, not {type(row).__name__}")
    return row


def _gathered(name: str, names: list[str], rows: list[dict[str, Any]], ends: list[int]) -> Rows:
    return Rows(name, {column: [row.get(column) for row in rows] for column in names}, ends)
