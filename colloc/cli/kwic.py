"""Lines for reading in a terminal: the match in one column, what stands before and after beside it."""

from __future__ import annotations

import re
import shutil
import unicodedata
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from colloc.answers.columns import Columns

_SPACES = re.compile(r"\s+")
_WIDEST_NAME = 22
_WIDEST_MATCH = 24
_LEAST_KEY, _LEAST_NAME = 3, 8
"""Columns that metadata and the document's name keep."""
_ELLIPSIS = "…"


def terminal_width() -> int:
    """Columns of the terminal (or of ``COLUMNS``); 100 where the output goes elsewhere."""
    return shutil.get_terminal_size((100, 24)).columns


def kwic_lines(answer: Columns, columns: int, keys: Sequence[str] = ()) -> list[str]:
    """A line of names, and one line of text for each row of an answer of ``lines``; words are counted from 1.

    Parameters
    ----------
    columns : int
        Display columns of a whole line; at least 40 are used.
    keys : sequence of str
        Metadata shown beside the document; cut, before the document's name is, so that half of the line is text.

    Lines of right-to-left text have what is read first on the right, as their readers expect; every cell is an
    isolate of its own, so that the match stands in the same columns as in all other lines.
    """
    from colloc.answers.plain import width

    rows = answer.to_dicts()
    if not rows:
        return []
    names = ["document", *keys, "word"]
    left = [[row["document"], *(row[key] for key in keys), row["token"] + 1] for row in rows]
    heads = [[_cut_end(_plain(value), _WIDEST_NAME) for value in cells] for cells in [names, *left]]
    head_widths = _narrowed([max(map(width, cells)) for cells in zip(*heads, strict=True)], max(columns, 40) // 2)
    heads = [[_cut_end(cell, wide) for cell, wide in zip(cells, head_widths, strict=True)] for cells in heads]
    match_width = min(max(width(_plain(row["match"])) for row in rows), _WIDEST_MATCH)
    room = max(columns, 40) - sum(head_widths) - 2 * len(head_widths)
    side = max((room - match_width) // 2, 8)
    bodies = ["", *(_body(row, side, max(room - side, 8)) for row in rows)]
    lines = []
    for cells, body in zip(heads, bodies, strict=True):
        head = "  ".join(
            _padded(cell, wide, left=place != len(cells) - 1)
            for place, (cell, wide) in enumerate(zip(cells, head_widths, strict=True))
        )
        lines.append(f"{head}  {body}".rstrip())
    return lines


def _narrowed(widths: list[int], most: int) -> list[int]:
    """Widths of document, keys and place that take so many columns with what parts them; the place is never cut."""
    widths = widths.copy()
    for cells, least in ((range(1, len(widths) - 1), _LEAST_KEY), (range(1), _LEAST_NAME)):
        while sum(widths) + 2 * len(widths) > most and any(widths[cell] > least for cell in cells):
            widths[max(cells, key=widths.__getitem__)] -= 1
    return widths


def sentence_lines(answer: Columns, columns: int, keys: Sequence[str] = ()) -> list[str]:
    """Whole sentences, wrapped and indented under their document, the words looked for in square brackets."""
    from colloc.answers.evidence.text import bracketed, folded
    from colloc.answers.plain import shown_text

    lines = []
    for row in answer.to_dicts():
        heads = [row["document"], *(row[key] for key in keys), f"word {row['token'] + 1}"]
        lines.append(", ".join(shown_text(_plain(value)) for value in heads))
        lines += folded(_plain(bracketed(row)), max(columns, 40) - 4, "    ", "    ")
    return lines


def _body(row: dict[str, Any], before_width: int, rest_width: int) -> str:
    """What stands before the match up to a column, the match and what follows from there, spaced as in the text."""
    from colloc.answers.plain import is_right_to_left

    before, rest = _SPACES.sub(" ", row["before"]).lstrip(), _SPACES.sub(" ", row["match"] + row["after"]).rstrip()
    before, rest = _fit(before, before_width, _cut_start), _fit(rest, rest_width, _cut_end)
    if is_right_to_left(row["match"] + row["after"]):
        return _padded(rest, rest_width, left=False) + _padded(before, before_width)
    return _padded(before, before_width, left=False) + _padded(rest, rest_width)


def _plain(value: Any) -> str:
    return "" if value is None else _SPACES.sub(" ", str(value)).strip()


def _padded(text: str, columns: int, *, left: bool = True) -> str:
    """A cell of exactly so many columns, controls escaped and right-to-left text isolated."""
    from colloc.answers.plain import shown_text, width

    shown = shown_text(text)
    space = " " * (columns - width(shown))
    return shown + space if left else space + shown


def _fit(text: str, columns: int, cut: Callable[[str, int], str]) -> str:
    """The text cut so that it still fits when its controls are escaped."""
    from colloc.answers.plain import shown_text, width

    room = columns
    fitted = cut(text, room)
    while width(shown_text(fitted)) > columns and room > 0:
        room -= width(shown_text(fitted)) - columns
        fitted = cut(text, max(room, 0))
    return fitted


def _cut_end(text: str, columns: int) -> str:
    """The beginning of a text in so many columns, an ellipsis where something is left out."""
    from colloc.answers.plain import width

    if width(text) <= columns:
        return text
    kept, used = 0, 1
    while kept < len(text) and used + width(text[kept]) <= columns:
        used += width(text[kept])
        kept += 1
    return text[:kept] + _ELLIPSIS if columns > 0 else ""


def _cut_start(text: str, columns: int) -> str:
    """The end of a text in so many columns; no combining mark is cut off from its letter."""
    from colloc.answers.plain import width

    if width(text) <= columns:
        return text
    first, used = len(text), 1
    while first and used + width(text[first - 1]) <= columns:
        first -= 1
        used += width(text[first])
    while first < len(text) and unicodedata.category(text[first]).startswith("M"):
        first += 1
    return _ELLIPSIS + text[first:] if columns > 0 else ""
