"""The token stream: packed blocks of type numbers with the places where units begin.

Blocks follow each other without gaps: ``first_token`` of one is where the one
before it ended. A removed document keeps its place, overwritten with NO_TERM.
"""

from __future__ import annotations

import struct
from bisect import bisect_left, bisect_right
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.errors import StoreDamagedError, UsageError
from colloc.records import NO_TERM, Anchors, Int64Array, UInt32Array
from colloc.store.connection import Store
from colloc.store.database import packing

_OFFSETS = ("sentences", "paragraphs", "document_starts", "document_numbers", "anchor_tokens", "anchor_characters")
_HEAD = struct.Struct("<4q")


@dataclass(frozen=True, slots=True)
class BlockHead:
    """What is known of a block without reading it."""

    number: int
    first_token: int
    n_tokens: int
    continues: bool


@dataclass(frozen=True, slots=True)
class Block:
    """A stretch of the token stream.

    Attributes
    ----------
    number : int
        Blocks are numbered from 0 in the order of the stream.
    first_token : int
        Place of the first token in the whole stream.
    tokens : uint32 array
        Types; NO_TERM where a document was removed.
    sentences, paragraphs, document_starts : int64 arrays
        Offsets in the block where one begins, ascending.
    document_numbers : int64 array, same length as document_starts
        -1 for a removed document.
    continues : bool
        Whether the first token goes on inside the sentence of the block before.
    anchors : Anchors
        Offset in the block beside the character in the whole text.
    """

    number: int
    first_token: int
    tokens: UInt32Array
    sentences: Int64Array
    paragraphs: Int64Array
    document_starts: Int64Array
    document_numbers: Int64Array
    continues: bool
    anchors: Anchors

    @property
    def head(self) -> BlockHead:
        """The head that :func:`block_heads` gives for this block."""
        return BlockHead(self.number, self.first_token, len(self.tokens), self.continues)


def block_heads(store: Store) -> list[BlockHead]:
    """Heads of all blocks, in order; raises StoreDamagedError where they leave gaps."""
    heads: list[BlockHead] = []
    expected = 0
    sql = "SELECT id, first_token, n_tokens, continues, head_checksum FROM blocks ORDER BY id"
    for number, first_token, n_tokens, continues, check in store.rows(sql):
        head = BlockHead(number, first_token, n_tokens, bool(continues))
        if _head_checksum(head) != check or first_token != expected or number != len(heads):
            raise StoreDamagedError(f"{_name(store, number)}: its head does not fit; build the store again")
        expected += n_tokens
        heads.append(head)
    return heads


def token_count(store: Store) -> int:
    """Length of the stream, removed tokens included: where the next block begins."""
    last = store.row("SELECT first_token + n_tokens FROM blocks ORDER BY id DESC LIMIT 1")
    return 0 if last is None else int(last[0])


def block_count(store: Store) -> int:
    """How many blocks the stream has: the number of the next one."""
    return int(store.value("SELECT coalesce(max(id) + 1, 0) FROM blocks"))


def read_block(store: Store, number: int) -> Block:
    """One block, every part's checksum checked."""
    columns = ", ".join(_OFFSETS)
    row = store.row(
        f"SELECT first_token, n_tokens, continues, head_checksum, tokens, {columns} FROM blocks WHERE id = ?", (number,)
    )
    what = _name(store, number)
    if row is None:
        raise StoreDamagedError(f"{what}: not there; build the store again")
    head = BlockHead(number, row[0], row[1], bool(row[2]))
    tokens = packing.unpack_as(row[4], np.uint32, what)
    parts = {
        name: packing.unpack_as(data, np.int64, f"{what}, {name}") for name, data in zip(_OFFSETS, row[5:], strict=True)
    }
    if _head_checksum(head) != row[3] or len(tokens) != head.n_tokens:
        raise StoreDamagedError(f"{what}: its head does not fit its tokens; build the store again")
    for name in ("sentences", "paragraphs", "document_starts", "anchor_tokens"):
        offsets = parts[name]
        if len(offsets) and not 0 <= offsets[0] <= offsets[-1] <= head.n_tokens:
            raise StoreDamagedError(f"{what}: {name} lie outside the block")
    if len(parts["document_starts"]) != len(parts["document_numbers"]):
        raise StoreDamagedError(f"{what}: document starts and numbers differ in length")
    if len(parts["anchor_tokens"]) != len(parts["anchor_characters"]):
        raise StoreDamagedError(f"{what}: anchors differ in length")
    return Block(
        number,
        head.first_token,
        tokens,
        parts["sentences"],
        parts["paragraphs"],
        parts["document_starts"],
        parts["document_numbers"],
        head.continues,
        Anchors(parts["anchor_tokens"], parts["anchor_characters"]),
    )


def append_block(store: Store, block: Block, types: UInt32Array | None = None) -> None:
    """Add the next block.

    Parameters
    ----------
    types : uint32 array, optional
        The types present, sorted; found here where not given.
    """
    if block.first_token != token_count(store):
        raise UsageError(f"{store.path}: block {block.number} does not follow the one before it")
    present = _present(block.tokens) if types is None else types
    values = (
        block.number,
        *(block.first_token, len(block.tokens), int(block.continues), _head_checksum(block.head)),
        packing.pack(present.astype(np.uint32, copy=False), ascending=True),
        *_packed_offsets(block),
        packing.pack(block.tokens.astype(np.uint32, copy=False)),
    )
    columns = ", ".join(_OFFSETS)
    store.execute(
        f"INSERT INTO blocks (id, first_token, n_tokens, continues, head_checksum, types, {columns}, tokens) "
        "VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
        values,
    )


def block_types(store: Store, number: int) -> UInt32Array:
    """Types present in a block, sorted; what tells which blocks need reading for a rare word."""
    what = f"{_name(store, number)}, types"
    return packing.unpack_as(store.value("SELECT types FROM blocks WHERE id = ?", (number,)), np.uint32, what)


def blank_documents(store: Store, numbers: Sequence[int]) -> None:
    """Overwrite the tokens of documents with NO_TERM; each block that holds some is rewritten once."""
    places = {}
    for number in numbers:
        row = store.row("SELECT first_token, first_token + n_tokens FROM documents WHERE id = ?", (number,))
        if row is None:
            raise UsageError(f"{store.path}: no document {number}")
        places[number] = row
    by_start = sorted((start, stop, number) for number, (start, stop) in places.items())
    starts = [start for start, _, _ in by_start]
    stops = [stop for _, stop, _ in by_start]  # ascending as well: documents do not overlap
    for head in block_heads(store):
        # Borders belong to both sides: a document without tokens is listed in one of them.
        here = slice(bisect_left(stops, head.first_token), bisect_right(starts, head.first_token + head.n_tokens))
        if by_start[here]:
            _blank_block(store, head.number, by_start[here])


def _blank_block(store: Store, number: int, gone: Sequence[tuple[int, int, int]]) -> None:
    """Blank documents, given as (start, stop, number), in one block."""
    block = read_block(store, number)
    blank = np.zeros(len(block.tokens), dtype=bool)
    for start, stop, _ in gone:
        blank[max(start - block.first_token, 0) : max(stop - block.first_token, 0)] = True
    numbers = np.where(np.isin(block.document_numbers, [one for _, _, one in gone]), -1, block.document_numbers)
    tokens = np.where(blank, NO_TERM, block.tokens)
    store.execute(
        "UPDATE blocks SET types = ?, document_numbers = ?, tokens = ? WHERE id = ?",
        (
            packing.pack(_present(tokens), ascending=True),
            packing.pack(numbers, compress=True),
            packing.pack(tokens),
            number,
        ),
    )
    for name in column_names(store, number):
        values = read_column(store, number, name).copy()
        values[blank] = 0
        append_column(store, number, name, values)


def append_column(store: Store, block: int, name: str, array: NDArray[Any]) -> None:
    """Keep a column of annotation beside a block: an integer for each token."""
    packed = packing.pack(array, compress=True)
    store.execute("INSERT OR REPLACE INTO block_columns VALUES (?, ?, ?)", (block, name, packed))


def read_column(store: Store, block: int, name: str) -> NDArray[Any]:
    """A column of a block; UsageError where the text was not annotated so."""
    data = store.value("SELECT data FROM block_columns WHERE block = ? AND name = ?", (block, name))
    if data is None:
        raise UsageError(f"{store.path}: its text carries no {name!r}; build it from annotated text")
    return packing.unpack(data, f"{_name(store, block)}, column {name}")


def column_names(store: Store, block: int) -> list[str]:
    """Columns of annotation that a block has, sorted."""
    return [name for (name,) in store.rows("SELECT name FROM block_columns WHERE block = ? ORDER BY name", (block,))]


def _packed_offsets(block: Block) -> tuple[bytes, ...]:
    ascending = (block.sentences, block.paragraphs, block.document_starts)
    return (
        *(packing.pack(array.astype(np.int64, copy=False), ascending=True) for array in ascending),
        packing.pack(block.document_numbers.astype(np.int64, copy=False), compress=True),
        packing.pack(block.anchors.tokens.astype(np.int64, copy=False), ascending=True),
        packing.pack(block.anchors.characters.astype(np.int64, copy=False), ascending=True),
    )


def _present(tokens: UInt32Array) -> UInt32Array:
    present: UInt32Array = np.unique(tokens[tokens != NO_TERM])
    return present


def _head_checksum(head: BlockHead) -> int:
    return packing.checksum(_HEAD.pack(head.number, head.first_token, head.n_tokens, int(head.continues)))


def _name(store: Store, number: int) -> str:
    return f"{store.path}: block {number} of the token stream"
