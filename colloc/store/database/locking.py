"""One writer at a time: a lock file beside the store, and a row that says who holds it.

The lock is the operating system's (it ends with its process, however that
dies); the row in ``facts`` only serves the message to the one who waits.
"""

from __future__ import annotations

import json
import os
import sqlite3
import time
from pathlib import Path

from colloc.errors import CannotCreateError, LockedError

HOLDER_FACT = "writer"


def process_lives(pid: int) -> bool:
    """Whether a process of this number exists, ours or another user's."""
    if pid <= 0:
        return False
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    except PermissionError:
        return True
    return True


class WriterLock:
    """The right to write to one store.

    Parameters
    ----------
    path : Path
        The store. The lock file is ``path`` with ``.lock`` appended.
    """

    def __init__(self, path: Path) -> None:
        from filelock import FileLock

        self.path = path
        self._file = Path(f"{path}.lock")
        self._lock = FileLock(self._file, thread_local=False)

    def acquire(self, wait: float) -> None:
        """Take the lock within ``wait`` seconds, or raise LockedError naming the holder."""
        from filelock import Timeout

        try:
            self._lock.acquire(timeout=wait, poll_interval=0.05)
        except Timeout as error:
            raise LockedError(f"{self.path}: {_holder(self.path)}; waited {wait:g} s, try again later") from error
        except OSError as error:
            raise CannotCreateError(f"{self._file}: cannot be created ({error}); writing needs it") from error

    def tell_holder(self, connection: sqlite3.Connection, purpose: str) -> None:
        """Note who writes; replaces what a killed writer left."""
        holder = json.dumps({"pid": os.getpid(), "purpose": purpose, "since": int(time.time())})
        connection.execute("INSERT OR REPLACE INTO facts VALUES (?, ?)", (HOLDER_FACT, holder))

    def forget_holder(self, connection: sqlite3.Connection) -> None:
        """Take the note away; a failure is of no account, since a dead holder's note is ignored."""
        try:
            if connection.in_transaction:
                connection.rollback()
            connection.execute("DELETE FROM facts WHERE key = ?", (HOLDER_FACT,))
        except sqlite3.Error:
            return

    def release(self) -> None:
        """Give the lock back. The empty file stays: removing it could give two who wait for it the same right."""
        self._lock.release()


def _holder(path: Path) -> str:
    """Who writes, as far as can be told from the store."""
    unknown = "another process is writing"
    try:
        connection = sqlite3.connect(f"{path.absolute().as_uri()}?mode=ro", uri=True, timeout=1.0)
        try:
            row = connection.execute("SELECT value FROM facts WHERE key = ?", (HOLDER_FACT,)).fetchone()
        finally:
            connection.close()
        holder = json.loads(row[0])
        pid, purpose, since = int(holder["pid"]), str(holder["purpose"]), float(holder["since"])
    except (sqlite3.Error, TypeError, ValueError, KeyError):
        return unknown
    if not process_lives(pid):
        return unknown
    return f"process {pid} is writing ({purpose}, for {max(0, time.time() - since):.0f} s)"
