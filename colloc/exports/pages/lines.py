"""Lines of text as a page."""

from __future__ import annotations

from typing import Any

from colloc.answers.columns import Columns
from colloc.answers.plain import is_right_to_left
from colloc.exports.pages.frame import Markup, number, page, settings_footer, text


def lines_page(answer: Columns) -> bytes:
    """A page with the lines of an answer of ``lines``: words are counted from 1.

    The matches stand under each other where there is room; whole sentences, narrow screens and paper have running text.
    """
    settings = answer.settings
    asked = settings["first"] if settings["second"] is None else f"{settings['first']} … {settings['second']}"
    documents = settings["in_documents"]
    found = (
        f"{number(settings['found'])} found in {number(documents)} document{'s' if documents != 1 else ''}, "
        f"{number(len(answer))} shown"
    )
    items = [_item(row) for row in answer.to_dicts()]
    body = [
        f"<h1><bdi>{text(asked)}</bdi></h1>",
        f'<p class="lead">{found}</p>',
        f'<ol class="lines{" running" if settings["sentences"] else ""}">{"".join(items)}</ol>',
        settings_footer(settings),
    ]
    return page(f"Lines: {asked}", body)


def _item(row: dict[str, Any]) -> Markup:
    before, match, after = marked(row)
    # In right-to-left text what is read first stands on the right of the match.
    turned = ' class="turned" dir="rtl"' if is_right_to_left(row["match"] + row["after"]) else ""
    # The space between them would not be seen at the end of a cell: a margin stands for it.
    close = "" if before[-1:].isspace() else " close"
    return (
        f"<li{turned}>"
        f'<span class="where" dir="auto">{text(row["document"])}, word {number(row["token"] + 1)}</span> '
        f'<span class="before{close}"><bdi>{before}</bdi></span>'
        f'<span class="rest"><bdi>{match}{after}</bdi></span></li>\n'
    )


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
