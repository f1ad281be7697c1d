"""Lines of text as a page."""

from __future__ import annotations

from typing import Any

from colloc.answers.columns import Columns
from colloc.answers.plain import is_right_to_left
from colloc.exports.pages.frame import Markup, number, page, table, text


def lines_page(answer: Columns) -> bytes:
    """A page with the lines of an answer of ``lines``, the matches under each other."""
    settings = answer.settings
    asked = settings["first"] if settings["second"] is None else f"{settings['first']} … {settings['second']}"
    found = (
        f"{number(settings['found'])} found in {number(settings['in_documents'])} documents, "
        f"{number(len(answer))} shown"
    )
    body = [
        f"<h1>{text(asked)}</h1>",
        f'<p class="lead">{found}</p>',
        table(
            ("document", "before", "match", "after"),
            [_row(row) for row in answer.to_dicts()],
            classes=("where", "before", "match", "after"),
            label="Lines of text",
            kind="lines",
        ),
        f"<footer>{text(_described(settings))}</footer>",
    ]
    return page(f"Lines: {asked}", body)


def _row(row: dict[str, Any]) -> tuple[Markup, Markup, Markup, Markup]:
    before, match, after = marked(row)
    place = f"{text(row['document'])}, word {number(row['token'] + 1)}"
    if is_right_to_left(row["match"] + row["after"]):
        # What is read first stands on the right.
        before, after = after, before
    return place, before, match, after


def marked(row: dict[str, Any]) -> tuple[Markup, Markup, Markup]:
    """Before, match and after as markup, the partner underlined where it stands."""
    before, after = row["before"], row["after"]
    start = row["character"] - len(before)
    partner = row.get("partner")
    shown = [text(before), text(after)]
    if partner is not None:
        offset = row["partner_character"] - start
        if offset < len(before):
            shown[0] = _underlined(before, offset, len(partner))
        else:
            shown[1] = _underlined(after, offset - len(before) - len(row["match"]), len(partner))
    return shown[0], f"<mark>{text(row['match'])}</mark>", shown[1]


def _underlined(whole: str, offset: int, length: int) -> Markup:
    inner = f'<span class="partner">{text(whole[offset : offset + length])}</span>'
    return text(whole[:offset]) + inner + text(whole[offset + length :])


def _described(settings: Any) -> str:
    return "; ".join(f"{key.replace('_', ' ')} {value}" for key, value in settings.items() if value not in (None, ""))
