"""Documents: who they are, where their tokens and characters lie."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterable, Iterator, Sequence
from typing import Any

import numpy as np

from colloc.errors import DataError, NotSeenError, StoreDamagedError
from colloc.records import DocumentRow, Int64Array
from colloc.store import annotation, facts, stream, texts
from colloc.store.connection import Store

_BATCH = 500
"""Numbers that one statement asks for; SQLite allows 999 and more."""
_COLUMNS = "id, identifier, source, record, first_token, n_tokens, first_character, n_characters, metadata"


def append_documents(store: Store, rows: Iterable[DocumentRow]) -> None:
    """Add documents; DataError where an identifier is taken."""
    rows = list(rows)
    try:
        store.execute_many(
            f"INSERT INTO documents ({_COLUMNS}) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?)", (_as_tuple(row) for row in rows)
        )
    except sqlite3.IntegrityError as error:
        taken = [row.identifier for row in rows if find_document(store, row.identifier) is not None]
        repeated = {row.identifier for row in rows if sum(row.identifier == other.identifier for other in rows) > 1}
        name = (taken or sorted(repeated) or [str(error)])[0]
        raise DataError(f"document {name!r} is in the store already; identifiers must differ") from error
    except UnicodeEncodeError as error:
        raise DataError(f"an identifier or metadata holds half a surrogate pair: {error.object!a}") from error


def next_document(store: Store) -> int:
    """The number for the next document; numbers of removed ones are not given again."""
    last = store.value("SELECT seq FROM sqlite_sequence WHERE name = 'documents'")
    return 0 if last is None else int(last) + 1


def document(store: Store, number: int) -> DocumentRow:
    """One document; NotSeenError where there is none."""
    row = store.row(f"SELECT {_COLUMNS} FROM documents WHERE id = ?", (number,))
    if row is None:
        raise NotSeenError(f"{store.path}: no document {number}")
    return _as_row(store, row)


def token_places(store: Store, numbers: Int64Array) -> tuple[Int64Array, Int64Array]:
    """First token and number of tokens of some documents, in their order; NotSeenError where one is not there."""
    found: dict[int, tuple[int, int]] = {}
    wanted = numbers.tolist()
    for start in range(0, len(wanted), _BATCH):
        batch = wanted[start : start + _BATCH]
        marks = ", ".join("?" * len(batch))
        rows = store.rows(f"SELECT id, first_token, n_tokens FROM documents WHERE id IN ({marks})", batch)
        found.update((number, (first, n_tokens)) for number, first, n_tokens in rows)
    missing = [number for number in wanted if number not in found]
    if missing:
        raise NotSeenError(f"{store.path}: no document {missing[0]}")
    places = np.array([found[number] for number in wanted], dtype=np.int64).reshape(-1, 2)
    return places[:, 0], places[:, 1]


def document_spans(store: Store) -> tuple[Int64Array, Int64Array, Int64Array]:
    """Number, first token and number of tokens of all documents that readers see, by number."""
    rows = store.rows("SELECT id, first_token, n_tokens FROM documents WHERE id < ? ORDER BY id", (visible_end(store),))
    numbers, firsts, lengths = np.array(rows, dtype=np.int64).reshape(-1, 3).T
    return numbers, firsts, lengths


def iterate_documents(store: Store) -> Iterator[DocumentRow]:
    """All documents that readers see, by number."""
    for row in store.iterate(f"SELECT {_COLUMNS} FROM documents WHERE id < ? ORDER BY id", (visible_end(store),)):
        yield _as_row(store, row)


def find_document(store: Store, identifier: str) -> int | None:
    """The number of a document, or None."""
    found = store.value("SELECT id FROM documents WHERE identifier = ?", (identifier,))
    return None if found is None else int(found)


def visible_end(store: Store) -> int:
    """Documents below this number are counted and seen by readers; those from it on are still being added."""
    mark = facts.get(store, "counted", None)
    return int(json.loads(mark)["documents"]) if mark is not None else 0


def document_count(store: Store) -> int:
    """How many documents readers see."""
    return int(store.value("SELECT count(*) FROM documents WHERE id < ?", (visible_end(store),)))


def remove_documents(store: Store, numbers: Sequence[int]) -> None:
    """Delete documents: their rows, texts and tokens, overwritten on the disk as well.

    Tallies and word counts are the caller's to change first, while the tokens can still be read.
    """
    rows = [document(store, number) for number in numbers]
    with store.transaction():
        stream.blank_documents(store, numbers)
        texts.blank_texts(store, ((row.first_character, row.first_character + row.n_characters) for row in rows))
        gone = [(number,) for number in numbers]
        store.execute_many("DELETE FROM content_hashes WHERE document = ?", gone)
        annotation.remove_rests(store, numbers)
        store.execute_many("DELETE FROM documents WHERE id = ?", gone)


def remove_document(store: Store, number: int) -> None:
    """Delete one document; see :func:`remove_documents`."""
    remove_documents(store, [number])


def _as_tuple(row: DocumentRow) -> tuple[Any, ...]:
    metadata = json.dumps(dict(row.metadata), ensure_ascii=False, sort_keys=True, allow_nan=False)
    where = (row.first_token, row.n_tokens, row.first_character, row.n_characters)
    return (row.number, row.identifier, row.source, row.record, *where, metadata)


def _as_row(store: Store, row: Any) -> DocumentRow:
    try:
        metadata = json.loads(row[8])
    except (TypeError, ValueError) as error:
        raise StoreDamagedError(f"{store.path}: the metadata of document {row[0]} is not JSON") from error
    number, identifier, source, record, first_token, n_tokens, first_character, n_characters = row[:8]
    return DocumentRow(
        number, identifier, source, record, first_token, n_tokens, first_character, n_characters, metadata
    )
