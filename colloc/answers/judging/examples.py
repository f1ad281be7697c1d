"""Example lines of a pair or an expression: the best ones, or the one at a given place."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from colloc.answers.concordance.lines import lines
from colloc.answers.judging.matters import Matter
from colloc.answers.questions import PairOptions, built_spec
from colloc.errors import DataError, NotSeenError, UsageError
from colloc.settings import LARGEST_WINDOW
from colloc.store import slices
from colloc.store.connection import Store
from colloc.store.decisions import Example
from colloc.store.texts import has_text

__all__ = ["best_examples", "example_at", "read_place"]


def best_examples(store: Store, matter: Matter, limit: int) -> list[Example]:
    """Good example sentences, best first, from different documents; none where the store keeps no text."""
    if not limit or not has_text(store):
        return []
    try:
        found = lines(store, *_searched(matter), options=_options(store, matter), best=True, limit=limit)
    except NotSeenError:
        return []
    return [_as_example(row, matter) for row in found.to_dicts()]


def example_at(store: Store, matter: Matter, document: str, character: int) -> Example:
    """The sentence that holds the matter at a place of a document.

    Parameters
    ----------
    character : int
        Code point of the document at which the first or the second word begins, as ``colloc lines`` shows it.

    Raises
    ------
    NotSeenError
        When the words do not stand there.
    UsageError
        When the store keeps no text.
    """
    where = [f"id={slices.quoted(document)}"]
    options = _options(store, matter, where)
    place = f"{document}:{character}"
    hint = f"`colloc lines {store.path} {' '.join(_searched(matter))!r}` lists places"
    try:
        found = lines(store, *_searched(matter), options=options, sentences=True, limit=0)
    except NotSeenError as error:
        raise NotSeenError(f"{place}: {matter.text!r} does not stand in that document; {hint}") from error
    for row in found.to_dicts():
        if character in (row["character"], row.get("partner_character")):
            return _as_example(row, matter)
    raise NotSeenError(f"{place}: {matter.text!r} does not stand at that place; {hint}")


def read_place(text: str) -> tuple[str, int]:
    """``DOC:OFFSET`` as document and offset.

    Raises
    ------
    DataError
        Where there is no offset.
    """
    document, colon, offset = text.rpartition(":")
    if not colon or not document or not offset.isascii() or not offset.isdigit():
        raise DataError(f"{text!r} is no place in a text: write DOCUMENT:OFFSET, as `colloc lines` shows them")
    return document, int(offset)


def _searched(matter: Matter) -> Sequence[str]:
    return [matter.text] if matter.kind == "expression" else matter.words


def _options(store: Store, matter: Matter, where: Sequence[str] = ()) -> PairOptions:
    built = built_spec(store)
    if built.kind == "relation":
        raise UsageError("example lines of relations cannot be looked up: leave out the places")
    if matter.kind == "directed":
        right = built.right if built.kind != "unit" else LARGEST_WINDOW
        return PairOptions(layer=matter.layer, left=0, right=right, where=where)
    return PairOptions(layer=matter.layer, where=where)


def _as_example(row: dict[str, Any], matter: Matter) -> Example:
    start = row["character"] - len(row["before"])
    marks = [(len(row["before"]), len(row["before"]) + len(row["match"]))]
    if matter.kind != "expression":
        begin = row["partner_character"] - start
        marks.append((begin, begin + len(row["partner"])))
    return Example(row["document"], start, row["before"] + row["match"] + row["after"], tuple(marks))
