"""Content hashes of what is in the store, so that exact repeats can be dropped."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable
from pathlib import Path
from typing import Self

from colloc.store.connection import Store


def remember(store: Store, document: int, digests: Iterable[bytes]) -> None:
    """Store hashes with the document whose text they are of, inside the caller's transaction."""
    rows = [(digest, document) for digest in digests]
    if rows:
        store.execute_many("INSERT OR IGNORE INTO content_hashes VALUES (?, ?)", rows)


class SeenHashes:
    """The stored hashes and those met since, in a scratch database: any number in bounded memory.

    Parameters
    ----------
    folder : Path
        For the scratch database; removed by whoever made the folder.
    """

    def __init__(self, store: Store, folder: Path) -> None:
        self._connection = sqlite3.connect(folder / "seen", isolation_level=None)
        self._connection.execute("PRAGMA journal_mode = OFF")
        self._connection.execute("PRAGMA synchronous = OFF")
        self._connection.execute("CREATE TABLE seen (digest BLOB PRIMARY KEY) WITHOUT ROWID")
        self._connection.execute("BEGIN")
        stored = store.iterate("SELECT digest FROM content_hashes ORDER BY digest")
        self._connection.executemany("INSERT INTO seen VALUES (?)", stored)

    def add(self, digest: bytes) -> bool:
        """Remember a hash; False when it was there already."""
        return self._connection.execute("INSERT OR IGNORE INTO seen VALUES (?)", (digest,)).rowcount == 1

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        self._connection.close()
