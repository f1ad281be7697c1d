"""What all pages share: the frame, the style sheet, escaping, small tables."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from html import escape
from importlib.resources import files
from typing import Any

from colloc.answers.plain import number_text

Markup = str
"""HTML that is escaped already."""


def page(title: str, body: Iterable[Markup]) -> bytes:
    """A whole document, UTF-8; the policy in its head forbids scripts and every request."""
    style = files("colloc.exports.pages").joinpath("page.css").read_text(encoding="utf-8")
    policy = "default-src 'none'; style-src 'unsafe-inline'; img-src data:"
    lines = [
        "<!doctype html>",
        '<html lang="en">',
        "<head>",
        '<meta charset="utf-8">',
        '<meta name="viewport" content="width=device-width, initial-scale=1">',
        f'<meta http-equiv="Content-Security-Policy" content="{policy}">',
        f"<title>{text(title)}</title>",
        f"<style>\n{style}</style>",
        "</head>",
        "<body>",
        *body,
        "</body>",
        "</html>",
        "",
    ]
    return "\n".join(lines).encode("utf-8", "replace")


def text(value: Any) -> Markup:
    """A value as text of a page: escaped, control characters that HTML forbids as U+FFFD."""
    shown = "" if value is None else str(value)
    return escape("".join(_visible(character) for character in shown))


def _visible(character: str) -> str:
    code = ord(character)
    forbidden = (code < 32 and character not in "\n\t") or 127 <= code < 160 or 0xD800 <= code < 0xE000
    return "\ufffd" if forbidden else character


def number(value: Any, decimals: int = 3) -> Markup:
    """A number as a page shows it: whole ones with thin spaces between thousands, a true minus sign."""
    shown = f"{value:,}".replace(",", "\u202f") if isinstance(value, int) else number_text(float(value), decimals)
    return text(shown.replace("-", "\u2212") if "e" not in shown else shown)


def table(
    heads: Sequence[str], rows: Iterable[Sequence[Markup]], *, classes: Sequence[str], label: str, kind: str = ""
) -> Markup:
    """A table of cells that are markup already.

    Parameters
    ----------
    classes : sequence of str
        Style class of each column: ``n`` for numbers, empty for plain text.
    label : str
        Read out by screen readers. The table scrolls inside its own box where the page is too narrow.
    """
    styles = [f' class="{name}"' if name else "" for name in classes]
    head = "".join(f'<th scope="col"{style}>{text(name)}</th>' for name, style in zip(heads, styles, strict=True))
    lines = [
        f'<div class="scroll" tabindex="0" role="region" aria-label="{text(label)}"><table class="{text(kind)}">',
        f"<thead><tr>{head}</tr></thead>",
        "<tbody>",
    ]
    for row in rows:
        cells = "".join(f'<td{style} dir="auto">{cell}</td>' for cell, style in zip(row, styles, strict=True))
        lines.append(f"<tr>{cells}</tr>")
    return "\n".join([*lines, "</tbody></table></div>"])


def settings_footer(settings: Mapping[str, Any]) -> Markup:
    """What decided the numbers, in small print."""
    shown = [
        f"{key.replace('_', ' ')} {value}" for key, value in settings.items() if value not in (None, "", False, ())
    ]
    return f"<footer>{text('; '.join(shown))}</footer>"
