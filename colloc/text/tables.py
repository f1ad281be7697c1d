"""Rows of a side table of metadata: CSV, TSV or JSON Lines, keyed by the first column."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from colloc.records import MetaValue
from colloc.text import jsonlines
from colloc.text.delimited import named_rows
from colloc.text.metadata import typed
from colloc.text.opening import Opened


def read_rows(opened: Opened) -> Iterator[tuple[int, str, Mapping[str, MetaValue]]]:
    """Line number, key and metadata of each row.

    Raises
    ------
    DataError
        For another format, a row without key, and all that the formats' readers refuse.
    """
    if opened.format == "jsonl":
        for line, value in jsonlines.objects(opened):
            key = next(iter(value.values()), None)
            if not isinstance(key, str) or not key:
                raise opened.error("no file name in the first column; put it there", line)
            columns = list(value.items())[1:]
            yield line, key, {name: jsonlines.metadata(opened, line, name, item) for name, item in columns}
    elif opened.format in ("csv", "tsv"):
        header, rows = named_rows(opened, opened.format == "tsv")
        for line, row in rows:
            if not row[0]:
                raise opened.error("no file name in the first column; put it there", line)
            yield line, row[0], {name: typed(item) for name, item in zip(header[1:], row[1:], strict=True)}
    else:
        raise opened.error("a metadata table is a .csv, .tsv or .jsonl file; save it as one")
