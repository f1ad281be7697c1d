"""What the cells of a matrix hold: rules from joint counts to values.

PPMI is the sum of four logarithms, log2 joint + log2 total - log2 row total - log2 column total: those of the totals
are taken once for each word, those of small counts come from a table, so that a cell costs look-ups and no
logarithm. A sum of rounded logarithms is not exactly 0 where the ratio is 1; values that close to 0 are computed
again from the ratio itself.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Literal

import numpy as np

from colloc.answers.spaces.rows import Counts, RowCells
from colloc.answers.tables import TableMaker
from colloc.measures.catalogue import MEASURES
from colloc.measures.pmi import smoothed_totals
from colloc.records import FloatArray

Value = Literal["ppmi", "npmi", "g2", "count"]
ValueRule = Callable[[RowCells], FloatArray]

_TABLED = 1 << 15
"""Counts below this have their logarithm in a table (256 KB); nearly all counts of a table of pairs are small."""
_NEAR = 2.0**-30
"""Values this close to 0 are computed from the ratio: the sum of four logarithms errs by some 2**-47."""


def value_rule(value: Value, shift: float, smoothing: float, maker: TableMaker) -> ValueRule:
    """What a cell holds, as a function of many cells in the order of `cells_by_row`."""
    # A symmetric matrix holds both orders of a word with itself, which the table of unordered pairs does not.
    doubled = not (maker.ordered or maker.spec.kind == "unit")
    if value == "count":
        return lambda cells: both_orders(cells, doubled).astype(np.float64)
    if value != "ppmi":
        return lambda cells: MEASURES[value].compute(*maker.counted(cells.rows, cells.columns, cells.joint).arguments)
    return PositiveInformation(
        maker.first_totals(), maker.second_totals(), maker.total, shift=shift, smoothing=smoothing, doubled=doubled
    )


def both_orders(cells: RowCells, doubled: bool) -> Counts:
    """The joint counts as a symmetric matrix holds them: twice on the diagonal."""
    if not doubled:
        return cells.joint
    return np.where(cells.rows == cells.columns, 2 * cells.joint, cells.joint)


class PositiveInformation:
    """max(PMI - log2 shift, 0) of cells, in bits (Levy, Goldberg & Dagan 2015, section 3.2).

    Parameters
    ----------
    first_totals, second_totals : arrays, by number of the row's and the column's word
    total : number
    smoothing : float
        Power that the totals of all columns are raised to, and brought back to their old sum.
    doubled : bool
        Whether the joint count of a word with itself is half of its cell.
    """

    def __init__(
        self,
        first_totals: Counts,
        second_totals: Counts,
        total: float,
        *,
        shift: float = 1.0,
        smoothing: float = 1.0,
        doubled: bool = False,
    ) -> None:
        self._first = np.asarray(first_totals, dtype=np.float64)
        self._second = np.asarray(second_totals, dtype=np.float64)
        if smoothing != 1:
            self._second = smoothed_totals(self._second, smoothing)
        self._total, self._shift = float(total), float(shift)
        self._doubled = doubled
        with np.errstate(divide="ignore"):  # words that never occur have no cells
            self._row_bits = np.log2(self._total) - np.log2(self._shift) - np.log2(self._first)
            self._column_bits = np.log2(self._second)
            self._count_bits = np.log2(np.arange(_TABLED, dtype=np.float64))

    def __call__(self, cells: RowCells) -> FloatArray:
        """Values of cells whose joint count is above 0."""
        values = self._bits(cells.joint)
        if not len(values):
            return values
        values -= self._column_bits.take(cells.columns)
        # Rows come in order, so that the look-ups walk through the totals.
        values += self._row_bits.take(cells.rows)
        if self._doubled:
            values[cells.rows == cells.columns] += 1.0
        near = np.flatnonzero(np.abs(values) < _NEAR)
        if len(near):
            values[near] = self._exact(cells.take(near))
        return np.maximum(values, 0.0, out=values)

    def _bits(self, joint: Any) -> FloatArray:
        if joint.dtype.kind == "f":
            found: FloatArray = np.log2(joint)
            return found
        bits: FloatArray = self._count_bits.take(joint, mode="clip")
        large = np.flatnonzero(joint >= _TABLED)
        if len(large):
            bits[large] = np.log2(joint[large])
        return bits

    def _exact(self, cells: RowCells) -> FloatArray:
        margins = self._first[cells.rows] * self._second[cells.columns]
        found: FloatArray = np.log2(both_orders(cells, self._doubled) * self._total / margins / self._shift)
        return found
