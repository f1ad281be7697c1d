"""One connection to a store: transactions, and SQLite's errors in our words."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from colloc.errors import CannotCreateError, CollocError, InputOutputError, LockedError, StoreDamagedError
from colloc.store.database.locking import WriterLock

_FULL = {sqlite3.SQLITE_FULL}
_BUSY = {sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED}
_READ_ONLY = {sqlite3.SQLITE_READONLY, sqlite3.SQLITE_PERM}
_DAMAGED = {sqlite3.SQLITE_CORRUPT, sqlite3.SQLITE_NOTADB, sqlite3.SQLITE_FORMAT}
_INPUT_OUTPUT = {sqlite3.SQLITE_IOERR, sqlite3.SQLITE_CANTOPEN}
_ROWS_AT_ONCE = 32
_DAMAGE_TEXTS = ("no such table", "no such column", "malformed")


def in_our_words(error: sqlite3.Error, path: Path) -> CollocError | None:
    """The error a user should see for SQLite's; None where it is a mistake of ours and must surface."""
    code = getattr(error, "sqlite_errorcode", 0) & 0xFF  # without the extended part
    if code in _FULL:
        return InputOutputError(f"{path}: the disk is full; free some space and run the same command again")
    if code in _BUSY:
        return LockedError(f"{path}: another process is writing; try again")
    if code in _READ_ONLY:
        return CannotCreateError(f"{path}: cannot be written ({error}); check its permissions and those of its folder")
    if code in _INPUT_OUTPUT:
        return InputOutputError(f"{path}: the system could not read or write ({error})")
    if code in _DAMAGED or any(text in str(error) for text in _DAMAGE_TEXTS):
        return StoreDamagedError(f"{path}: damaged ({error}); run `colloc check` to see what can be saved")
    return None


@contextmanager
def translated(path: Path) -> Iterator[None]:
    """Turns SQLite's errors into ours, in this one place."""
    try:
        yield
    except sqlite3.Error as error:
        ours = in_our_words(error, path)
        if ours is None:
            raise
        raise ours from error


def sqlite_version() -> str:
    """Version of the SQLite library in use."""
    return sqlite3.sqlite_version


class Store:
    """An open store. All SQL of the package runs through these methods.

    Attributes
    ----------
    path : Path
    connection : sqlite3.Connection
        In autocommit mode; writing goes inside :meth:`transaction`.
    writable : bool
    """

    def __init__(self, path: Path, connection: sqlite3.Connection, lock: WriterLock | None = None) -> None:
        self.path = path
        self.connection = connection
        self.writable = lock is not None
        self._lock = lock

    def execute(self, sql: str, parameters: Sequence[Any] = ()) -> sqlite3.Cursor:
        """Run one statement."""
        with translated(self.path):
            return self.connection.execute(sql, parameters)

    def execute_many(self, sql: str, rows: Iterable[Sequence[Any]]) -> None:
        """Run one statement for many rows."""
        with translated(self.path):
            self.connection.executemany(sql, rows)

    def insert_columns(self, table: str, columns: Sequence[Sequence[Any]]) -> None:
        """Insert rows given as columns, all of a table's, of equal length.

        Several rows go into one statement, which halves the time of inserting short rows one by one.
        """
        width, n = len(columns), len(columns[0])
        flat: list[Any] = [None] * (width * n)
        for position, column in enumerate(columns):
            flat[position::width] = column
        row = f"({', '.join('?' * width)})"
        whole = n - n % _ROWS_AT_ONCE
        for rows, start, stop in ((_ROWS_AT_ONCE, 0, whole), (1, whole, n)):
            step = width * rows
            sql = f"INSERT INTO {table} VALUES {', '.join([row] * rows)}"
            self.execute_many(sql, (flat[place : place + step] for place in range(width * start, width * stop, step)))

    def rows(self, sql: str, parameters: Sequence[Any] = ()) -> list[Any]:
        """All rows of a query."""
        with translated(self.path):
            return self.connection.execute(sql, parameters).fetchall()

    def row(self, sql: str, parameters: Sequence[Any] = ()) -> Any:
        """The first row, or None."""
        with translated(self.path):
            return self.connection.execute(sql, parameters).fetchone()

    def value(self, sql: str, parameters: Sequence[Any] = ()) -> Any:
        """The first column of the first row, or None."""
        row = self.row(sql, parameters)
        return None if row is None else row[0]

    def iterate(self, sql: str, parameters: Sequence[Any] = (), batch: int = 1000) -> Iterator[Any]:
        """The rows of a query, some at a time; the table must not be written meanwhile."""
        with translated(self.path):
            cursor = self.connection.execute(sql, parameters)
            while rows := cursor.fetchmany(batch):
                yield from rows

    @contextmanager
    def transaction(self) -> Iterator[None]:
        """All that is written inside is committed together, or not at all.

        Inside another transaction it joins that one.
        """
        if self.connection.in_transaction:
            yield
            return
        self.execute("BEGIN IMMEDIATE")
        try:
            yield
            self.execute("COMMIT")
        except BaseException:
            # SQLite may have rolled back on its own (disk full); a second rollback would hide the first error.
            if self.connection.in_transaction:
                self.connection.rollback()
            raise

    def refresh(self) -> None:
        """Let a reader see the last commit; between two calls everything it reads is of one moment.

        A writer always sees its own last commit.
        """
        if self.writable:
            return
        if self.connection.in_transaction:
            self.execute("COMMIT")
        self.execute("BEGIN")
        # SQLite fixes the moment at the first read.
        self.rows("SELECT count(*) FROM sqlite_schema")

    def make_durable(self) -> None:
        """Move every commit into the main file and wait until the disk has it.

        Each commit is on the disk when it returns (synchronous FULL); this makes
        the one file complete without its ``-wal`` companion, so that it can be
        copied. Where a reader is at work for longer than half a second, the companion stays.

        Raises
        ------
        InputOutputError
            Where the main file cannot take it, as on a full disk: every commit is kept in the companion then.
        """
        with translated(self.path):
            (patience,) = self.connection.execute("PRAGMA busy_timeout").fetchone()
            self.connection.execute("PRAGMA busy_timeout = 500")
        try:
            self.connection.execute("PRAGMA wal_checkpoint(TRUNCATE)").fetchall()
        except sqlite3.Error as error:
            if in_our_words(error, self.path) is None:
                raise
            raise InputOutputError(
                f"{self.path}: all is done and kept, but in {self.path.name}-wal, as {self.path.name} could not take "
                f"it ({error}); do not run the command again: keep both files together and free some space, and the "
                "next command that writes here joins them"
            ) from error
        finally:
            self.execute(f"PRAGMA busy_timeout = {patience}")

    def close(self) -> None:
        """Close the connection and give the writer lock back."""
        try:
            if self._lock is not None:
                self._lock.forget_holder(self.connection)
            with translated(self.path):
                self.connection.close()
        finally:
            if self._lock is not None:
                self._lock.release()
                self._lock = None

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, traceback: TracebackType | None
    ) -> None:
        self.close()
