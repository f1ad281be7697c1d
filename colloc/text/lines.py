"""Lines of bounded size from decoded text, and documents from the columns of a record."""

from __future__ import annotations

import io
import re
from collections.abc import Iterator, Mapping

from colloc.errors import DataError
from colloc.records import Document, MetaValue
from colloc.text.opening import Opened

PIECE = 2**21
"""Code points in a piece of a record's text."""
MOST_COLUMNS = 4096
"""Columns of a record; a table with more is no table of documents."""

_LINE_END = re.compile(r"[\r\n]")


def byte_length(text: str) -> int:
    """Bytes of ``text`` in UTF-8, which is what ``max_record`` measures."""
    return len(text) if text.isascii() else len(text.encode())


def exceeds(text: str, limit: int) -> bool:
    """Whether ``text`` has more than ``limit`` bytes in UTF-8 (short text is not encoded to find out)."""
    return len(text) * 4 > limit and byte_length(text) > limit


def too_long(opened: Opened, line: int) -> DataError:
    """The error for a record larger than ``max_record``."""
    return opened.error(
        f"a record of more than {opened.settings.max_record:,} bytes: allow larger records (max_record), "
        "or check that the file is what its name says",
        line,
    )


def newline_lines(opened: Opened) -> Iterator[str]:
    """Lines ended by LF, without it (in JSON Lines no other character ends a line).

    Raises
    ------
    DataError
        For a line of more than ``max_record`` bytes, while it is being read.
    """
    limit = opened.settings.max_record
    held: list[str] = []
    held_size = 0
    number = 1
    for piece in opened.text():
        first, *others = piece.split("\n")
        held.append(first)
        held_size += byte_length(first)
        if held_size > limit:
            raise too_long(opened, number)
        if not others:
            continue
        yield "".join(held)
        held = [others.pop()]
        held_size = byte_length(held[0])
        for number, line in enumerate(others, number + 1):  # noqa: B020 - the count goes on from the last line
            if exceeds(line, limit):
                raise too_long(opened, number)
            yield line
        number += 1
    if held_size:
        if held_size > limit:
            raise too_long(opened, number)
        yield "".join(held)


def universal_lines(opened: Opened) -> Iterator[str]:
    """Lines ended by LF, CR LF or CR, with their ends, as the `csv` module wants them.

    Raises
    ------
    DataError
        For a line of more than ``max_record`` bytes, while it is being read.
    """
    limit = opened.settings.max_record
    held: list[str] = []
    held_size = 0
    number = 1
    for piece in opened.text():
        held.append(piece)
        held_size += byte_length(piece)
        # Joined only when a line ends, so that a long line is not copied again and again.
        if _LINE_END.search(piece) or held[0].endswith("\r"):
            lines = list(io.StringIO("".join(held), newline=""))
            # A CR at the end of a piece may be half of a CR LF: it waits for the next piece.
            held = [] if lines[-1].endswith("\n") else [lines.pop()]
            held_size = byte_length("".join(held))
            for line in lines:
                if exceeds(line, limit):
                    raise too_long(opened, number)
                yield line
                number += 1
        if held_size > limit:
            raise too_long(opened, number)
    if held:
        yield "".join(held)


def pieces(text: str) -> tuple[str, ...]:
    """``text`` in pieces of bounded size."""
    if len(text) <= PIECE:
        return (text,)
    return tuple(text[start : start + PIECE] for start in range(0, len(text), PIECE))


def record_document(
    opened: Opened, record: int, text: str, identifier: MetaValue, columns: Mapping[str, MetaValue]
) -> Document:
    """A document from a record; its own columns go before what path and side table say.

    Without an identifier it is called ``file:n``, n counting records from 1.

    Raises
    ------
    DataError
        For more than `MOST_COLUMNS` columns.
    """
    if len(columns) > MOST_COLUMNS:
        raise opened.error(f"record {record + 1}: {len(columns):,} columns, more than {MOST_COLUMNS:,}: leave some out")
    name = f"{opened.identifier}:{record + 1}" if identifier is None else str(identifier)
    return Document(name, {**opened.metadata, **columns}, pieces(text), record)
