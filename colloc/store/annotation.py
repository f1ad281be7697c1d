"""Annotation that is no number of a word: values of columns, and what of a document fits in no column.

Columns of blocks (:func:`colloc.store.stream.append_column`) hold numbers;
what they stand for is listed here, once for the whole store. The rest of a
document (comments, multiword tokens, empty nodes, columns of free text) is kept
by block, so that the document can be written out as it was read.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import accumulate, pairwise
from typing import Any

import numpy as np

from colloc.errors import StoreDamagedError
from colloc.records import Int64Array, UInt32Array
from colloc.store.connection import Store
from colloc.store.database import packing
from colloc.store.stream import Block, column_names, read_column

HEAD, RELATION = "head", "relation"
"""Columns of a block: words from each word to its head (0: none), and the number of its relation."""
STEP, WIDTH = "step", "width"
"""Columns of a block: code points from the start of the word before to the word's own, and its length."""
VALUED = (RELATION, "xpos", "feats")
"""Columns whose numbers stand for values."""
NOTHING = "_"
"""Stands for a field that is not specified."""


@dataclass(frozen=True, slots=True)
class Rest:
    """What a document, or the part of it in one block, holds besides types and columns.

    Words are counted from the part's first.

    Attributes
    ----------
    columns : tuple of str
        Columns of the lines as they were read, in order.
    texts : dict of str
        Fields of columns that are kept as text, joined by line feeds, a field a word; columns without any are left out.
    before, after : list of (int, str)
        Whole lines that are not words, with the word before or after which they stand.
    changed : list of (int, str, str)
        Word, column and field, where types and columns of numbers do not give the field back.
    """

    columns: tuple[str, ...]
    texts: dict[str, str] = field(default_factory=dict)
    before: list[tuple[int, str]] = field(default_factory=list)
    after: list[tuple[int, str]] = field(default_factory=list)
    changed: list[tuple[int, str, str]] = field(default_factory=list)


@dataclass(frozen=True, slots=True)
class OtherLines:
    """Whole lines that are not words: the word beside which each stands, and all of them in UTF-8, ended by LF."""

    words: list[int]
    lines: bytes


def pack_rest(
    columns: Sequence[str],
    texts: Mapping[str, bytes],
    before: OtherLines,
    after: OtherLines,
    changed: Sequence[tuple[int, str, str]],
) -> bytes:
    """A rest as it is stored (see :class:`Rest`; texts in UTF-8): what worker processes do.

    A line of JSON that says what follows, then the texts of the columns and the lines before and after words.
    """
    parts = [*texts.values(), before.lines, after.lines]
    head = {
        "columns": columns,
        "texts": [*texts],
        "before": before.words,
        "after": after.words,
        "changed": changed,
        "sizes": [*map(len, parts)],
    }
    told = json.dumps(head, ensure_ascii=False).encode("utf-8", "surrogatepass")
    return packing.pack_bytes(b"\n".join((told, b"".join(parts))))


def append_rests(store: Store, rows: Sequence[tuple[int, int, bytes]]) -> None:
    """Keep packed rests: document, block, bytes."""
    store.execute_many("INSERT INTO annotation_rests VALUES (?, ?, ?)", rows)


def read_rests(store: Store, document: int) -> Iterator[tuple[int, Rest]]:
    """Blocks of a document with what is kept of it there, in order; nothing for plain text.

    Raises
    ------
    StoreDamagedError
        What is kept does not verify.
    """
    if not _is_there(store, "annotation_rests"):
        return
    sql = "SELECT block, data FROM annotation_rests WHERE document = ? ORDER BY block"
    for block, data in store.rows(sql, (document,)):
        what = f"{store.path}: annotation of document {document} in block {block}"
        try:
            yield block, _as_rest(packing.unpack_bytes(data, what))
        except (ValueError, TypeError, KeyError, AttributeError) as error:
            raise StoreDamagedError(f"{what}: cannot be read ({error})") from error


def _as_rest(data: bytes) -> Rest:
    told, divider, body = data.partition(b"\n")
    values: dict[str, Any] = json.loads(_text(told))
    columns, changed = tuple(values["columns"]), [(word, column, text) for word, column, text in values["changed"]]
    if not divider:
        # The first layout: one JSON object.
        before, after = ([(word, line) for word, line in values[name]] for name in ("before", "after"))
        return Rest(columns, dict(values["texts"]), before, after, changed)
    ends = [*accumulate(values["sizes"])]
    if ends[-1] != len(body):
        raise ValueError(f"{len(body)} bytes instead of {ends[-1]}")
    *texts, before_lines, after_lines = (_text(body[start:end]) for start, end in pairwise([0, *ends]))
    return Rest(
        columns,
        dict(zip(values["texts"], texts, strict=True)),
        [*zip(values["before"], before_lines.split("\n")[:-1], strict=True)],
        [*zip(values["after"], after_lines.split("\n")[:-1], strict=True)],
        changed,
    )


def _text(data: bytes) -> str:
    return data.decode("utf-8", "surrogatepass")


def copy_rests(store: Store, other: Store, block: int, new_block: int, documents: dict[int, int]) -> None:
    """Carry the rests of a block over from another store, under the documents' new numbers."""
    if _is_there(other, "annotation_rests"):
        rows = other.rows("SELECT document, data FROM annotation_rests WHERE block = ?", (block,))
        append_rests(store, [(documents[number], new_block, data) for number, data in rows if number in documents])


def remove_rests(store: Store, documents: Sequence[int]) -> None:
    """Delete what is kept of documents."""
    store.execute_many("DELETE FROM annotation_rests WHERE document = ?", [(number,) for number in documents])


def number_values(store: Store, column: str, texts: Sequence[str]) -> UInt32Array:
    """Numbers of the values of a column, looked up or added, inside the caller's transaction."""
    known = {text: number for number, text in enumerate(values_of(store, column))}
    fresh = [text for text in dict.fromkeys(texts) if text not in known]
    rows = [(column, len(known) + number, text) for number, text in enumerate(fresh)]
    store.execute_many("INSERT INTO annotation_values VALUES (?, ?, ?)", rows)
    known.update((text, number) for _, number, text in rows)
    return np.array([known[text] for text in texts], np.uint32)


def values_of(store: Store, column: str) -> list[str]:
    """What the numbers of a column stand for, in order; none where the store holds no annotated text."""
    if not _is_there(store, "annotation_values"):
        return []
    rows = store.rows("SELECT id, value FROM annotation_values WHERE name = ? ORDER BY id", (column,))
    if [number for number, _ in rows] != [*range(len(rows))]:
        raise StoreDamagedError(f"{store.path}: values of column {column} are missing")
    return [text for _, text in rows]


def word_places(store: Store, block: Block, first: int, stop: int, character: int) -> tuple[Int64Array, Int64Array]:
    """Where annotated words stand in the text.

    Parameters
    ----------
    first, stop : int
        Offsets of words in the block, of one document.
    character : int
        Where the first of them stands in the text of the store.

    Returns
    -------
    starts, ends : int64 arrays, shape (stop - first,)
        Code points in the text of the store.
    """
    steps = read_column(store, block.number, STEP)[first:stop].astype(np.int64)
    widths = read_column(store, block.number, WIDTH)[first:stop].astype(np.int64)
    starts: Int64Array = character + np.cumsum(steps) - steps[:1].sum()
    return starts, starts + widths


def tells_places(store: Store, block: int) -> bool:
    """Whether a block's words were read as words, and have their places in the text beside them."""
    return STEP in column_names(store, block)


def _is_there(store: Store, table: str) -> bool:
    """Stores of older versions do not have these tables."""
    return store.value("SELECT 1 FROM sqlite_master WHERE type = 'table' AND name = ?", (table,)) is not None
