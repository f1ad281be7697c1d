"""Answers as text: one writer a format, each taking an answer in one or many parts."""

from __future__ import annotations

import json
import math
import re
from collections.abc import Mapping
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
        self._special = re.compile(rf'["\r\n{delimiter}]').search
        self._begun = False

    def write(self, part: Columns) -> None:
        heading = [] if self._begun else [[defuse(name)] for name in part.names]
        self._begun = True
        columns = [
            defuse_all(values) if text else values for values, text in map(_cells, part.names, part.data.values())
        ]
        if heading:
            columns = [head + column for head, column in zip(heading, columns, strict=True)]
        lines = map(self._delimiter.join, zip(*map(self._quoted, columns), strict=True))
        self._stream.write("".join([f"{line}\n" if line else '""\n' for line in lines]).encode())

    def _quoted(self, cells: list[str]) -> list[str]:
        # Not csv.writer: with line feeds as row ends it leaves a carriage return inside a cell unquoted.
        if not self._special("\0".join(cells)):
            return cells
        return [f'"{cell.replace(_QUOTE, _QUOTE * 2)}"' if self._special(cell) else cell for cell in cells]

    def close(self) -> None:
        """Nothing is left to write."""


_QUOTE = '"'


def _cells(name: str, array: Any) -> tuple[list[str], bool]:
    """A numpy column's values as written, and whether they are text that might have to be defused."""
    values = array.tolist()
    kind = array.dtype.kind
    if kind == "O":
        if all(isinstance(value, str) for value in values):
            return values, True
        # A mixed column: only its texts are defused.
        return [defuse(value) if isinstance(value, str) else _cell(value) for value in values], False
    if kind == "f":
        texts = ["" if text == "nan" else text for text in map(str, values)]
        return [text.removesuffix(".0") for text in texts] if is_count(name) else texts, False
    return [_cell(value) for value in values] if kind == "b" else list(map(str, values)), False


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
