"""Cells that a spreadsheet would run as a formula: how they are written and read back.

A text cell beginning with ``=``, ``+``, ``-``, ``@``, a tab or a carriage return is
written with an apostrophe before it, unless it is a number. A cell that already
begins with apostrophes before such a character gets one more, so that taking one
off again always gives the text as it was.
"""

from __future__ import annotations

import re

_DANGEROUS = re.compile(r"'*[=+\-@\t\r]")
_DEFUSED = re.compile(r"'+[=+\-@\t\r]")
_NUMBER = re.compile(r"[+-]?(?:\d+(?:\.\d*)?(?:[eE][+-]?\d+)?|\.\d+(?:[eE][+-]?\d+)?|inf|nan)")


def defuse(cell: str) -> str:
    """The cell as it is written to CSV and TSV.

    >>> [defuse(cell) for cell in ("sea", "=A1", "-0.5", "'=A1", "'tis")]
    ['sea', "'=A1", '-0.5', "''=A1", "'tis"]
    """
    if _DANGEROUS.match(cell) and not _NUMBER.fullmatch(cell):
        return "'" + cell
    return cell


def restore(cell: str) -> str:
    """The text that :func:`defuse` was given.

    >>> [restore(cell) for cell in ("sea", "'=A1", "-0.5", "''=A1", "'tis")]
    ['sea', '=A1', '-0.5', "'=A1", "'tis"]
    """
    return cell[1:] if _DEFUSED.match(cell) else cell


def defuse_all(cells: list[str]) -> list[str]:
    """:func:`defuse` for a column; a few looks at the whole column where nothing is to do, as nearly always."""
    joined = _joined(cells)
    dangerous = any(f"\0{sign}" in joined for sign in _SIGNS) or _ANY_DEFUSED.search(joined)
    return [defuse(cell) for cell in cells] if dangerous else cells


def restore_all(cells: list[str]) -> list[str]:
    """:func:`restore` for a column."""
    return [restore(cell) for cell in cells] if _ANY_DEFUSED.search(_joined(cells)) else cells


_SIGNS = "=+-@\t\r"
_ANY_DEFUSED = re.compile(r"\0'+[=+\-@\t\r]")


def _joined(cells: list[str]) -> str:
    """The cells behind each other, a NUL before each."""
    return "\0".join(["", *cells])
