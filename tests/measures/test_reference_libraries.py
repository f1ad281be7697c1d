"""Agreement with scipy, scikit-learn and statsmodels on random tables, zero cells and large counts included."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from sklearn.metrics import balanced_accuracy_score, matthews_corrcoef
from statsmodels.stats.contingency_tables import Table2x2

from colloc.errors import DataError
from colloc.measures.catalogue import compute_all
from colloc.measures.contingency import expected, impossible, require_possible
from colloc.measures.odds import log_ratio
from colloc.measures.tails import chi_square_log_p, chi_square_p


def random_tables(seed: int, rows: int, largest: int) -> np.ndarray:
    """Shape (rows, 2, 2), with no empty margin; small entries often, so that zeros occur."""
    generator = np.random.default_rng(seed)
    ceiling = generator.integers(1, largest + 1, (rows, 2, 2), dtype=np.int64)
    tables = generator.integers(0, ceiling + 1)
    sound = (tables.sum(axis=1) > 0).all(axis=1) & (tables.sum(axis=2) > 0).all(axis=1)
    return tables[sound]


def four(tables: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    return tables[:, 0, 0], tables[:, 0].sum(axis=1), tables[:, :, 0].sum(axis=1), tables.sum(axis=(1, 2))


@pytest.mark.parametrize("largest", [6, 1000, 2**36])
def test_independence_tests_agree_with_scipy(largest: int) -> None:
    tables = random_tables(1, 150, largest)
    values = compute_all(["g2", "chi2", "g2_p", "chi2_p"], *four(tables))
    for row, table in enumerate(tables.astype(np.float64)):
        plain = stats.chi2_contingency(table, correction=False)
        ratio = stats.chi2_contingency(table, correction=False, lambda_="log-likelihood")
        assert expected(*four(tables))[row] == pytest.approx(plain.expected_freq[0, 0], rel=1e-12)
        assert abs(values["chi2"][row]) == pytest.approx(plain.statistic, rel=1e-9, abs=1e-12)
        assert values["chi2_p"][row] == pytest.approx(plain.pvalue, rel=1e-7, abs=1e-300)
        # The plain form of the reference loses digits where cells are large: see the decimal tests for those.
        assert abs(values["g2"][row]) == pytest.approx(ratio.statistic, rel=1e-9, abs=1e-14 * table.sum() + 1e-12)


def test_odds_agree_with_statsmodels_and_scipy() -> None:
    tables = random_tables(2, 150, 60)
    values = compute_all(["log_odds", "log_odds_se"], *four(tables))
    for row, table in enumerate(tables):
        reference = Table2x2(table + 0.5 if (table == 0).any() else table, shift_zeros=False)
        assert values["log_odds"][row] == pytest.approx(reference.log_oddsratio, rel=1e-10, abs=1e-12)
        assert values["log_odds_se"][row] == pytest.approx(reference.log_oddsratio_se, rel=1e-10)
        if (table[:, 0] > 0).all():
            risk = stats.contingency.relative_risk(table[0, 0], table[0].sum(), table[1, 0], table[1].sum())
            ratio = float(log_ratio(*four(tables[row : row + 1]))[0])
            assert ratio == pytest.approx(np.log2(risk.relative_risk), rel=1e-9, abs=1e-12)


def test_delta_p_and_phi_agree_with_scikit_learn() -> None:
    tables = random_tables(3, 100, 60)
    names = ["delta_p_second_given_first", "delta_p_first_given_second", "chi2"]
    values = compute_all(names, *four(tables))
    row, column = np.array([1, 1, 0, 0]), np.array([1, 0, 1, 0])
    for index, table in enumerate(tables):
        weights = table.reshape(-1)
        forward = balanced_accuracy_score(row, column, sample_weight=weights, adjusted=True)
        backward = balanced_accuracy_score(column, row, sample_weight=weights, adjusted=True)
        assert values[names[0]][index] == pytest.approx(forward, abs=1e-12)
        assert values[names[1]][index] == pytest.approx(backward, abs=1e-12)
        phi = matthews_corrcoef(row, column, sample_weight=weights)
        assert values["chi2"][index] == pytest.approx(np.sign(phi) * phi**2 * table.sum(), abs=1e-10)


def test_dice_and_jaccard_agree_with_scipy() -> None:
    from scipy.spatial import distance

    tables = random_tables(4, 60, 40)
    values = compute_all(["dice", "jaccard"], *four(tables))
    row, column = np.array([True, True, False, False]), np.array([True, False, True, False])
    for index, table in enumerate(tables):
        first, second = np.repeat(row, table.reshape(-1)), np.repeat(column, table.reshape(-1))
        assert values["dice"][index] == pytest.approx(1 - distance.dice(first, second), abs=1e-12)
        assert values["jaccard"][index] == pytest.approx(1 - distance.jaccard(first, second), abs=1e-12)


def test_chi_square_tail() -> None:
    statistics = np.concatenate([[0.0], np.logspace(-8, 3, 60)])
    np.testing.assert_allclose(chi_square_p(statistics), stats.chi2.sf(statistics, 1), rtol=1e-12)
    np.testing.assert_allclose(chi_square_log_p(statistics), stats.chi2.logsf(statistics, 1), rtol=1e-10, atol=1e-15)
    # Beyond the float range: the tail of the normal distribution, phi(x)/x (1 - 1/x^2 + ...) (Abramowitz & Stegun
    # 26.2.12), doubled.
    x = 10_000.0
    tail = np.log(2 / np.sqrt(2 * np.pi)) - x * x / 2 - np.log(x) + np.log1p(-1 / x**2)
    assert chi_square_log_p(x * x) == pytest.approx(tail, rel=1e-15)
    assert chi_square_p(x * x) == 0


def test_impossible_tables_are_named() -> None:
    joint, first, second, total = [1, 5, 3, 2, 1, 0, np.nan], [2, 4, 4, 9, 1, 0, 1], [2, 6, 2, 9, 1, 0, 1], 10
    np.testing.assert_array_equal(impossible(joint, first, second, total), [0, 1, 1, 1, 0, 0, 1])
    assert impossible(0, 0, 0, 0)
    require_possible([1, 0], [2, 0], [2, 0], 10)
    with pytest.raises(DataError, match=r"^row 3: joint, first_total, second_total, total = 5\.0, 4, 6, 10 cannot be"):
        require_possible(joint, first, second, total, first_row=2)
