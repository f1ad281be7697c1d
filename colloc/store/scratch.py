"""Temporary folders of a writer, named after its process and removed on every exit."""

from __future__ import annotations

import os
import re
import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from colloc.errors import CannotCreateError
from colloc.store.database.locking import process_lives


@contextmanager
def scratch_folder(store_path: str | os.PathLike[str], temp: str | os.PathLike[str] | None = None) -> Iterator[Path]:
    """A folder ``STORE.tmp-PID-...`` beside the store, or in ``temp``, gone afterwards.

    Raises
    ------
    CannotCreateError
        The place cannot be written.
    """
    store_path = Path(store_path).absolute()
    place = Path(temp).absolute() if temp is not None else store_path.parent
    try:
        folder = Path(tempfile.mkdtemp(prefix=f"{store_path.name}.tmp-{os.getpid()}-", dir=place))
    except OSError as error:
        raise CannotCreateError(f"{place}: no temporary folder can be made here ({error.strerror})") from error
    try:
        yield folder
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def place_for_readers(store_path: str | os.PathLike[str], temp: str | os.PathLike[str] | None = None) -> Path:
    """Where one who only reads a store makes temporary files.

    ``temp`` where it is given, else beside the store, or in the system's folder for temporary files where the store's
    own folder cannot be written.
    """
    if temp is not None:
        return Path(temp)
    beside = Path(store_path).absolute().parent
    return beside if os.access(beside, os.W_OK) else Path(tempfile.gettempdir())


def clean_leftovers(store_path: str | os.PathLike[str], temp: str | os.PathLike[str] | None = None) -> list[Path]:
    """Remove the folders of processes that no longer live; returns what was removed."""
    store_path = Path(store_path).absolute()
    place = Path(temp).absolute() if temp is not None else store_path.parent
    pattern = re.compile(re.escape(store_path.name) + r"\.tmp-(\d+)-[a-z0-9_]+")
    removed = []
    for folder in sorted(place.iterdir()):
        match = pattern.fullmatch(folder.name)
        if match and folder.is_dir() and not folder.is_symlink() and not process_lives(int(match[1])):
            shutil.rmtree(folder, ignore_errors=True)
            removed.append(folder)
    return removed
