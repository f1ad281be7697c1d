"""All cells of a table in the order of a matrix: row by row, and by column within a row.

The store keeps a table's pairs in two orders: by their low term, which are the cells right of the diagonal row by
row, and by their high term, which are those left of it. Two walks side by side therefore give the whole matrix
without sorting, a page or two at a time.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np

from colloc.answers.spaces.choosing import Words
from colloc.answers.tables import TableMaker
from colloc.records import FloatArray, Int64Array, PairBlock, UInt32Array
from colloc.store.pages import Order

Counts = Int64Array | FloatArray


class Pairs(Protocol):
    """A stretch of unordered pairs; weighted counts are floats."""

    @property
    def low(self) -> UInt32Array: ...
    @property
    def high(self) -> UInt32Array: ...
    @property
    def forward(self) -> Counts: ...
    @property
    def backward(self) -> Counts: ...


class Source(Protocol):
    """A table read in either order: a `Tally` or a `WeightedTally`."""

    def blocks(self, order: Order = "low") -> Iterator[PairBlock] | Iterator[Pairs]: ...


@dataclass(frozen=True, slots=True)
class RowCells:
    """Cells sorted by row, then by column; all of one row stand in one stretch or in neighbouring ones.

    Attributes
    ----------
    rows, columns : integer arrays, shape (n,)
        Terms.
    joint : int64 or float64 array, shape (n,)
        On the diagonal of a symmetric table the count of unordered pairs, half of the matrix' own cell.
    """

    rows: UInt32Array
    columns: UInt32Array
    joint: Counts

    def __len__(self) -> int:
        return len(self.rows)

    def take(self, index: np.ndarray | slice) -> RowCells:
        """The cells chosen by a mask, a slice or numbers."""
        return RowCells(self.rows[index], self.columns[index], self.joint[index])


@dataclass(frozen=True, slots=True)
class MatrixTable:
    """A table ready to become a matrix.

    Attributes
    ----------
    cells : iterator of RowCells
        Row by row; all of a row before the next one.
    n_cells : int
        At most so many.
    maker : TableMaker
        Makes contingency tables of the cells.
    rows, columns : Words
        What both are words of.
    settings : dict
        What decided the counts.
    """

    cells: Iterator[RowCells]
    n_cells: int
    maker: TableMaker
    rows: Words
    columns: Words
    settings: dict[str, Any]


def cells_by_row(source: Source, ordered: bool, unit: bool) -> Iterator[RowCells]:
    """Every cell of the square table that is not zero.

    Parameters
    ----------
    ordered : bool
        Whether (x, y) and (y, x) have counts of their own; otherwise both get the sum of the two.
    unit : bool
        Whether pairs have one count only, in ``forward``.
    """
    right = _Walk(_right_of_diagonal(source.blocks("low"), ordered or unit))
    left = _Walk(_left_of_diagonal(source.blocks("high"), ordered, unit))
    while right.more() | left.more():
        limit = min(right.complete, left.complete)
        found = _interleaved(left.before(limit), right.before(limit))
        if len(found):
            yield found


def _right_of_diagonal(blocks: Iterable[Pairs | PairBlock], forward_only: bool) -> Iterator[RowCells]:
    for block in blocks:
        yield _without_zeros(block.low, block.high, block.forward if forward_only else block.forward + block.backward)


def _left_of_diagonal(blocks: Iterable[Pairs | PairBlock], ordered: bool, unit: bool) -> Iterator[RowCells]:
    for block in blocks:
        joint = block.forward if unit else block.backward if ordered else block.forward + block.backward
        off = np.flatnonzero(block.low != block.high)  # places are taken quicker than a mask is applied
        yield _without_zeros(block.high.take(off), block.low.take(off), joint.take(off))


def _without_zeros(rows: UInt32Array, columns: UInt32Array, joint: Counts) -> RowCells:
    cells = RowCells(rows, columns, joint)
    there = joint > 0
    return cells if there.all() else cells.take(there)


_NO_LIMIT = 1 << 32


class _Walk:
    """Stretches sorted by row, given out in whole rows."""

    def __init__(self, stretches: Iterator[RowCells]) -> None:
        self._stretches = stretches
        self._waiting: list[RowCells] = []
        self.complete = 0
        """All cells of the rows below this one are here."""

    def more(self) -> bool:
        """Read until at least one more row is complete; False once nothing is left."""
        while self.complete < _NO_LIMIT and not self._holds_complete_row():
            stretch = next(self._stretches, None)
            if stretch is None:
                self.complete = _NO_LIMIT
            elif len(stretch):
                self._waiting.append(stretch)
                self.complete = int(stretch.rows[-1])
        return bool(self._waiting)

    def _holds_complete_row(self) -> bool:
        return bool(self._waiting) and int(self._waiting[0].rows[0]) < self.complete

    def before(self, limit: int) -> RowCells:
        """Take the cells of the rows below ``limit``, which must be complete."""
        taken, rest = [], []
        for stretch in self._waiting:
            cut = len(stretch) if limit == _NO_LIMIT else int(np.searchsorted(stretch.rows, np.uint32(limit)))
            taken.append(stretch.take(slice(0, cut)))
            if cut < len(stretch):
                rest.append(stretch.take(slice(cut, None)))
        self._waiting = rest
        if len(taken) == 1:
            return taken[0]
        nothing = RowCells(np.zeros(0, np.uint32), np.zeros(0, np.uint32), np.zeros(0, np.int64))
        parts = taken or [nothing]
        return RowCells(
            *(np.concatenate([getattr(part, name) for part in parts]) for name in ("rows", "columns", "joint"))
        )


def _interleaved(left: RowCells, right: RowCells) -> RowCells:
    """Row by row, the cells of ``left`` before those of ``right``."""
    if not len(left) or not len(right):
        return left if len(left) else right
    base = min(int(left.rows[0]), int(right.rows[0]))
    stop = max(int(left.rows[-1]), int(right.rows[-1])) + 1
    left_counts, right_counts = (
        np.bincount(side.rows - np.uint32(base), minlength=stop - base) for side in (left, right)
    )
    left_ends = np.cumsum(left_counts)
    right_begins = np.cumsum(right_counts) - right_counts
    # Before a cell stand those of its own side, and those of the other in rows above; for `right` also in its own row.
    left_places = np.arange(len(left)) + np.repeat(right_begins, left_counts)
    right_places = np.arange(len(right)) + np.repeat(left_ends, right_counts)
    size = len(left) + len(right)
    rows = np.repeat(np.arange(base, stop, dtype=np.uint32), left_counts + right_counts)
    columns = np.empty(size, np.uint32)
    joint = np.empty(size, np.result_type(left.joint, right.joint))
    for places, side in ((left_places, left), (right_places, right)):
        columns[places], joint[places] = side.columns, side.joint
    return RowCells(rows, columns, joint)
