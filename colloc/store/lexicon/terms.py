"""From words to term numbers and back."""

from __future__ import annotations

import sys
import unicodedata
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.errors import StoreDamagedError
from colloc.records import Int64Array
from colloc.store.connection import Store
from colloc.store.lexicon.forms import store_forms
from colloc.store.lexicon.layers import find_layer

_FOLDED = {"fold", "lemma_fold"}
_EVERYTHING = 0.2
"""Share of a layer's terms above which one pass over all texts is quicker than asking one by one."""


def brought_to(store: Store, layer: str, text: str) -> str:
    """A word as the layer writes it: NFC, and folded where the layer is; ``a/NOUN`` part by part."""
    names = layer.split("/")
    # A word may hold a slash itself: the last parts belong to the last names.
    parts = text.rsplit("/", len(names) - 1)
    if len(parts) != len(names):
        return unicodedata.normalize("NFC", text)
    fold = store_forms(store).fold
    pairs = zip(names, parts, strict=True)
    return "/".join(fold(part) if name in _FOLDED else unicodedata.normalize("NFC", part) for name, part in pairs)


def term_numbers(store: Store, layer: str, texts: Sequence[str]) -> Int64Array:
    """Terms of the words: int64 array, shape (len(texts),), -1 where the layer does not know the word.

    Words are brought to the layer's form first (NFC, folded).
    """
    row = find_layer(store, layer)
    sql, fixed = _by_text(row.same, row.number)
    numbers = np.full(len(texts), -1, dtype=np.int64)
    for position, text in enumerate(texts):
        wanted = brought_to(store, layer, text)
        if _has_half_pair(wanted):
            continue
        found = store.value(f"{sql} = ?", (*fixed, wanted))
        numbers[position] = -1 if found is None else found
    return numbers


def term_texts(store: Store, layer: str, numbers: NDArray[Any] | Sequence[int] | None = None) -> list[str]:
    """Texts of the terms given, or of all terms in order."""
    row = find_layer(store, layer)
    table, where, fixed = ("types", "", ()) if row.same else ("terms", "layer = ? AND ", (row.number,))
    column = "form" if row.same else "text"
    if numbers is not None and len(numbers) < _EVERYTHING * row.terms:
        texts = [store.value(f"SELECT {column} FROM {table} WHERE {where}id = ?", (*fixed, int(n))) for n in numbers]
        if any(text is None for text in texts):
            raise StoreDamagedError(f"{store.path}: layer {layer} lacks the text of a term")
        return texts
    everything = [
        text for (text,) in store.rows(f"SELECT {column} FROM {table} WHERE {where}id >= 0 ORDER BY id", fixed)
    ]
    if len(everything) != row.terms:
        raise StoreDamagedError(f"{store.path}: layer {layer} has {len(everything)} texts for {row.terms} terms")
    if numbers is None:
        return everything
    return [everything[int(number)] for number in numbers]


def terms_matching(store: Store, layer: str, pattern: str) -> Int64Array:
    """Terms, ascending, whose text fits the pattern; ``*`` stands for any characters, even none."""
    row = find_layer(store, layer)
    wanted = "*".join(brought_to(store, layer, part) if part else "" for part in pattern.split("*"))
    if _has_half_pair(wanted):
        return np.empty(0, dtype=np.int64)
    # Only * keeps its meaning for GLOB.
    escaped = wanted.replace("[", "[[]").replace("?", "[?]")
    sql, fixed = _by_text(row.same, row.number)
    found = store.rows(f"{sql} GLOB ?", (*fixed, escaped))
    return np.array(sorted(number for (number,) in found), dtype=np.int64)


def terms_of_shape(store: Store, layer: str, text: str, reach: int = 2) -> tuple[Int64Array, list[str]]:
    """Terms and their texts that begin with the character of ``text`` and differ in length by ``reach`` at most."""
    if not text or _has_half_pair(text):
        return np.empty(0, dtype=np.int64), []
    row = find_layer(store, layer)
    table, column, where = ("types", "form", "") if row.same else ("terms", "text", "layer = ? AND ")
    begins = ord(text[0])
    # The index serves a range: all texts from this character to the next one that can be written.
    after = "" if begins == sys.maxunicode else chr(0xE000 if begins == 0xD7FF else begins + 1)
    until = f" AND {column} < ?" if after else ""
    lengths = (max(len(text) - reach, 1), len(text) + reach)
    found = store.rows(
        f"SELECT id, {column} FROM {table} WHERE {where}{column} >= ?{until} AND length({column}) BETWEEN ? AND ?",
        (*(() if row.same else (row.number,)), text[0], *((after,) if after else ()), *lengths),
    )
    return np.array([number for number, _ in found], dtype=np.int64), [other for _, other in found]


def _by_text(same: bool, layer: int) -> tuple[str, tuple[int, ...]]:
    if same:
        return "SELECT id FROM types WHERE form", ()
    return "SELECT id FROM terms WHERE layer = ? AND text", (layer,)


def _has_half_pair(text: str) -> bool:
    """Half of a surrogate pair, as a command line with undecodable bytes gives: no word holds one."""
    return any("\ud800" <= character <= "\udfff" for character in text)
