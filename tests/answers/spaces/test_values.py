"""Values of a matrix' cells from sums of logarithms, against the formula over whole tables."""

from __future__ import annotations

import numpy as np
import pytest

from colloc.answers.spaces.rows import RowCells
from colloc.answers.spaces.values import PositiveInformation
from colloc.measures.pmi import shifted_ppmi, smoothed_totals


def cells_of(table: np.ndarray) -> RowCells:
    rows, columns = np.nonzero(table)
    return RowCells(rows.astype(np.uint32), columns.astype(np.uint32), table[rows, columns])


@pytest.mark.parametrize("smoothing", [1.0, 0.75, 0.0])
@pytest.mark.parametrize("shift", [1.0, 5.0, 0.3])
@pytest.mark.parametrize("kind", [np.int64, np.float64])
def test_small_and_large_counts(smoothing: float, shift: float, kind: type) -> None:
    """Counts on both sides of the table of logarithms (32,768)."""
    random = np.random.default_rng(3)
    table = np.where(random.random((40, 30)) < 0.6, 2 ** random.uniform(0, 24, (40, 30)), 0).astype(kind)
    table[:2, :2] = [[32767, 32768], [32769, 1]]
    rows, columns, total = table.sum(axis=1), table.sum(axis=0), table.sum()
    value = PositiveInformation(rows, columns, total, shift=shift, smoothing=smoothing)
    totals = smoothed_totals(columns, smoothing)
    expected = shifted_ppmi(table, rows[:, np.newaxis], totals, total, shift)
    cells = cells_of(table)
    np.testing.assert_allclose(value(cells), expected[cells.rows, cells.columns], rtol=1e-12, atol=1e-13)
    assert (value(cells) == 0).any()


@pytest.mark.parametrize("shift", [1.0, 3.0])
def test_what_is_independent_is_exactly_zero(shift: float) -> None:
    """Products of margins: the ratio is 1, or exactly the shift, in every cell; nothing of rounding may stay."""
    joint = np.outer([3, 7, 11, 13, 300], [5, 17, 1, 900])
    value = PositiveInformation(joint.sum(axis=1), joint.sum(axis=0), joint.sum() * shift, shift=shift)
    assert value(cells_of(joint)).tolist() == [0.0] * joint.size


def test_a_word_with_itself_in_a_symmetric_table() -> None:
    """Given half of its cell: the value is that of the whole cell."""
    whole = np.array([[8, 3], [3, 40_000]])
    halved = whole - np.diag([4, 20_000])
    totals = whole.sum(axis=0)
    value = PositiveInformation(totals, totals, whole.sum(), doubled=True)
    expected = shifted_ppmi(whole, totals[:, np.newaxis], totals, whole.sum())
    np.testing.assert_allclose(value(cells_of(halved)), expected.ravel(), rtol=1e-12, atol=1e-14)
    assert value(RowCells(np.zeros(0, np.uint32), np.zeros(0, np.uint32), np.zeros(0, np.int64))).tolist() == []
