"""Trends: against scipy, statsmodels, all permutations of short series, and simulation."""

from __future__ import annotations

from itertools import permutations

import numpy as np
import pytest
import statsmodels.api as sm
from scipy import stats

from colloc.errors import UsageError
from colloc.measures.trend import log_linear_slope, mann_kendall, theil_sen, weighted_slope


def test_mann_kendall_by_all_permutations() -> None:
    # The definition: S of all orders of five different values, and the share at least as far from 0.
    orders = np.array(list(permutations([1.0, 2.0, 4.0, 8.0, 16.0])))
    result = mann_kendall(orders)
    s = np.array([sum(np.sign(row[j] - row[i]) for i in range(5) for j in range(i + 1, 5)) for row in orders])
    np.testing.assert_array_equal(result.s, s)
    np.testing.assert_allclose(result.p, [np.mean(np.abs(s) >= abs(one)) for one in s], rtol=1e-12)


@pytest.mark.parametrize("n", [4, 10, 30])
def test_mann_kendall_agrees_with_kendalls_tau(n: int) -> None:
    series = np.random.default_rng(n).normal(size=(20, n))
    result = mann_kendall(series)
    for row, values in enumerate(series):
        reference = stats.kendalltau(np.arange(n), values, method="exact")
        assert result.tau[row] == pytest.approx(reference.statistic, abs=1e-12)
        assert result.p[row] == pytest.approx(reference.pvalue, rel=1e-9)


def test_mann_kendall_with_ties() -> None:
    # Tau b by scipy. S and its variance by hand: 1 2 2 3 3 3 has S = 11 of 15 pairs (4 of them tied), and
    # Var = (6*5*17 - 2*1*9 - 3*2*11) / 18 = 426 / 18 (Kendall 1975, chapter 4).
    values = [1, 2, 2, 3, 3, 3]
    result = mann_kendall(values)
    assert result.s == 11
    assert result.tau == pytest.approx(stats.kendalltau(np.arange(6), values).statistic)
    assert result.p == pytest.approx(2 * stats.norm.sf(10 / np.sqrt(426 / 18)), rel=1e-12)
    constant = mann_kendall([5, 5, 5, 5])
    assert (constant.s, constant.p) == (0, 1)


def test_mann_kendall_is_fair() -> None:
    series = np.random.default_rng(1).normal(size=(4000, 8))
    assert np.mean(mann_kendall(series).p <= 0.05) <= 0.055
    poisson = np.random.default_rng(2).poisson(4, size=(4000, 60))
    assert np.mean(mann_kendall(poisson).p <= 0.05) == pytest.approx(0.05, abs=0.012)


def test_never_together_is_the_lowest_value() -> None:
    result = mann_kendall([[-np.inf, -np.inf, 1, 2], [1, np.nan, 2, 3]])
    assert result.s[0] == 5
    assert np.isnan([result.s[1], result.tau[1], result.p[1]]).all()


def test_theil_sen_agrees_with_scipy() -> None:
    generator = np.random.default_rng(3)
    times = np.array([1990, 1991, 1993, 1997, 1998, 2001, 2004, 2010, 2011])
    series = generator.normal(size=(20, 9)) + 0.1 * times
    result = theil_sen(series, times, confidence=0.9)
    for row, values in enumerate(series):
        reference = stats.theilslopes(values, times, alpha=0.9)
        np.testing.assert_allclose(
            [result.slope[row], result.interval.low[row], result.interval.high[row]],
            [reference.slope, reference.low_slope, reference.high_slope],
            rtol=1e-10,
        )


def test_theil_sen_is_not_moved_by_one_outlier() -> None:
    values = np.arange(9.0)
    values[4] = 1000
    result = theil_sen([values, np.full(9, np.nan)], np.arange(9))
    assert result.slope[0] == 1
    assert np.isnan([result.slope[1], result.interval.low[1], result.interval.high[1]]).all()


def test_weighted_slope_agrees_with_statsmodels() -> None:
    generator = np.random.default_rng(4)
    times = np.array([0, 1, 2, 5, 7.5])
    series, variances = generator.normal(size=(10, 5)), generator.uniform(0.1, 3, (10, 5))
    result = weighted_slope(series, variances, times)
    for row in range(10):
        fit = sm.WLS(series[row], sm.add_constant(times), weights=1 / variances[row]).fit(cov_type="fixed scale")
        assert result.slope[row] == pytest.approx(fit.params[1], rel=1e-9)
        assert result.interval.se[row] == pytest.approx(fit.bse[1], rel=1e-9)
        assert result.p[row] == pytest.approx(fit.pvalues[1], rel=1e-9)
        low, high = fit.conf_int()[1]
        assert (result.interval.low[row], result.interval.high[row]) == pytest.approx((low, high), rel=1e-8)


def test_weighted_slope_leaves_out_what_is_not_known() -> None:
    whole = weighted_slope([1.0, 2.0, 4.0], [1, 1, 1], [0, 1, 3])
    holes = weighted_slope([1.0, np.nan, 2.0, -np.inf, 4.0], [1, 1, 1, 1, 1], [0, 0.5, 1, 2, 3])
    assert (holes.slope, holes.p) == (whole.slope, whole.p)
    assert np.isnan(weighted_slope([1.0, np.nan], [1, 1], [0, 1]).slope)


def test_log_linear_slope_is_near_poisson_regression() -> None:
    # Frequencies that double every two periods; reference: Poisson regression of statsmodels with offset.
    times, totals = np.arange(8.0), np.array([1, 2, 1, 3, 2, 1, 2, 2]) * 100_000
    counts = np.random.default_rng(5).poisson(1e-3 * 2 ** (times / 2) * totals)
    result = log_linear_slope(counts, totals, times)
    fit = sm.GLM(counts, sm.add_constant(times), family=sm.families.Poisson(), offset=np.log(totals)).fit()
    assert result.slope == pytest.approx(fit.params[1] / np.log(2), abs=0.01)
    assert result.interval.se == pytest.approx(fit.bse[1] / np.log(2), rel=0.02)
    assert result.interval.low <= 0.5 <= result.interval.high


def test_log_linear_slope_keeps_zeros_and_drops_empty_periods() -> None:
    rising = log_linear_slope([0, 1, 10, 0], [1000, 1000, 1000, 0], [1, 2, 3, 4])
    assert np.isfinite(rising.slope)
    assert rising.slope > 0
    assert rising.slope == log_linear_slope([0, 1, 10], 1000, [1, 2, 3]).slope


def test_nonsense_is_refused() -> None:
    with pytest.raises(UsageError, match="at least 3 periods, not 2"):
        mann_kendall([1, 2])
    with pytest.raises(UsageError, match="times must be 3 numbers in ascending order"):
        theil_sen([1, 2, 3], [1, 3, 2])
    with pytest.raises(UsageError, match="times must be 3 numbers in ascending order"):
        weighted_slope([1, 2, 3], [1, 1, 1], [1, 2])
