"""Sorted runs in temporary files: raw columns, read by slices."""

from __future__ import annotations

import dataclasses
import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.counts.keys import Run
from colloc.errors import InputOutputError
from colloc.records import UInt64Array

_MAPPED = 2**20
"""Bytes from which on mapping a file costs less than reading it."""
_KINDS = (np.uint8, np.uint16, np.uint32, np.int64)


@dataclass(frozen=True, slots=True)
class Column:
    """One array in a file of its own. Facts enough to read it, small enough to send to another process."""

    path: str
    kind: str
    n: int

    def read(self, begin: int = 0, stop: int | None = None) -> NDArray[Any]:
        """The elements from ``begin`` to ``stop``: mapped from the file where there are many, private to the reader."""
        stop = self.n if stop is None else stop
        kind = np.dtype(self.kind)
        if begin >= stop:
            return np.empty(0, kind)
        try:
            if (stop - begin) * kind.itemsize > _MAPPED:
                return np.memmap(self.path, kind, "c", begin * kind.itemsize, (stop - begin,))
            values = np.fromfile(self.path, kind, stop - begin, offset=begin * kind.itemsize)
            if len(values) != stop - begin:
                raise OSError("it was cut short")
            return values
        except (OSError, ValueError) as error:
            raise InputOutputError(f"{self.path}: a temporary file cannot be read ({error})") from error


@dataclass(frozen=True, slots=True)
class RunFile:
    """A run whose keys and counts are kept in files."""

    keys: Column
    counts: Column

    def between(self, first: int, last: int) -> Run:
        """The part with first <= key < last; counts keep the type they were written with."""
        keys: UInt64Array = self.keys.read()
        begin, stop = (int(place) for place in np.searchsorted(keys, np.array([first, last], np.uint64)))
        return Run(self.keys.read(begin, stop), self.counts.read(begin, stop))


def write_column(path: Path, values: NDArray[Any]) -> Column:
    """Keep an array in a new file.

    Raises
    ------
    InputOutputError
        The disk is full or the folder gone.
    """
    try:
        with path.open("wb") as file:
            np.ascontiguousarray(values).tofile(file)
    except OSError as error:
        raise InputOutputError(
            f"{path.parent}: a temporary file cannot be written ({error.strerror}); free some space or choose another "
            "folder for temporary files"
        ) from error
    return Column(str(path), values.dtype.str, len(values))


def save_runs(path: Path, runs: Sequence[RunFile]) -> None:
    """Write the facts of runs for another process to load."""
    facts = json.dumps([dataclasses.asdict(run) for run in runs])
    write_column(path, np.frombuffer(facts.encode(), np.uint8))


def load_runs(path: Path) -> list[RunFile]:
    """What `save_runs` wrote."""
    return [RunFile(Column(**run["keys"]), Column(**run["counts"])) for run in json.loads(path.read_bytes())]


def smallest(values: NDArray[Any]) -> NDArray[Any]:
    """The same integers in the narrowest type that holds them: small files are fast files."""
    if not len(values) or values.min() < 0:
        return values
    largest = values.max()
    return values.astype(next(kind for kind in _KINDS if largest <= np.iinfo(kind).max))


def write_run(folder: Path, name: str, run: Run) -> RunFile:
    """Keep a run in two new files in ``folder``."""
    keys = write_column(folder / f"{name}.keys", run.keys)
    return RunFile(keys, write_column(folder / f"{name}.counts", smallest(run.counts)))
