"""Work on a selection shared out: tasks for each share of it and each range of keys, and the files they leave."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np

from colloc.counts.processes import Crew, Task
from colloc.counts.runs import Column, RunFile, save_runs, write_column
from colloc.counts.sequences.places import reserve
from colloc.counts.sequences.sharing import Facts

END = 2**64 - 1
"""Beyond every key."""
_LARGEST_SHARE = 2**20
_LEAST_RANGE = 2**16
"""Run entries that make a range of keys worth a task of its own."""
_SAMPLES = 2**17


class Shop:
    """Shares work on ``size`` places out among workers, with files in one folder.

    Parameters
    ----------
    entries : int
        Run entries that are merged at a time.
    """

    def __init__(self, workers: Crew, jobs: int, entries: int, folder: Path, size: int) -> None:
        self._workers, self._jobs, self._entries, self._size = workers, jobs, entries, size
        self.folder = folder
        shares = jobs * -(-size // (jobs * _LARGEST_SHARE)) if size else 0
        self._edges = [size * share // max(shares, 1) for share in range(shares + 1)] or [0]

    def share_out(self, task: str, arguments: Facts, name: str | None = None) -> list[Facts]:
        """Do a task for every share of the places."""
        tasks: list[Task] = []
        for share, (begin, stop) in enumerate(pairwise(self._edges)):
            named = {"name": f"{name}-{share}"} if name is not None else {}
            tasks.append((task, {**arguments, "begin": begin, "stop": stop, **named}))
        return list(self._workers.results(tasks))

    def merge(
        self, task: str, cuts: Sequence[int], arguments: Facts, runs: Sequence[RunFile], name: str
    ) -> list[Facts]:
        """Do a task for every range between two cuts; it reads all runs, which are gone afterwards."""
        listed = self.folder / f"{name}.runs"
        save_runs(listed, runs)
        same = {**arguments, "runs": str(listed), "folder": str(self.folder)}
        tasks: list[Task] = [
            (task, {**same, "first": first, "last": last, "name": f"{name}-{part}"})
            for part, (first, last) in enumerate(pairwise(cuts))
        ]
        done = list(self._workers.results(tasks))
        remove_runs(runs)
        return done

    def key_cuts(self, runs: Sequence[RunFile]) -> list[int]:
        """Cuts between keys, so that the ranges have about equally many entries of all runs."""
        entries = sum(run.keys.n for run in runs)
        step = max(1, entries // _SAMPLES)
        sample = np.sort(np.concatenate([np.empty(0, np.uint64), *(run.keys.read()[::step] for run in runs)]))
        ranges = self._ranges(entries)
        cuts = np.unique(sample[len(sample) * np.arange(1, ranges) // ranges]) if len(sample) else sample
        return [0, *cuts[cuts > 0].tolist(), END]

    def number_cuts(self, runs: Sequence[RunFile], n: int) -> list[int]:
        """Cuts between ``n`` sequences, for runs that have their numbers first."""
        ranges = min(max(n, 1), self._ranges(sum(run.keys.n for run in runs)))
        return sorted({n * part // ranges for part in range(ranges + 1)})

    def _ranges(self, entries: int) -> int:
        """Into how many ranges so many run entries are cut."""
        return max(1, -(-entries // self._entries), min(self._jobs, entries // _LEAST_RANGE))

    def keep(self, name: str, values: Any) -> Facts:
        """Write a column for the tasks to read."""
        return asdict(write_column(self.folder / f"{name}.column", np.asarray(values)))

    def reserve(self, name: str, kind: str) -> Facts:
        """A column with an entry for each place, for the tasks to fill in."""
        return asdict(reserve(self.folder / f"{name}.places", kind, self._size))


def run_file(run: Facts) -> RunFile:
    """A run as a task names it."""
    return RunFile(Column(**run["keys"]), Column(**run["counts"]))


def remove_runs(runs: Sequence[RunFile]) -> None:
    """Delete the files of runs."""
    for run in runs:
        Path(run.keys.path).unlink()
        Path(run.counts.path).unlink()


def taken(column: Facts) -> Any:
    """What a column holds; its file is gone afterwards."""
    values = np.array(Column(**column).read())
    Path(column["path"]).unlink()
    return values
