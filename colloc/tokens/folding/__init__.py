"""Folded forms and lemmas: what counts as the same word."""

from __future__ import annotations

import unicodedata
from collections.abc import Callable, Sequence
from functools import cache

from colloc.errors import UsageError


def fold(text: str) -> str:
    """Full Unicode case folding, then NFC (folding can take characters apart)."""
    if text.isascii():
        return text.lower()
    # Folding after NFD as well makes the result the same for canonically equivalent
    # texts: The Unicode Standard, section 3.13, D145.
    decomposed = unicodedata.normalize("NFD", text)
    return unicodedata.normalize("NFC", unicodedata.normalize("NFD", decomposed.casefold()))


@cache
def folder(names: tuple[str, ...]) -> Callable[[str], str]:
    """Folding with additions (see :mod:`colloc.tokens.folding.additions`), by name; `fold` itself without any.

    What an addition changes before case folding comes first, then case
    folding, then the other changes, in the order of that module; the result is
    NFC.

    Raises
    ------
    UsageError
        For an unknown name.
    """
    if not names:
        return fold
    from colloc.tokens.folding.additions import ADDITIONS

    for name in names:
        if name not in ADDITIONS:
            raise UsageError(f"unknown folding {name!r}: choose from {', '.join(sorted(ADDITIONS))}")
    chosen = [ADDITIONS[name] for name in ADDITIONS if name in names]
    before = [addition.before for addition in chosen if addition.before is not None]
    after = [addition.after for addition in chosen if addition.after is not None]
    apart = [addition.apart for addition in chosen if addition.apart]

    def folded(text: str) -> str:
        text = unicodedata.normalize("NFC", text)
        for change in before:
            text = change(text)
        text = _fold_around(text, apart)
        for change in after:
            text = unicodedata.normalize("NFC", change(text))
        return text

    return folded


def _fold_around(text: str, apart: Sequence[str]) -> str:
    """Fold case, but for the letters that stay apart."""
    if not apart:
        return fold(text)
    first = apart[0][0]
    for other in apart[0][1:]:
        text = text.replace(other, first)
    return first.join(_fold_around(part, apart[1:]) for part in text.split(first))
