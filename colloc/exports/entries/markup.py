"""XML written by hand, so that every character comes back: what XML cannot hold is refused by name."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping

from colloc.errors import DataError

Markup = str
"""XML that is escaped already."""
_ILLEGAL = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")
"""Everything outside the production Char of XML 1.0, 2.2."""
# A carriage return is a line feed after parsing (XML 1.0, 2.11) unless it is a reference; in attributes tabs and line
# feeds become spaces (3.3.3).
_CONTENT = str.maketrans({"&": "&amp;", "<": "&lt;", ">": "&gt;", "\r": "&#13;"})
_ATTRIBUTE = str.maketrans(
    {"&": "&amp;", "<": "&lt;", ">": "&gt;", '"': "&quot;", "\r": "&#13;", "\n": "&#10;", "\t": "&#9;"}
)


def text(value: str) -> Markup:
    """Text as the content of an element.

    Raises
    ------
    DataError
        For a character that XML 1.0 does not have.
    """
    _check(value)
    return value.translate(_CONTENT)


def element(
    name: str, content: Iterable[Markup] | Markup = (), attributes: Mapping[str, str | None] | None = None
) -> Markup:
    """An element; attributes of None are left out."""
    written = "".join(f' {key}="{_attribute(value)}"' for key, value in (attributes or {}).items() if value is not None)
    inside = content if isinstance(content, str) else "".join(content)
    return f"<{name}{written}>{inside}</{name}>" if inside else f"<{name}{written}/>"


def document(root: Markup) -> bytes:
    """A whole file in UTF-8."""
    return f'<?xml version="1.0" encoding="UTF-8"?>\n{root}\n'.encode()


def _attribute(value: str) -> str:
    _check(value)
    return value.translate(_ATTRIBUTE)


def _check(value: str) -> None:
    found = _ILLEGAL.search(value)
    if found:
        start = max(found.start() - 20, 0)
        raise DataError(
            f"XML has no character U+{ord(found[0]):04X}, which stands in {value[start : found.end() + 20]!r}; "
            "export as JSON Lines or CSV, or judge with the text put right"
        )
