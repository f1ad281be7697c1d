"""Columns of temporary files with an entry for each place of a selection, written share by share."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.counts.runs import Column, write_column
from colloc.errors import InputOutputError
from colloc.records import NO_TERM, UInt32Array, UInt64Array

NONE = NO_TERM
"""Stands where no frequent sequence begins."""
_LEFT = np.uint64(32)
_RIGHT_MASK = np.uint64(0xFFFFFFFF)


def reserve(path: Path, kind: str, n: int) -> Column:
    """A column of ``n`` entries, all 0, for several processes to fill in."""
    column = write_column(path, np.zeros(0, np.dtype(kind)))
    try:
        with path.open("r+b") as file:
            file.truncate(n * np.dtype(kind).itemsize)
    except OSError as error:
        raise _full(path, error) from error
    return Column(column.path, column.kind, n)


def fill(column: Column, begin: int, values: NDArray[Any]) -> None:
    """Write the entries from ``begin`` on."""
    kind = np.dtype(column.kind)
    try:
        with Path(column.path).open("r+b") as file:
            file.seek(begin * kind.itemsize)
            np.ascontiguousarray(values, kind).tofile(file)
    except OSError as error:
        raise _full(Path(column.path), error) from error


def padded(column: Column, begin: int, stop: int, filler: int) -> NDArray[Any]:
    """The entries from ``begin`` to ``stop``; ``filler`` stands beyond the end."""
    there = column.read(min(begin, column.n), min(stop, column.n))
    if len(there) == stop - begin:
        return there
    return np.concatenate([there, np.full(stop - begin - len(there), filler, there.dtype)])


def pair_keys(left: UInt32Array, right: UInt32Array) -> UInt64Array:
    """Both numbers in one, sorted as (left, right)."""
    keys: UInt64Array = left.astype(np.uint64)
    keys <<= _LEFT
    keys |= right
    return keys


def left_of(keys: UInt64Array) -> UInt32Array:
    """The first number of each key."""
    return (keys >> _LEFT).astype(np.uint32)


def right_of(keys: UInt64Array) -> UInt32Array:
    """The second number of each key."""
    return (keys & _RIGHT_MASK).astype(np.uint32)


def _full(path: Path, error: OSError) -> InputOutputError:
    return InputOutputError(
        f"{path.parent}: a temporary file cannot be written ({error.strerror}); free some space or choose another "
        "folder for temporary files"
    )
