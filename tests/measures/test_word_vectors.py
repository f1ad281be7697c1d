"""PPMI of whole matrices, smoothing and shifting, against the worked examples of a textbook."""

from __future__ import annotations

import numpy as np
import pytest

from colloc.errors import UsageError
from colloc.measures.pmi import pmi, ppmi, shifted_ppmi, smoothed_totals

from .rounding import rounds_to

# Jurafsky & Martin, Speech and Language Processing, 3rd edition draft, chapter on vector semantics. Columns computer,
# data, result, pie, sugar; rows cherry, strawberry, digital, information.
COUNTS = np.array(
    [[2, 8, 9, 442, 25], [0, 0, 1, 60, 19], [1670, 1683, 85, 5, 4], [3325, 3982, 378, 5, 13]], dtype=np.int64
)
ROWS, COLUMNS, TOTAL = COUNTS.sum(axis=1)[:, np.newaxis], COUNTS.sum(axis=0), COUNTS.sum()


def test_totals_are_the_printed_ones() -> None:
    assert ROWS[:, 0].tolist() == [486, 80, 3447, 7703]
    assert COLUMNS.tolist() == [4997, 5673, 473, 512, 61]
    assert TOTAL == 11716


def test_ppmi_matrix() -> None:
    printed = [
        [0, 0, 0, 4.38, 3.30],
        [0, 0, 0, 4.10, 5.51],
        [0.18, 0.01, 0, 0, 0],
        [0.02, 0.09, 0.28, 0, 0],
    ]
    np.testing.assert_allclose(ppmi(COUNTS, ROWS, COLUMNS, TOTAL), printed, atol=0.00501)
    assert rounds_to(float(pmi(3982, 7703, 5673, TOTAL)), "0.0944")


def test_cosines_of_raw_counts() -> None:
    # pie, data, computer; printed .018 and .996.
    vectors = COUNTS[:, [3, 1, 0]].astype(np.float64)
    unit = vectors / np.linalg.norm(vectors, axis=1)[:, np.newaxis]
    assert rounds_to(float(unit[0] @ unit[3]), "0.018")
    assert rounds_to(float(unit[2] @ unit[3]), "0.996")


def test_older_edition() -> None:
    # Columns computer, data, pinch, result, sugar; rows apricot, pineapple, digital, information; and add-2.
    counts = np.array([[0, 0, 1, 0, 1], [0, 0, 1, 0, 1], [2, 1, 0, 1, 0], [1, 6, 0, 4, 0]])
    for more, printed in (
        (0, {(0, 2): 2.25, (1, 4): 2.25, (2, 0): 1.66, (3, 1): 0.57, (3, 3): 0.47}),
        (2, {(0, 2): 0.56, (1, 4): 0.56, (2, 0): 0.62, (3, 1): 0.58, (3, 3): 0.37}),
    ):
        table = counts + more
        values = ppmi(table, table.sum(axis=1)[:, np.newaxis], table.sum(axis=0), table.sum())
        for cell, value in printed.items():
            assert values[cell] == pytest.approx(value, abs=0.00501)


def test_context_smoothing() -> None:
    # Same book: alpha = .75 turns (.99, .01) into (.97, .03).
    np.testing.assert_allclose(smoothed_totals([99, 1]), [96.9, 3.1], atol=0.05)
    # Recomputed independently on the matrix above.
    values = ppmi(COUNTS, ROWS, smoothed_totals(COLUMNS), TOTAL)
    printed = {(0, 3): 3.6434, (0, 4): 1.8013, (1, 3): 3.3653, (1, 4): 4.0082, (2, 0): 0.2697, (2, 1): 0.1436}
    for cell, value in (printed | {(3, 0): 0.1031, (3, 1): 0.2260}).items():
        assert values[cell] == pytest.approx(value, abs=5e-5)


def test_shift() -> None:
    # Levy, Goldberg & Dagan 2015: max(PMI - log k, 0); recomputed independently for k = 5.
    values = shifted_ppmi(COUNTS, ROWS, COLUMNS, TOTAL, shift=5)
    expected = np.zeros((4, 5))
    expected[0, 3:], expected[1, 3:] = (2.0574, 0.9826), (1.7792, 3.1895)
    np.testing.assert_allclose(values, expected, atol=5e-5)
    np.testing.assert_array_equal(shifted_ppmi(COUNTS, ROWS, COLUMNS, TOTAL), ppmi(COUNTS, ROWS, COLUMNS, TOTAL))


def test_vectors_of_the_matrix() -> None:
    # Recomputed independently: singular values, and cosines of rows.
    matrix = ppmi(COUNTS, ROWS, COLUMNS, TOTAL)
    np.testing.assert_allclose(np.linalg.svd(matrix)[1], [8.7072, 1.2155, 0.2980, 0.1833], atol=5e-5)
    unit = matrix / np.linalg.norm(matrix, axis=1)[:, np.newaxis]
    assert rounds_to(float(unit[0] @ unit[1]), "0.9598")
    assert rounds_to(float(unit[2] @ unit[3]), "0.0786")


def test_smoothing_keeps_the_sum_and_the_ends() -> None:
    totals = np.array([0, 3, 10, 2**40])
    for alpha in (0, 0.3, 0.75, 1):
        smoothed = smoothed_totals(totals, alpha)
        assert smoothed.sum() == pytest.approx(totals.sum(), rel=1e-12)
        assert smoothed[0] == 0
    np.testing.assert_allclose(smoothed_totals(totals, 1), totals, rtol=1e-12)
    np.testing.assert_allclose(smoothed_totals(totals, 0)[1:], totals.sum() / 3, rtol=1e-12)
    np.testing.assert_array_equal(smoothed_totals([0, 0]), [0, 0])


def test_settings_that_make_no_sense_are_refused() -> None:
    with pytest.raises(UsageError, match="shift must be above 0, not 0"):
        shifted_ppmi(1, 2, 3, 10, shift=0)
    with pytest.raises(UsageError, match="alpha must be between 0 and 1, not 2"):
        smoothed_totals([1], 2)
