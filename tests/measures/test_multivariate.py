"""Three words and more: the definitions on logic tables, and both published forms of C-value on their own examples."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from colloc.errors import UsageError
from colloc.measures.multivariate import (
    c_value,
    co_information,
    entropy,
    specific_correlation,
    specific_interaction,
    total_correlation,
    weakest_split,
)
from colloc.measures.pmi import pmi

from .rounding import rounds_to

XOR = np.zeros((2, 2, 2))
AND = np.zeros((2, 2, 2))
for x in (0, 1):
    for y in (0, 1):
        XOR[x, y, x ^ y] = AND[x, y, x & y] = 1
SAME = np.zeros((2, 2, 2))
SAME[0, 0, 0] = SAME[1, 1, 1] = 1


def subset_counts(table: np.ndarray, cell: tuple[int, int, int]) -> list[float]:
    counts = []
    for mask in range(1, 8):
        chosen = tuple(cell[axis] if mask >> axis & 1 else slice(None) for axis in range(3))
        counts.append(float(table[chosen].sum()))
    return counts


# Van de Cruys 2011, DiSCo workshop: the paper prints no counts; values of the logic tables follow from its definitions.
@pytest.mark.parametrize(
    ("table", "cell", "si1", "si2", "tc", "ci"),
    [(XOR, (0, 1, 1), -1, 1, 1, -1), (SAME, (1, 1, 1), 1, 2, 2, 1)],
    ids=["xor", "three identical bits"],
)
def test_van_de_cruys(
    table: np.ndarray, cell: tuple[int, int, int], si1: float, si2: float, tc: float, ci: float
) -> None:
    total = table.sum()
    singles = [table.sum(axis=tuple({0, 1, 2} - {axis}))[cell[axis]] for axis in range(3)]
    assert float(specific_interaction(subset_counts(table, cell), total)) == pytest.approx(si1)
    assert float(specific_correlation(table[cell], singles, total)) == pytest.approx(si2)
    assert total_correlation(table) == pytest.approx(tc)
    assert co_information(table) == pytest.approx(ci)


def test_and_gate() -> None:
    assert rounds_to(float(total_correlation(AND)), "0.81128")
    assert rounds_to(float(co_information(AND)), "-0.18872")


def test_means_of_the_specific_measures() -> None:
    # The mean of SI2 over a table is its total correlation, the mean of SI1 its co-information (same paper).
    table = np.random.default_rng(1).integers(1, 30, (2, 3, 2))
    total, si1, si2 = table.sum(), 0.0, 0.0
    for cell in np.ndindex(table.shape):
        singles = [table.sum(axis=tuple({0, 1, 2} - {axis}))[cell[axis]] for axis in range(3)]
        share = table[cell] / total
        si1 += share * float(specific_interaction(subset_counts(table, cell), total))  # type: ignore[arg-type]
        si2 += share * float(specific_correlation(table[cell], singles, total))
    assert si2 == pytest.approx(float(total_correlation(table)))
    assert si1 == pytest.approx(float(co_information(table)))
    assert total_correlation(table) >= 0
    assert entropy(table) == pytest.approx(stats.entropy(table.reshape(-1), base=2))


def test_for_two_words_both_are_pmi() -> None:
    joint, first, second = np.array([5, 1, 0]), np.array([10, 20, 30]), np.array([7, 2, 9])
    expected = pmi(joint, first, second, 1000)
    np.testing.assert_allclose(specific_correlation(joint, [first, second], 1000), expected, rtol=1e-12)
    np.testing.assert_allclose(specific_interaction([first, second, joint], 1000), expected, rtol=1e-12)


def test_many_large_margins_do_not_overflow() -> None:
    # 40 words that each fill half of 2^40 places, together by independence: exactly 0.
    assert float(specific_correlation(1, np.full(40, 2**39), 2**40)) == pytest.approx(0, abs=1e-10)


def test_subset_counts_must_be_complete() -> None:
    with pytest.raises(UsageError, match=r"2\*\*n - 1 rows, not 6"):
        specific_interaction([1, 2, 3, 4, 5, 6], 10)


# Frantzi & Ananiadou 1996, COLING, ACL Anthology C96-1009: length, n, t, c, printed C-value. The paper rounds 22/3 to
# 7.33, hence 37.34 and 31.34.
NESTED_1996 = """
7 19 0 0 114
6 19 19 1 0
5 20 19 1 4
4 22 20 2 36
3 26 22 3 37.34
3 23 22 3 31.34
3 3 0 0 6
2 38 30 6 33
"""


def test_c_value_of_1996() -> None:
    rows = np.array([row.split() for row in NESTED_1996.strip().split("\n")], dtype=float)
    values = c_value(*rows[:, :4].T, form="length")
    np.testing.assert_allclose(values, rows[:, 4], atol=0.011)


def test_c_value_of_2000() -> None:
    # Frantzi, Ananiadou & Mima 2000, Int. J. on Digital Libraries 3(2) (from memory): (adenoid cystic, cystic,
    # ulcerated, recurrent, circumscribed) basal cell carcinoma, and basal cell carcinoma. The 26 is
    # 5 + (11 - 5) + 7 + 5 + 3: occurrences inside a longer candidate count once.
    values = c_value([5, 4, 4, 4, 4, 3], [5, 11, 7, 5, 3, 984], [0, 5, 0, 0, 0, 26], [0, 1, 0, 0, 0, 5])
    for value, printed in zip(values, ["11.61", "12", "14", "10", "6", "1551.36"], strict=True):
        assert rounds_to(float(value), printed)


def test_c_value_knows_two_forms() -> None:
    with pytest.raises(UsageError, match="form must be log2 or length, not 'ln'"):
        c_value(2, 3, 0, 0, form="ln")  # type: ignore[arg-type]


def test_weakest_split() -> None:
    # a b | c d clings least between b and c: 8 = log2(4 * 1024 / (4 * 4)) elsewhere, 2 there.
    value, cut = weakest_split([4, 4], [[4, 4], [32, 4], [4, 64]], [[4, 4], [32, 4], [4, 4]], 1024)
    np.testing.assert_allclose(value, [2, 4])
    np.testing.assert_array_equal(cut, [2, 3])
