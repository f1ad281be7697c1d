"""Columns as aligned plain text: how numbers and words of any script look to a person.

Used by ``repr`` of an answer and by the command line's tables.
"""

from __future__ import annotations

import math
import re
import unicodedata
from collections.abc import Sequence
from typing import Any

DECIMALS = 4
"""Digits after the point of a measure, enough to tell neighbours in a ranking apart."""

COLUMN_DECIMALS = {"per_million": 1}
"""Columns that need fewer."""

_COUNT_NAME = re.compile(
    r"(?:joint|count|total|documents|tokens)(?:_(?:this|that|in))?|\w+_(?:total|count)|df|this|that"
)
_PROBABILITY_NAME = re.compile(r"q_value|(?:\w+_)?(?<!log10_)[pq]")
LEAST_PROBABILITY = "<1e-300"
"""What stands for a probability that underflowed: none of the tests here ends in an exact zero."""

_FIRST_STRONG_ISOLATE = "\u2068"
_POP_ISOLATE = "\u2069"
_RIGHT_TO_LEFT = frozenset(("R", "AL", "AN"))
_ZERO_WIDTH = frozenset(("Mn", "Me", "Cf"))
_HANGUL_VOWELS_AND_FINALS = range(0x1160, 0x1200)


def width(text: str) -> int:
    """Terminal columns that ``text`` takes.

    Wide and fullwidth characters (UAX #11) take two, combining marks and
    format characters none.
    """
    if text.isascii():
        return len(text)
    return sum(map(_character_width, text))


def _character_width(character: str) -> int:
    if unicodedata.category(character) in _ZERO_WIDTH or ord(character) in _HANGUL_VOWELS_AND_FINALS:
        return 0
    return 2 if unicodedata.east_asian_width(character) in "WF" else 1


def shown_text(text: str) -> str:
    """A cell's text, safe to print.

    Control characters and bidirectional controls are written as escapes, since
    text is not trusted to steer a terminal. Text with right-to-left letters
    stands in an isolate (UAX #9), so that the columns beside it keep their place.
    """
    if text.isascii() and text.isprintable():
        return text
    escaped = "".join(_escape(character) if _steers(character) else character for character in text)
    if any(unicodedata.bidirectional(character) in _RIGHT_TO_LEFT for character in escaped):
        return f"{_FIRST_STRONG_ISOLATE}{escaped}{_POP_ISOLATE}"
    return escaped


def is_right_to_left(text: str) -> bool | None:
    """Whether the first letter with a direction runs from right to left (UAX #9, P2); None without such a letter."""
    for character in text:
        direction = unicodedata.bidirectional(character)
        if direction in ("L", "R", "AL"):
            return direction != "L"
    return None


def _steers(character: str) -> bool:
    # Joiners and soft hyphens (also Cf) belong to words and stay; Cs would not encode.
    return unicodedata.category(character) in ("Cc", "Cs", "Zl", "Zp") or character in _BIDI_CONTROLS


_BIDI_CONTROLS = frozenset("\u061c\u200e\u200f\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069")


def _escape(character: str) -> str:
    return f"\\x{ord(character):02x}" if ord(character) < 256 else f"\\u{ord(character):04x}"


def number_text(value: float, decimals: int = DECIMALS) -> str:
    """A number with so many decimals; very small and very large ones with an exponent.

    >>> [number_text(v) for v in (0.25, -0.0, 12345.678, 3e-9, float("nan"), float("-inf"))]
    ['0.2500', '0.0000', '12345.6780', '3.000e-09', '', '-inf']
    """
    if math.isnan(value):
        return ""
    if math.isinf(value):
        return "inf" if value > 0 else "-inf"
    size = abs(value)
    if size == 0:
        return f"{0.0:.{decimals}f}"
    if size < 10**-DECIMALS or size >= 1e12:
        return f"{value:.{DECIMALS - 1}e}"
    return f"{value:.{decimals}f}"


def is_count(name: str) -> bool:
    """Whether a column of this name holds counts, or (``this``, ``that``) counts beside measures.

    Halving a word's pairs with itself, and measures beside them, make such columns floats.
    """
    return _COUNT_NAME.fullmatch(name) is not None


def _count_text(value: float) -> str:
    """A count as a whole number where it is one, a half with one digit, a weighted one as measures are.

    >>> [_count_text(v) for v in (9.0, 8.5, 500082016.0, 1 / 3)]
    ['9', '8.5', '500082016', '0.3333']
    """
    if value.is_integer():
        return str(int(value))
    return f"{value:.1f}" if (2 * value).is_integer() else number_text(value)


def _probability_text(value: float) -> str:
    """A p- or q-value; small ones with four significant digits.

    >>> [_probability_text(v) for v in (0.25, 0.00042, 1.2e-9, 0.0)]
    ['0.2500', '4.200e-04', '1.200e-09', '<1e-300']
    """
    if value == 0:
        return LEAST_PROBABILITY
    return f"{value:.{DECIMALS - 1}e}" if 0 < value < 10 ** (1 - DECIMALS) else number_text(value)


def cell_text(value: Any, decimals: int = DECIMALS) -> str:
    """What a table shows for one value; nothing where it is missing."""
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, int):
        return str(value)
    if isinstance(value, float):
        return number_text(value, decimals)
    return shown_text(str(value))


class Grid:
    """Rows of cells put into aligned lines: numbers to the right, text to the left.

    Parameters
    ----------
    names : sequence of str
    numeric : sequence of bool
        Which columns hold numbers.

    Rows may come in several lots; a later lot never narrows a column.
    """

    def __init__(self, names: Sequence[str], numeric: Sequence[bool]) -> None:
        self._names = list(names)
        self._heads = [shown_text(name) for name in names]
        self._numeric = list(numeric)
        self._widths = [width(head) for head in self._heads]

    @property
    def widths(self) -> tuple[int, ...]:
        """How wide each column is, in terminal columns, with all rows so far."""
        return tuple(self._widths)

    def lines(self, columns: Sequence[Sequence[Any]], *, heading: bool) -> list[str]:
        """Lines for equally long columns of values, after the column names where ``heading``."""
        cells = [self._column(values, name) for values, name in zip(columns, self._names, strict=True)]
        for place, column in enumerate(cells):
            self._widths[place] = max([self._widths[place], *map(width, column)])
        rows = zip(*cells, strict=True)
        return [self._line(row) for row in ([tuple(self._heads), *rows] if heading else rows)]

    @staticmethod
    def _column(values: Sequence[Any], name: str) -> list[str]:
        special = _count_text if is_count(name) else _probability_text if _PROBABILITY_NAME.fullmatch(name) else None
        if special is not None:
            return [special(value) if isinstance(value, float) else cell_text(value) for value in values]
        return [cell_text(value, COLUMN_DECIMALS.get(name, DECIMALS)) for value in values]

    def _line(self, cells: Sequence[str]) -> str:
        padded = []
        for cell, numeric, wanted in zip(cells, self._numeric, self._widths, strict=True):
            space = " " * (wanted - width(cell))
            padded.append(space + cell if numeric else cell + space)
        return "  ".join(padded).rstrip()
