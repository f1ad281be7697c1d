"""Sorted runs become the pages of a tally, key range by key range, each range by itself.

First ranges of (low, high): the runs' slices are merged, which gives the pages of the order ``low``;
the pairs are dealt out by their higher term. Then ranges of the higher term: what was dealt out comes together,
sorted by (low, high) already, and one radix pass makes the order ``high``.
"""

from __future__ import annotations

import dataclasses
import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Self

import numpy as np
from numpy.typing import NDArray

from colloc.counts.keys import Run, high_terms, merge, pair_block
from colloc.counts.pagefiles import PageFile, write_pages
from colloc.counts.runs import Column, RunFile, smallest, write_column
from colloc.kernels import merging
from colloc.kernels.switch import compiled
from colloc.records import Int64Array, PairBlock, UInt32Array

MOST_RANGES = 2**15
_SAMPLES = 2**17
_END = 2**64 - 1
_WIDEST = 4
"""Places for each value up to which values are sorted by a place for each that there could be."""
_FIELDS = ("low", "high", "forward", "backward")


@dataclass(frozen=True, slots=True)
class Dealt:
    """Pairs of one key range, grouped by range of the higher term, sorted by (low, high) in each group.

    Attributes
    ----------
    edges : list of int
        Where each group begins, and at the end the number of pairs.
    """

    columns: list[Column]
    edges: list[int]

    def save(self, path: Path) -> None:
        """Write the facts for a later task to load."""
        write_column(path, np.frombuffer(json.dumps(dataclasses.asdict(self)).encode(), np.uint8))

    @classmethod
    def load(cls, path: Path) -> Self:
        """What `save` wrote."""
        facts = json.loads(path.read_bytes())
        return cls([Column(**column) for column in facts["columns"]], facts["edges"])


def choose_bounds(runs: Sequence[RunFile], entries: int) -> tuple[list[int], list[int]]:
    """Where to cut so that each range has about ``entries`` entries of all runs together.

    Returns
    -------
    keys : list of int
        Cuts between pairs, from 0 to the end of all keys; both directions of a pair are on one side.
    highs : list of int
        Cuts between higher terms, from 0 to 2**31.
    """
    total = sum(run.keys.n for run in runs)
    step = max(1, total // _SAMPLES)
    sample = np.sort(np.concatenate([np.empty(0, np.uint64), *(run.keys.read()[::step] for run in runs)]))
    ranges = max(1, min(-(-total // entries), MOST_RANGES))
    places = len(sample) * np.arange(1, ranges) // ranges
    keys = np.unique(sample[places] & ~np.uint64(1)) if len(sample) else sample
    highs = np.unique(np.sort(high_terms(sample))[places]) if len(sample) else sample
    return [0, *keys[keys > 0].tolist(), _END], [0, *highs[highs > 0].tolist(), 2**31]


def merge_range(
    runs: Sequence[RunFile],
    first: int,
    last: int,
    highs: Sequence[int],
    symmetric: bool,
    sign: int,
    folder: Path,
    name: str,
) -> tuple[PageFile, Dealt]:
    """Pages in the order ``low`` of the pairs with first <= key < last, and the same pairs dealt out.

    Parameters
    ----------
    symmetric : bool
        The runs hold forward cells only and each stands for both directions.
    sign : int
        -1 for a change that takes away what was counted, else 1.
    """
    run = merge([_widened(run.between(first, last)) for run in runs])
    block = pair_block(Run(run.keys, sign * run.counts))
    if symmetric:
        block = PairBlock(block.low, block.high, block.forward, np.where(block.low == block.high, 0, block.forward))
    return write_pages(folder, f"{name}.low", block, "low"), _deal(block, highs, folder, name)


def _widened(run: Run) -> Run:
    return Run(run.keys, run.counts.astype(np.int64))


def _deal(block: PairBlock, highs: Sequence[int], folder: Path, name: str) -> Dealt:
    group = np.searchsorted(np.array(highs[1:-1], np.uint32), block.high, side="right").astype(np.uint32)
    order = stable_order(group)
    edges = np.concatenate([[0], np.cumsum(np.bincount(group, minlength=len(highs) - 1))])
    columns = [write_column(folder / f"{name}.{field}", smallest(getattr(block, field))[order]) for field in _FIELDS]
    return Dealt(columns, edges.tolist())


def transpose_range(dealt: Sequence[Dealt], group: int, folder: Path, name: str) -> PageFile:
    """Pages in the order ``high`` of one range of higher terms, from the key ranges in ascending order."""
    pieces: list[list[NDArray[Any]]] = [
        [part.columns[field].read(part.edges[group], part.edges[group + 1]) for part in dealt]
        for field in range(len(_FIELDS))
    ]
    low, high = (np.concatenate(piece).astype(np.uint32) for piece in pieces[:2])
    forward, backward = (np.concatenate([part.astype(np.int64) for part in piece]) for piece in pieces[2:])
    order = stable_order(high)
    return write_pages(folder, name, PairBlock(low[order], high[order], forward[order], backward[order]), "high")


def stable_order(values: UInt32Array) -> Int64Array:
    """What ``np.argsort(values, kind="stable")`` gives in linear time: by counting, or by passes of 16 bits."""
    if not len(values):
        return np.empty(0, np.int64)
    values = values - values.min()
    width = int(values.max()) + 1
    if compiled() and width <= _WIDEST * len(values):
        order = np.empty(len(values), np.int64)
        merging.order_by_value(values, np.zeros(width, np.int64), order)
        return order
    order = np.argsort(values.astype(np.uint16), kind="stable")
    if width > 2**16:
        order = order[np.argsort((values >> np.uint32(16)).astype(np.uint16)[order], kind="stable")]
    return order
