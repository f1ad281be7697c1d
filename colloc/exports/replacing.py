"""Output files that are whole or not there: written beside the target, then renamed onto it."""

from __future__ import annotations

import contextlib
import os
import stat
import tempfile
from collections.abc import Iterator
from pathlib import Path
from typing import BinaryIO

from colloc.errors import CannotCreateError


def check_folder(path: Path) -> None:
    """Raise CannotCreateError where the folder that ``path`` would stand in is missing: before any work for it."""
    try:
        os.stat(Path(os.path.realpath(path)).parent)
    except OSError as error:
        raise _refused(path, error) from error


@contextlib.contextmanager
def replacing(path: Path) -> Iterator[BinaryIO]:
    """Open ``path`` for writing bytes; the old file stays until the new one is complete.

    On any error the old file is left as it was and no half-written file remains.
    Devices and named pipes are written to directly, since they cannot be renamed onto.

    Raises
    ------
    CannotCreateError
        Where the folder is missing, or the file or folder cannot be written.
    """
    target = Path(os.path.realpath(path))
    try:
        mode = target.stat().st_mode
    except FileNotFoundError:
        mode = stat.S_IFREG | (0o666 & ~_umask())
    except OSError as error:
        raise _refused(path, error) from error
    if stat.S_ISDIR(mode):
        raise CannotCreateError(f"cannot write {path}: it is a folder; name a file")
    if not stat.S_ISREG(mode):
        with _opened_directly(path) as stream:
            yield stream
        return
    try:
        handle, name = tempfile.mkstemp(dir=target.parent, prefix=f".{target.name[:100]}.", suffix=".part")
    except OSError as error:
        raise _refused(path, error) from error
    try:
        with os.fdopen(handle, "wb") as stream:
            yield stream
            os.fchmod(stream.fileno(), stat.S_IMODE(mode))
            stream.flush()
            os.fsync(stream.fileno())
        os.replace(name, target)
    except BaseException:
        with contextlib.suppress(FileNotFoundError):
            os.unlink(name)
        raise


def _opened_directly(path: Path) -> BinaryIO:
    try:
        return open(path, "wb", buffering=0)
    except OSError as error:
        raise _refused(path, error) from error


def _refused(path: Path, error: OSError) -> CannotCreateError:
    return CannotCreateError(f"cannot write {path}: {error.strerror}; choose another place with -o")


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask
