"""Folded forms: what counts as the same word when case does not matter."""

from __future__ import annotations

import unicodedata


def fold(text: str) -> str:
    """Full Unicode case folding, then NFC (folding can take characters apart)."""
    if text.isascii():
        return text.lower()
    # Folding after NFD as well makes the result the same for canonically equivalent
    # texts: The Unicode Standard, section 3.13, D145.
    decomposed = unicodedata.normalize("NFD", text)
    return unicodedata.normalize("NFC", unicodedata.normalize("NFD", decomposed.casefold()))
