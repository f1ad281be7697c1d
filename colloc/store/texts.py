"""The text as it was decoded, compressed in blocks and addressed by character.

Characters are numbered through the whole store; block borders mean nothing.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import Any

from colloc.errors import StoreDamagedError, UsageError
from colloc.store.connection import Store
from colloc.store.database import packing

BLOCK_CHARACTERS = 131_072
_BLANK = " "
PackedText = list[tuple[int, int, bytes]]
"""Offset, length and packed bytes of the blocks of a stretch of text."""


def pack_text(text: str) -> PackedText:
    """A stretch of text as blocks ready to store: what worker processes do.

    Half surrogate pairs, as JSON escapes can bring them, are kept as they are.
    """
    blocks = []
    for start in range(0, len(text), BLOCK_CHARACTERS):
        piece = text[start : start + BLOCK_CHARACTERS]
        blocks.append((start, len(piece), packing.pack_bytes(_encoded(piece))))
    return blocks


def append_packed(store: Store, first_character: int, blocks: PackedText) -> None:
    """Keep the blocks of a stretch of text that begins at ``first_character``."""
    rows = ((first_character + start, length, data) for start, length, data in blocks)
    store.execute_many("INSERT INTO text_blocks VALUES (?, ?, ?)", rows)


def append_text(store: Store, first_character: int, text: str) -> None:
    """Keep a stretch of text; long stretches make the best blocks (each call begins a new one)."""
    append_packed(store, first_character, pack_text(text))


def packed_blocks(store: Store) -> Iterator[tuple[int, int, bytes]]:
    """All blocks as they are stored: first character, length, packed bytes."""
    yield from store.iterate("SELECT first_character, n_characters, data FROM text_blocks ORDER BY 1", batch=64)


def has_text(store: Store) -> bool:
    """Whether any text was kept."""
    return store.value("SELECT 1 FROM text_blocks LIMIT 1") is not None


def character_count(store: Store) -> int:
    """Where the text kept so far ends."""
    last = store.row("SELECT first_character + n_characters FROM text_blocks ORDER BY first_character DESC LIMIT 1")
    return 0 if last is None else int(last[0])


def next_character(store: Store) -> int:
    """Where the next text begins, also where texts are not kept."""
    last = "SELECT coalesce(max(first_character + n_characters), 0) FROM documents"
    return max(character_count(store), int(store.value(last)))


def read_text(store: Store, start: int, stop: int) -> str:
    """The characters start..stop-1.

    Raises
    ------
    UsageError
        The store keeps no text.
    StoreDamagedError
        Some of these characters are missing, or a block does not verify.
    """
    if not has_text(store):
        raise UsageError(f"{store.path}: was built without its text (--no-text), so there is nothing to show")
    pieces = []
    position = start
    for first, length, data in _blocks(store, start, stop):
        if first > position:
            break
        text = _decoded(store, first, length, data)
        pieces.append(text[position - first : stop - first])
        position = min(stop, first + length)
    if position < stop:
        raise StoreDamagedError(f"{store.path}: text from character {position} to {stop} is missing")
    return "".join(pieces)


def blank_texts(store: Store, spans: Iterable[tuple[int, int]]) -> None:
    """Overwrite the characters start..stop-1 of each span with spaces, so that all others keep their numbers.

    Each block is rewritten once.
    """
    by_block: dict[int, list[tuple[int, int]]] = {}
    for start, stop in spans:
        for first, _, _ in _blocks(store, start, stop, column="NULL"):
            by_block.setdefault(first, []).append((start, stop))
    for first, here in sorted(by_block.items()):
        length, data = store.row("SELECT n_characters, data FROM text_blocks WHERE first_character = ?", (first,))
        pieces = []
        text = _decoded(store, first, length, data)
        position = 0
        for start, stop in sorted(here):
            begin, end = max(start - first, position), min(stop - first, length)
            pieces += [text[position:begin], _BLANK * (end - begin)]
            position = end
        packed = packing.pack_bytes(_encoded("".join([*pieces, text[position:]])))
        store.execute("UPDATE text_blocks SET data = ? WHERE first_character = ?", (packed, first))


def _blocks(store: Store, start: int, stop: int, column: str = "data") -> list[Any]:
    """First character, length and a column of the blocks that hold any of the characters start..stop-1, in order."""
    if stop <= start:
        return []
    before = store.value("SELECT max(first_character) FROM text_blocks WHERE first_character <= ?", (start,))
    sql = (
        f"SELECT first_character, n_characters, {column} FROM text_blocks "
        "WHERE first_character < ? AND first_character >= ? ORDER BY first_character"
    )
    rows = store.rows(sql, (stop, start if before is None else before))
    return [row for row in rows if row[0] + row[1] > start]


def _decoded(store: Store, first: int, length: int, data: Any) -> str:
    what = f"{store.path}: text from character {first}"
    try:
        text = packing.unpack_bytes(data, what).decode("utf-8", "surrogatepass")
    except UnicodeDecodeError as error:
        raise StoreDamagedError(f"{what}: not UTF-8 ({error.reason})") from error
    if len(text) != length:
        raise StoreDamagedError(f"{what}: holds {len(text)} characters instead of {length}")
    return text


def _encoded(text: str) -> bytes:
    return text.encode("utf-8", "surrogatepass")
