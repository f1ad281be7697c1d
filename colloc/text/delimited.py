"""CSV and TSV with a header line: one document a row.

CSV is RFC 4180 (comma, fields quoted by ``"``, quotes doubled, line ends
allowed inside quotes); LF and CR are taken as line ends beside CR LF. TSV is
IANA's text/tab-separated-values, which knows no quoting: a quote is a
character like any other.
"""

from __future__ import annotations

import csv
from collections import Counter
from collections.abc import Iterator

from colloc.records import Document
from colloc.text.lines import byte_length, record_document, too_long, universal_lines
from colloc.text.metadata import typed
from colloc.text.opening import Opened


class _Rows:
    """Rows of fields with the number of the line where each begins."""

    def __init__(self, opened: Opened, tabs: bool) -> None:
        limit = opened.settings.max_record
        # The module's own limit is global and by default smaller than a chapter; the one that counts is kept below.
        csv.field_size_limit(max(csv.field_size_limit(), limit))
        self._opened = opened
        self._limit = limit
        self._fed = 0
        self._lines = 0
        lines = self._counted()
        self._reader = (
            csv.reader(lines, delimiter="\t", quoting=csv.QUOTE_NONE, strict=True)
            if tabs
            else csv.reader(lines, strict=True)
        )

    def _counted(self) -> Iterator[str]:
        for line in universal_lines(self._opened):
            self._lines += 1
            self._fed += byte_length(line)
            if self._fed > self._limit:
                raise too_long(self._opened, self._lines)
            yield line

    def __iter__(self) -> Iterator[tuple[int, list[str]]]:
        while True:
            first_line = self._lines + 1
            self._fed = 0
            try:
                row = next(self._reader)
            except StopIteration:
                return
            except csv.Error as error:
                where = f" in the record that begins in line {first_line}" if first_line < self._lines else ""
                raise self._opened.error(
                    f"wrong quoting or separators ({error}){where}; correct it", self._lines
                ) from error
            if row:
                yield first_line, row


def named_rows(opened: Opened, tabs: bool) -> tuple[list[str], Iterator[tuple[int, list[str]]]]:
    """The header and the rows below it, each as long as the header, with the line where it begins.

    Raises
    ------
    DataError
        No header, a column without name or named twice, a row of another length, wrong quoting, too long a record.
    """
    rows = iter(_Rows(opened, tabs))
    line, header = next(rows, (1, []))
    if not header:
        raise opened.error("empty: a first line with the names of the columns was expected; add it")
    for name, times in Counter(header).items():
        if times > 1:
            raise opened.error(f"column {name!r} occurs {times} times in the first line; rename one", line)
        if not name.strip():
            raise opened.error("a column has no name in the first line; name it", line)
    return header, _checked(opened, rows, len(header))


def _checked(opened: Opened, rows: Iterator[tuple[int, list[str]]], width: int) -> Iterator[tuple[int, list[str]]]:
    for line, row in rows:
        if len(row) != width:
            raise opened.error(f"{len(row)} fields where the first line names {width} columns; correct the row", line)
        yield line, row


def read(opened: Opened, skip: int) -> Iterator[Document]:
    """One document for each row from record ``skip`` on; canonical numbers in other columns become numbers.

    Raises
    ------
    DataError
        As `named_rows`, and for a missing text or identifier column.
    """
    settings = opened.settings
    header, rows = named_rows(opened, opened.format == "tsv")
    text_at = _column(opened, header, settings.text_column, "text")
    id_column = settings.id_column or ("id" if "id" in header else None)
    id_at = None if id_column is None else _column(opened, header, id_column, "identifier")
    others = [(at, name) for at, name in enumerate(header) if at not in (text_at, id_at)]
    for record, (line, row) in enumerate(rows):
        if record < skip:
            continue
        identifier = None if id_at is None else row[id_at] or None
        if settings.id_column and identifier is None:
            raise opened.error(f"column {settings.id_column!r} holds no identifier; give each record one", line)
        yield record_document(opened, record, row[text_at], identifier, {name: typed(row[at]) for at, name in others})


def _column(opened: Opened, header: list[str], name: str, use: str) -> int:
    if name in header:
        return header.index(name)
    hint = (
        " (columns seem to be separated by semicolons; save with commas)"
        if len(header) == 1 and ";" in header[0]
        else ""
    )
    names = ", ".join(map(repr, header[:10]))
    raise opened.error(f"no column {name!r} (columns: {names}){hint}; name the {use} column", 1)
