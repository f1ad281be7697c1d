"""Answers as text: one writer a format, each taking an answer in one or many parts."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from itertools import compress, repeat
from operator import contains
from typing import TYPE_CHECKING, Any, BinaryIO, Protocol

from colloc.answers.plain import is_count
from colloc.errors import MissingExtraError
from colloc.exports.spreadsheets import defuse, defuse_all

if TYPE_CHECKING:
    from colloc.answers.columns import Columns


class Writer(Protocol):
    """Writes the parts of one answer, all with the same columns, to a stream of bytes."""

    def write(self, part: Columns) -> None: ...

    def close(self) -> None: ...


class TableWriter:
    """Aligned text for reading; later parts keep or widen the columns of the first."""

    def __init__(self, stream: BinaryIO, settings: Mapping[str, Any]) -> None:
        from colloc.answers.plain import Grid

        self._stream = stream
        self._make_grid = Grid
        self._grid: Grid | None = None

    def write(self, part: Columns) -> None:
        heading = self._grid is None
        if self._grid is None:
            self._grid = self._make_grid(part.names, [part.is_numeric(name) for name in part.names])
        lines = self._grid.lines([array.tolist() for array in part.data.values()], heading=heading)
        self._stream.write("".join(f"{line}\n" for line in lines).encode())

    def close(self) -> None:
        """Nothing is left to write."""


class DelimitedWriter:
    """CSV (RFC 4180 quoting, line feeds) or TSV, UTF-8, formulas defused, numbers in full precision.

    A whole count is written without a point even where halves beside it make its column one of floats.
    """

    def __init__(self, stream: BinaryIO, settings: Mapping[str, Any], *, delimiter: str) -> None:
        self._stream = stream
        self._delimiter = delimiter
        self._signs = f"{_QUOTE}\r\n{delimiter}"
        self._begun = False
        self._quick = False

    def write(self, part: Columns) -> None:
        from colloc.answers.rowtext import QUICK_ROWS

        if not self._begun:
            self._begun = True
            self._write_rows([self._quoted([defuse(name)]) for name in part.names])
        self._quick = self._quick or len(part) >= QUICK_ROWS
        for start in range(0, len(part), _ROWS_AT_ONCE):
            self._write_part(part[start : start + _ROWS_AT_ONCE])

    def _write_part(self, part: Columns) -> None:
        # Numbers need neither quotes nor guards.
        columns = [
            array if array.dtype.kind in "biuf" else self._quoted(_texts(array.tolist()))
            for array in part.data.values()
        ]
        if self._quick:
            from colloc.answers.rowtext import rows_as_text

            text = rows_as_text(columns, list(map(is_count, part.names)), self._delimiter)
            if text is not None:
                self._stream.write(text)
                return
        cells = zip(part.names, columns, strict=True)
        self._write_rows([column if isinstance(column, list) else _numbers(name, column) for name, column in cells])

    def _write_rows(self, columns: list[list[str]]) -> None:
        lines = map(self._delimiter.join, zip(*columns, strict=True))
        self._stream.write("".join([f"{line}\n" if line else '""\n' for line in lines]).encode())

    def _quoted(self, cells: list[str]) -> list[str]:
        # Not csv.writer: with line feeds as row ends it leaves a carriage return inside a cell unquoted.
        joined = "\0".join(cells)
        places = {
            place
            for sign in self._signs
            if sign in joined
            for place in compress(range(len(cells)), map(contains, cells, repeat(sign)))
        }
        if not places:
            return cells
        quoted = cells.copy()
        for place in places:
            quoted[place] = f'"{cells[place].replace(_QUOTE, _QUOTE * 2)}"'
        return quoted

    def close(self) -> None:
        """Nothing is left to write."""


_ROWS_AT_ONCE = 1 << 14
"""Their text stays in the processor's cache, or nearly."""
_QUOTE = '"'


def _texts(values: list[Any]) -> list[str]:
    """The values of a column of objects as written, texts guarded."""
    if {*map(type, values)} <= {str}:
        return defuse_all(values)
    # A mixed column: only its texts are guarded.
    return [defuse(value) if isinstance(value, str) else _cell(value) for value in values]


def _numbers(name: str, array: Any) -> list[str]:
    """The values of a column of numbers as written."""
    values = array.tolist()
    if array.dtype.kind == "f":
        texts = ["" if text == "nan" else text for text in map(str, values)]
        return [text.removesuffix(".0") for text in texts] if is_count(name) else texts
    return [_cell(value) for value in values] if array.dtype.kind == "b" else list(map(str, values))


def _cell(value: Any) -> str:
    if value is None or (isinstance(value, float) and math.isnan(value)):
        return ""
    if isinstance(value, bool):
        return "true" if value else "false"
    return json.dumps(value, ensure_ascii=False) if isinstance(value, list | dict) else str(value)


class JsonLinesWriter:
    """One object a line; a value that is not a number is null, infinities are "inf" and "-inf"."""

    def __init__(self, stream: BinaryIO, settings: Mapping[str, Any]) -> None:
        self._stream = stream

    def write(self, part: Columns) -> None:
        self._stream.write("".join(f"{_json(row)}\n" for row in part).encode())

    def close(self) -> None:
        """Nothing is left to write."""


class JsonWriter:
    """One object with ``settings`` and ``rows``."""

    def __init__(self, stream: BinaryIO, settings: Mapping[str, Any]) -> None:
        self._stream = stream
        self._begun = False
        stream.write(f'{{"settings": {json.dumps(dict(settings), ensure_ascii=False)},\n"rows": ['.encode())

    def write(self, part: Columns) -> None:
        rows = ",\n".join(map(_json, part))
        if not rows:
            return
        self._stream.write((",\n" if self._begun else "\n").encode() + rows.encode())
        self._begun = True

    def close(self) -> None:
        self._stream.write(b"\n]}\n")


def _json(row: dict[str, Any]) -> str:
    values = {name: _json_value(value) for name, value in row.items()}
    return json.dumps(values, ensure_ascii=False, allow_nan=False)


def _json_value(value: Any) -> Any:
    if isinstance(value, float) and not math.isfinite(value):
        return None if math.isnan(value) else ("inf" if value > 0 else "-inf")
    return value


class ParquetWriter:
    """Apache Parquet; the settings are in the schema's metadata."""

    def __init__(self, stream: BinaryIO, settings: Mapping[str, Any]) -> None:
        try:
            import pyarrow.parquet
        except ImportError as error:
            raise MissingExtraError("--format parquet needs pyarrow: pip install 'colloc[tables]'") from error
        self._parquet = pyarrow.parquet
        self._stream = stream
        self._open: Any = None

    def write(self, part: Columns) -> None:
        table = part.to_arrow()
        if self._open is None:
            self._open = self._parquet.ParquetWriter(self._stream, table.schema)
        self._open.write_table(table)

    def close(self) -> None:
        if self._open is not None:
            self._open.close()


def make_writer(file_format: str, stream: BinaryIO, settings: Mapping[str, Any]) -> Writer:
    """The writer of one of the formats of ``--format``."""
    if file_format in ("csv", "tsv"):
        return DelimitedWriter(stream, settings, delimiter="," if file_format == "csv" else "\t")
    writers: dict[str, type[Any]] = {
        "table": TableWriter,
        "jsonl": JsonLinesWriter,
        "json": JsonWriter,
        "parquet": ParquetWriter,
    }
    writer: Writer = writers[file_format](stream, settings)
    return writer
