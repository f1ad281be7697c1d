"""Parquet and Arrow (IPC files and streams, Feather 2): one document a row.

The text column becomes the text, the others metadata: dates and times as ISO
8601, decimals as digits, nested values as JSON text. Tables are read a batch
of rows at a time. A Parquet file may say a long string once and mean it in
every row; how many rows make a batch goes by how large its dictionaries are.
"""

from __future__ import annotations

import datetime
import decimal
import json
import math
import os
import tempfile
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any

from colloc.errors import DataError, MissingExtraError
from colloc.records import Document, MetaValue
from colloc.text.lines import MOST_COLUMNS, exceeds, record_document
from colloc.text.opening import STANDARD_INPUT, Opened

LARGEST_FOOTER = 2**25
"""Bytes of the part that describes columns; it takes some thirty times as much memory."""
ROWS = 1024
"""Rows read at once, at most."""
LARGEST_BATCH = 2**29
"""Bytes that the strings of a batch can come to, whatever the file does."""
STRINGS_AT_ONCE = 2**22
"""Bytes of rows that are made values of Python at once, about."""
_IN_MEMORY = 2**26
_LARGEST_INTEGER = 2**63 - 1
_PARQUET = b"PAR1"
_FILE = b"ARROW1"

Columns = list[tuple[str, Callable[[int], Any]]]
"""Name and value of each column at a row."""


def read(opened: Opened, skip: int) -> Iterator[Document]:
    """One document for each row from record ``skip`` on.

    Raises
    ------
    DataError
        ``file: row n: ...`` for a missing text column, a row without text, values that are no metadata,
        and for damaged files.
    MissingExtraError
        Without pyarrow.
    """
    try:
        import pyarrow as pa
    except ImportError as error:
        raise MissingExtraError("reading Parquet and Arrow needs pyarrow: pip install 'colloc[tables]'") from error
    with _seekable(opened) as file:
        try:
            yield from _documents(opened, file, skip)
        except (pa.ArrowException, OSError, EOFError, ValueError, MemoryError) as error:
            reason = ascii(str(error).partition("\n")[0][:200])[1:-1] or type(error).__name__
            raise opened.error(f"damaged, or no {opened.format} file: {reason}; get the file again") from error


@contextmanager
def _seekable(opened: Opened) -> Iterator[Any]:
    """The file itself, or a temporary copy where it is packed or comes through a pipe."""
    if opened.path != STANDARD_INPUT and not opened.is_packed_by_name and os.path.isfile(opened.path):
        import pyarrow as pa

        with pa.OSFile(opened.path) as file:
            yield file
        return
    with tempfile.SpooledTemporaryFile(_IN_MEMORY) as copy:
        for chunk in opened.chunks():
            copy.write(chunk)
        copy.seek(0)
        yield copy


def _documents(opened: Opened, file: Any, skip: int) -> Iterator[Document]:
    settings = opened.settings
    record = skip
    characters = 0
    for schema, batch in _bounded(_batches(opened, file, skip), skip):
        if record == skip:
            _check_columns(opened, schema)
        columns = _columns(batch)
        names = [name for name, _ in columns]
        text_of = columns[names.index(settings.text_column)][1]
        id_column = settings.id_column or "id"
        others = [(name, value) for name, value in columns if name not in (settings.text_column, id_column)]
        identifier_of = columns[names.index(id_column)][1] if id_column in names else None
        for row in range(batch.num_rows):
            text = text_of(row)
            if not isinstance(text, str):
                raise _wrong(opened, record, f"column {settings.text_column!r} holds no text; leave the row out")
            if exceeds(text, settings.max_record):
                raise _wrong(opened, record, f"more than {settings.max_record:,} bytes (max_record)")
            characters += len(text)
            if characters > settings.max_unpacked:
                raise opened.error(f"more than the {settings.max_unpacked:,} characters allowed (max_unpacked)")
            identifier = None if identifier_of is None else _value(opened, record, id_column, identifier_of(row))
            if identifier in (None, "") and settings.id_column:
                raise _wrong(opened, record, f"column {id_column!r} holds no identifier; give each row one")
            metadata = {name: _value(opened, record, name, value(row)) for name, value in others}
            yield record_document(opened, record, text, None if identifier == "" else identifier, metadata)
            record += 1


def _bounded(batches: Iterator[tuple[Any, int, Any]], skip: int) -> Iterator[tuple[Any, Any]]:
    """Schema and rows from ``skip`` on, a few at a time, so that not all of a batch are Python's strings at once."""
    import pyarrow as pa

    for schema, first, batch in batches:
        begin = max(skip - first, 0)
        rows = max(batch.num_rows * STRINGS_AT_ONCE // max(batch.nbytes, 1), 1)
        if any(pa.types.is_dictionary(column.type) for column in batch.columns):
            rows = max(batch.num_rows, 1)  # their strings are made once for all rows
        for at in range(begin, batch.num_rows, rows):
            yield schema, batch.slice(at, rows)


def _wrong(opened: Opened, record: int, message: str) -> DataError:
    return opened.error(f"row {record + 1}: {message}")


def _check_columns(opened: Opened, schema: Any) -> None:
    import pyarrow as pa

    settings = opened.settings
    names = schema.names
    if settings.text_column not in names:
        listed = ", ".join(map(repr, names[:10])) or "none"
        raise opened.error(f"no column {settings.text_column!r} (columns: {listed}); name the text column")
    if len(set(names)) < len(names):
        raise opened.error(f"column {next(n for n in names if names.count(n) > 1)!r} occurs twice; rename one")
    kind = schema.field(settings.text_column).type
    kind = kind.value_type if pa.types.is_dictionary(kind) else kind
    if not (pa.types.is_string(kind) or pa.types.is_large_string(kind) or pa.types.is_string_view(kind)):
        raise opened.error(f"column {settings.text_column!r} holds {kind}, not text; name the text column")


def _batches(opened: Opened, file: Any, skip: int) -> Iterator[tuple[Any, int, Any]]:
    """Schema, number of the first row, and batch; batches that are wholly skipped are left out."""
    head = file.read(8)
    _check_footer(opened, file, head)
    if head.startswith(_PARQUET):
        yield from _parquet_batches(opened, file, skip)
    elif opened.format == "parquet":
        raise opened.error("no Parquet file: it does not begin with PAR1; get the file again")
    else:
        yield from _arrow_batches(opened, file, skip, head.startswith(_FILE))


def _check_footer(opened: Opened, file: Any, head: bytes) -> None:
    """Refuse a description of columns that would fill the memory; leaves the file at its beginning.

    Its length stands before the mark at the end (Parquet: 4 bytes and PAR1; Arrow: 4 bytes and ARROW1), in an
    Arrow stream after the first 4 bytes.
    """
    size = file.seek(0, 2)
    if head.startswith((_PARQUET, _FILE)):
        file.seek(max(size - (8 if head.startswith(_PARQUET) else 10), 0))
        length = int.from_bytes(file.read(4), "little")
    else:
        length = int.from_bytes(head[4:8], "little")
    file.seek(0)
    if LARGEST_FOOTER < length < size:
        raise opened.error(f"describes its columns in {length:,} bytes, more than {LARGEST_FOOTER:,}: leave some out")


def _parquet_batches(opened: Opened, file: Any, skip: int) -> Iterator[tuple[Any, int, Any]]:
    import pyarrow.parquet as pq

    table = pq.ParquetFile(file, pre_buffer=False, buffer_size=2**20)
    schema = table.schema_arrow
    _check_width(opened, schema)
    rows = table.metadata.num_rows
    first = 0
    for number in range(table.num_row_groups):
        group = table.metadata.row_group(number)
        if first + group.num_rows > skip:
            at = first
            for batch in table.iter_batches(_rows_at_once(file, group), row_groups=[number], use_threads=False):
                opened.say_share(at / max(rows, 1))
                if at + batch.num_rows > skip:
                    yield schema, at, batch
                at += batch.num_rows
        first += group.num_rows


def _rows_at_once(file: Any, group: Any) -> int:
    """How many rows of a row group are read at once: as many as cannot become larger than `LARGEST_BATCH`."""
    bytes_a_row = 1
    for number in range(group.num_columns):
        column = group.column(number)
        if column.physical_type != "BYTE_ARRAY":
            continue
        # A string is at most as long as what it is copied from: an entry of the dictionary, or the string before it.
        longest = 0
        if "DELTA_BYTE_ARRAY" in column.encodings:
            longest = column.total_uncompressed_size
        elif column.has_dictionary_page:
            longest = min(_page_size(file, column.dictionary_page_offset), column.total_uncompressed_size)
        bytes_a_row += longest * max(column.num_values // max(group.num_rows, 1), 1)
    return min(max(LARGEST_BATCH // bytes_a_row, 1), ROWS)


def _page_size(file: Any, offset: int) -> int:
    """Unpacked size of the page at an offset.

    Source: parquet.thrift, struct PageHeader (fields 1 and 2 are i32), in Thrift's compact protocol: a byte that
    tells field and type, then a zigzag number in groups of seven bits.
    """
    file.seek(offset)
    head = file.read(16)
    position, value = 1, 0
    for _ in range(2):
        value = shift = 0
        while position < len(head):
            byte = head[position]
            value |= (byte & 0x7F) << shift
            shift += 7
            position += 1
            if byte < 0x80:
                break
        position += 1
    return value >> 1


def _arrow_batches(opened: Opened, file: Any, skip: int, seekable: bool) -> Iterator[tuple[Any, int, Any]]:
    import pyarrow as pa

    table: Any
    if seekable:
        table = pa.ipc.open_file(file)
        total = max(table.num_record_batches, 1)
        batches = ((number / total, table.get_batch(number)) for number in range(table.num_record_batches))
    else:
        table = pa.ipc.open_stream(file)
        batches = ((0.0, batch) for batch in table)
    _check_width(opened, table.schema)
    first = 0
    for share, batch in batches:
        opened.say_share(share)
        batch.validate(full=True)
        if first + batch.num_rows > skip:
            yield table.schema, first, batch
        first += batch.num_rows


def _check_width(opened: Opened, schema: Any) -> None:
    if len(schema) > MOST_COLUMNS:
        raise opened.error(f"{len(schema):,} columns, more than {MOST_COLUMNS:,}: leave some out")


def _columns(batch: Any) -> Columns:
    import pyarrow as pa

    def column(array: Any) -> Callable[[int], Any]:
        if not pa.types.is_dictionary(array.type):
            values: list[Any] = array.to_pylist()
            return values.__getitem__
        texts = array.dictionary.to_pylist()
        numbers = array.indices.to_pylist()
        return lambda row: None if numbers[row] is None else texts[numbers[row]]

    return [(name, column(array)) for name, array in zip(batch.schema.names, batch.columns, strict=True)]


def _value(opened: Opened, record: int, name: str, value: Any) -> MetaValue:
    """A column's value as metadata."""
    if value is None or isinstance(value, str | bool):
        return value
    if isinstance(value, int):
        return value if abs(value) <= _LARGEST_INTEGER else str(value)
    if isinstance(value, float):
        # Tables write a missing number as NaN.
        return None if math.isnan(value) else value if math.isfinite(value) else str(value)
    if isinstance(value, datetime.date | datetime.time):
        return value.isoformat()
    if isinstance(value, decimal.Decimal | datetime.timedelta):
        return str(value)
    try:
        return json.dumps(value, ensure_ascii=False, default=str, allow_nan=False)
    except (TypeError, ValueError, RecursionError) as error:
        raise _wrong(opened, record, f"column {name!r} holds what cannot be kept: {error}; leave it out") from error
