"""Creating and opening stores; refusing files that are not ours, damaged or newer."""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Mapping
from pathlib import Path

from colloc.errors import CannotCreateError, DataError, InputOutputError, NoInputError
from colloc.store import scratch
from colloc.store.connection import Store, translated
from colloc.store.database import migrations, schema
from colloc.store.database.locking import WriterLock

__all__ = ["Store", "create", "open_for_reading", "open_for_writing"]

_BUSY_SECONDS = 10.0
_HEADER = b"SQLite format 3\x00"
_WRITER_CACHE = 64 * 2**20
"""Bytes of pages that a writer keeps in memory at most."""
SYNCHRONOUS = "FULL"
"""Each commit waits for the disk, so a power cut loses no finished one. NORMAL would be sound too, but
may lose the last commits; over 50 MB in one commit it saved nothing measurable (0.15 s against 0.16 s)."""


def create(path: str | os.PathLike[str], facts: Mapping[str, str], purpose: str = "create") -> Store:
    """Make a new store, open for writing.

    The file appears under its name only when its tables are complete.

    Raises
    ------
    CannotCreateError
        The path exists already, or its folder cannot be written.
    """
    path = Path(path)
    if not path.absolute().parent.is_dir():
        raise CannotCreateError(f"{path}: the folder {path.absolute().parent} does not exist; create it first")
    lock = WriterLock(path)
    lock.acquire(_BUSY_SECONDS)
    try:
        if path.exists():
            raise CannotCreateError(f"{path}: exists already; choose another name or remove it first")
        scratch.clean_leftovers(path)
        for companion in ("-wal", "-shm"):
            # Of a store that was removed without them: SQLite would take them for the new one's.
            Path(f"{path}{companion}").unlink(missing_ok=True)
        with scratch.scratch_folder(path) as folder:
            new = folder / "new"
            with translated(path):
                _lay_out(new, facts)
            try:
                os.replace(new, path)
                _sync_folder(path.absolute().parent)
            except OSError as error:
                raise CannotCreateError(f"{path}: cannot be created ({error})") from error
        return _writing(path, lock, purpose)
    except BaseException:
        lock.release()
        raise


def open_for_reading(path: str | os.PathLike[str], *, shared: bool = False) -> Store:
    """Open a store to read; works while another process writes, and where nothing can be written.

    All that is read is of the moment of opening, or of the last :meth:`Store.refresh`.

    Parameters
    ----------
    shared : bool
        Whether another thread than the one that opens it may close it.

    Raises
    ------
    NoInputError
        There is no such file.
    DataError
        Not a store, damaged, or made by a newer colloc.
    """
    path = Path(path)
    _check_header(path)
    with translated(path):
        connection = _connect(path, _reading_mode(path), shared)
        try:
            connection.execute("PRAGMA query_only = ON")
            if not _check_ours(connection, path).readable:
                raise DataError(f"{path}: made by an older colloc; a command that writes, such as add, renews it")
        except BaseException:
            connection.close()
            raise
    store = Store(path, connection)
    try:
        store.refresh()
    except BaseException:
        store.close()
        raise
    return store


def open_for_writing(path: str | os.PathLike[str], purpose: str, wait: float = 10.0) -> Store:
    """Open a store to write, as the only writer.

    Parameters
    ----------
    purpose : str
        A word or two for the message to others who want to write.
    wait : float
        Seconds to wait for another writer before LockedError.
    """
    path = Path(path)
    _check_header(path)
    lock = WriterLock(path)
    lock.acquire(wait)
    try:
        scratch.clean_leftovers(path)
        return _writing(path, lock, purpose)
    except BaseException:
        lock.release()
        raise


def _lay_out(new: Path, facts: Mapping[str, str]) -> None:
    connection = sqlite3.connect(new, isolation_level=None)
    try:
        connection.execute(f"PRAGMA page_size = {schema.PAGE_SIZE}")
        connection.execute("PRAGMA journal_mode = WAL")
        migrations.migrate(connection)
        connection.executemany("INSERT INTO facts VALUES (?, ?)", sorted(facts.items()))
        connection.execute("PRAGMA wal_checkpoint(TRUNCATE)")
    finally:
        connection.close()


def _writing(path: Path, lock: WriterLock, purpose: str) -> Store:
    with translated(path):
        connection = _connect(path, "mode=rw")
        try:
            complete = _check_ours(connection, path).complete
            connection.execute(f"PRAGMA synchronous = {SYNCHRONOUS}")
            connection.execute("PRAGMA secure_delete = ON")
            # Indexes of words grow at random places: with SQLite's usual 2 MB their pages go to the disk and back.
            connection.execute(f"PRAGMA cache_size = -{_WRITER_CACHE // 1024}")
            # Whole blocks and pages go through the write-ahead log: a checkpoint each 64 MB instead of each 16.
            connection.execute(f"PRAGMA wal_autocheckpoint = {64 * 2**20 // schema.PAGE_SIZE}")
            if not complete:
                migrations.migrate(connection)
            lock.tell_holder(connection, purpose)
        except BaseException:
            connection.close()
            raise
    return Store(path, connection, lock)


def _check_header(path: Path) -> None:
    """Refuse what is not an SQLite file before SQLite touches it."""
    try:
        with path.open("rb") as file:
            header = file.read(len(_HEADER))
    except FileNotFoundError as error:
        raise NoInputError(f"{path}: no such store; make it with `colloc build {path} INPUT...`") from error
    except IsADirectoryError as error:
        raise NoInputError(f"{path}: a folder, not a store") from error
    except OSError as error:
        raise InputOutputError(f"{path}: cannot be read ({error.strerror})") from error
    if header != _HEADER:
        raise DataError(f"{path}: not a colloc store (not an SQLite file)")


def _check_ours(connection: sqlite3.Connection, path: Path) -> migrations.Applied:
    """How far the schema has come; DataError where the file is not ours or newer."""
    if connection.execute("PRAGMA application_id").fetchone()[0] != schema.APPLICATION_ID:
        raise DataError(f"{path}: an SQLite file, but not a colloc store")
    return migrations.check_applied(connection, str(path))


def _reading_mode(path: Path) -> str:
    """How SQLite is to open the file.

    Where it may write, it keeps its shared-memory file beside the store and
    tidies it away (``mode=rw``; ``query_only`` then forbids changes). Where
    it may not and no writer has left a log, the file cannot change (``immutable``).
    """
    if os.access(path, os.W_OK) and os.access(path.absolute().parent, os.W_OK):
        return "mode=rw"
    if Path(f"{path}-wal").exists():
        return "mode=ro"
    return "mode=ro&immutable=1"


def _connect(path: Path, mode: str, shared: bool = False) -> sqlite3.Connection:
    # as_uri quotes `?`, `#` and `%` in file names, which would otherwise be read as options.
    uri = f"{path.absolute().as_uri()}?{mode}"
    return sqlite3.connect(uri, uri=True, isolation_level=None, timeout=_BUSY_SECONDS, check_same_thread=not shared)


def _sync_folder(folder: Path) -> None:
    """Make a rename last through a power cut (a folder cannot be synced on Windows, where it is not needed)."""
    if os.name != "posix":
        return
    descriptor = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)
