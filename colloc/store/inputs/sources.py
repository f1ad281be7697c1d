"""Provenance: which inputs went in, and how far each has been read."""

from __future__ import annotations

from dataclasses import dataclass

from colloc.records import SourceInfo
from colloc.store import facts
from colloc.store.connection import Store

_ENCODING = "encoding:"
"""Before a source's name: the fact that holds its detected encoding."""
_COLUMNS = (
    "id, name, size, modified, digest, records, finished, "
    f"(SELECT value FROM facts WHERE key = '{_ENCODING}' || sources.name)"
)


@dataclass(frozen=True, slots=True)
class SourceRow:
    """One input as the store keeps it.

    Attributes
    ----------
    digest : str or None
        blake2b-128 of the raw bytes, known once the source was read to its end.
    records : int
        Documents finished so far: where a resumed build goes on.
    encoding : str or None
        The encoding that was detected; None where it was named.
    """

    number: int
    info: SourceInfo
    digest: str | None
    records: int
    finished: bool
    encoding: str | None = None


def add_source(store: Store, info: SourceInfo) -> int:
    """The number of a source, which is entered if it is new; an unfinished one keeps its records."""
    found = find_source(store, info.name)
    if found is not None:
        store.execute(
            "UPDATE sources SET size = ?, modified = ? WHERE id = ?", (info.size, info.modified, found.number)
        )
        return found.number
    number = store.value("SELECT coalesce(max(id) + 1, 0) FROM sources")
    store.execute("INSERT INTO sources VALUES (?, ?, ?, ?, NULL, 0, 0)", (number, info.name, info.size, info.modified))
    return int(number)


def copy_source(store: Store, source: SourceRow) -> int:
    """Enter a source of another store, as finished; returns its number here."""
    number = add_source(store, source.info)
    store.execute(
        "UPDATE sources SET records = ?, digest = ?, finished = ? WHERE id = ?",
        (source.records, source.digest, int(source.finished), number),
    )
    note_encoding(store, source.info.name, source.encoding)
    return number


def note_records(store: Store, number: int, records: int) -> None:
    """Note how many documents of a source are in the store."""
    store.execute("UPDATE sources SET records = ? WHERE id = ?", (records, number))


def finish(store: Store, number: int, digest: str) -> None:
    """Note that a source was read to its end."""
    store.execute("UPDATE sources SET digest = ?, finished = 1 WHERE id = ?", (digest, number))


def note_encoding(store: Store, name: str, encoding: str | None) -> None:
    """Note which encoding was detected for a source, or that none was."""
    if encoding is None:
        facts.remove(store, _ENCODING + name)
    else:
        facts.put(store, _ENCODING + name, encoding)


def forget_emptied(store: Store) -> None:
    """Forget the sources of which no document is left, so that they can be read again."""
    store.execute("DELETE FROM sources WHERE records > 0 AND id NOT IN (SELECT source FROM documents)")
    forget_encodings(store)


def forget_encodings(store: Store) -> None:
    """Forget the encodings of sources that are gone: the name of a file may be private."""
    store.execute(
        "DELETE FROM facts WHERE key GLOB ? AND substr(key, ?) NOT IN (SELECT name FROM sources)",
        (f"{_ENCODING}*", len(_ENCODING) + 1),
    )


def find_source(store: Store, name: str) -> SourceRow | None:
    """A source by the name under which it was read."""
    row = store.row(f"SELECT {_COLUMNS} FROM sources WHERE name = ?", (name,))
    return None if row is None else _as_row(row)


def source_list(store: Store) -> list[SourceRow]:
    """All sources, in the order in which they were read."""
    return [_as_row(row) for row in store.rows(f"SELECT {_COLUMNS} FROM sources ORDER BY id")]


def _as_row(row: tuple[int, str, int, float, str | None, int, int, str | None]) -> SourceRow:
    number, name, size, modified, digest, records, finished, encoding = row
    return SourceRow(number, SourceInfo(name, size, modified), digest, records, bool(finished), encoding)
