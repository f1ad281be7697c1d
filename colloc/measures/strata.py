"""One pair in several strata (periods, genres, documents): pooled odds ratios, and whether the strata agree.

All functions take the four numbers of a table with the strata along the **last** axis, many pairs along the axes
before it, and return arrays without the last axis. Strata in which a margin is empty or full say nothing and are left
out; where none is left the results are nan.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.measures.contingency import FloatArray, Table, expected
from colloc.measures.intervals import Interval, normal_quantile
from colloc.measures.odds import log_odds, log_odds_se
from colloc.measures.tails import chi_square_p

LEAST_EXPECTED = 1.0
"""Where fewer meetings than this are expected and none is seen, an odds ratio with 0.5 added is mostly the 0.5."""


@dataclass(frozen=True, slots=True)
class PooledOdds:
    """A common log odds ratio (nats) and its interval."""

    log_odds: FloatArray
    interval: Interval


@dataclass(frozen=True, slots=True)
class StrataTest:
    """A chi-square statistic, its degrees of freedom, and the p-value."""

    statistic: FloatArray
    df: FloatArray
    p: FloatArray


def mantel_haenszel(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike, *, confidence: float = 0.95
) -> PooledOdds:
    """Pooled odds ratio sum(ad/N) / sum(bc/N) (Mantel & Haenszel 1959), variance of Robins, Breslow & Greenland (1986).

    Right both for few large strata and for many small ones. -inf or inf, with an infinite interval, where all a d or
    all b c are zero.
    """
    with np.errstate(all="ignore"):
        table, says = _tables(joint, first_total, second_total, total)
        a, b, c, d = table.cells()
        whole = np.broadcast_to(table.total, says.shape)
        r, s = _kept(a * d / whole, says), _kept(b * c / whole, says)
        p, q = _kept((a + d) / whole, says), _kept((b + c) / whole, says)
        r_sum, s_sum = r.sum(axis=-1), s.sum(axis=-1)
        variance = (
            (p * r).sum(axis=-1) / (2 * r_sum**2)
            + (p * s + q * r).sum(axis=-1) / (2 * r_sum * s_sum)
            + (q * s).sum(axis=-1) / (2 * s_sum**2)
        )
        value = np.log(r_sum / s_sum)
        se = np.where(np.isinf(value), np.inf, np.sqrt(variance))
        reach = normal_quantile(confidence) * se
        low = np.where(np.isinf(value), -np.inf, value - reach)
        high = np.where(np.isinf(value), np.inf, value + reach)
        return PooledOdds(value, Interval(low, high, se))


def mantel_haenszel_test(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike, *, correction: bool = False
) -> StrataTest:
    """Cochran-Mantel-Haenszel test that the pair is independent in every stratum (one degree of freedom).

    (|sum (a - E)| - correction/2)^2 / sum R C (N-R) (N-C) / (N^2 (N-1)) (Mantel & Haenszel 1959; Agresti 2013,
    section 6.4.2).
    """
    with np.errstate(all="ignore"):
        table, says = _tables(joint, first_total, second_total, total)
        n, row, column = table.total, table.first_total, table.second_total
        variance = (row / n) * (column / n) * (n - row) * (n - column) / (n - 1.0)
        excess = np.abs(_kept(table.excess, says).sum(axis=-1))
        if correction:
            excess = np.maximum(excess - 0.5, 0.0)
        statistic = excess**2 / _kept(variance, says).sum(axis=-1)
        return StrataTest(statistic, np.ones_like(statistic), chi_square_p(statistic))


def breslow_day(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike, *, tarone: bool = True
) -> StrataTest:
    """Breslow-Day test that the odds ratio is the same in all strata (Breslow & Day 1980, section 4.4).

    Parameters
    ----------
    tarone : bool
        Tarone's (1985) adjustment, which makes the statistic chi-square distributed.
    """
    with np.errstate(all="ignore"):
        table, says = _tables(joint, first_total, second_total, total)
        pooled = mantel_haenszel(joint, first_total, second_total, total)
        fitted = _fitted_joint(table, np.exp(pooled.log_odds)[..., np.newaxis])
        spread = 1.0 / (
            1.0 / fitted
            + 1.0 / (table.first_total - fitted)
            + 1.0 / (table.second_total - fitted)
            + 1.0 / (table.total - table.first_total - table.second_total + fitted)
        )
        gap = table.joint - fitted
        statistic = _kept(gap**2 / spread, says).sum(axis=-1)
        if tarone:
            statistic = statistic - _kept(gap, says).sum(axis=-1) ** 2 / _kept(spread, says).sum(axis=-1)
        # Without a finite pooled odds ratio there is nothing the strata could depart from.
        return _homogeneity(np.where(np.isfinite(pooled.log_odds), statistic, np.nan), says)


def woolf(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike, *, confidence: float = 0.95
) -> tuple[PooledOdds, StrataTest]:
    """Log odds ratios weighted by 1 / se^2, and the test that they are the same in all strata (Woolf 1955).

    For few large strata; tables with a zero have 0.5 added to each cell, but for those of :func:`tells_nothing`, which
    are left out: their odds ratio would be that of the 0.5.
    """
    with np.errstate(all="ignore"):
        table, says = _tables(joint, first_total, second_total, total)
        says &= ~tells_nothing(table.joint, table.first_total, table.second_total, table.total)
        value = log_odds.rule(table)
        weight = _kept(1.0 / log_odds_se.rule(table) ** 2, says)
        mass = weight.sum(axis=-1)
        mean = _kept(weight * value, says).sum(axis=-1) / mass
        statistic = _kept(weight * (value - mean[..., np.newaxis]) ** 2, says).sum(axis=-1)
        se = 1.0 / np.sqrt(mass)
        reach = normal_quantile(confidence) * se
        return PooledOdds(mean, Interval(mean - reach, mean + reach, se)), _homogeneity(statistic, says)


def tells_nothing(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike
) -> NDArray[np.bool]:
    """Whether a pair never met where less than ``LEAST_EXPECTED`` meetings were expected (project-defined limit)."""
    silent: NDArray[np.bool] = (np.asarray(joint) == 0) & (
        expected(joint, first_total, second_total, total) < LEAST_EXPECTED
    )
    return silent


def _tables(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike
) -> tuple[Table, NDArray[np.bool]]:
    """The tables, and which strata say anything."""
    columns = np.broadcast_arrays(*(np.asarray(c, dtype=np.float64) for c in (joint, first_total, second_total, total)))
    table = Table(*columns)
    rows = (table.first_total > 0) & (table.first_total < table.total)
    return table, rows & (table.second_total > 0) & (table.second_total < table.total)


def _kept(values: FloatArray, says: NDArray[np.bool]) -> FloatArray:
    return np.where(says, values, 0.0)


def _fitted_joint(table: Table, odds_ratio: FloatArray) -> FloatArray:
    """The joint count that has the given odds ratio under the table's margins: a root of a quadratic."""
    row, column, n = table.first_total, table.second_total, table.total
    square = odds_ratio - 1.0
    linear = (n - row - column) + odds_ratio * (row + column)
    # The root in the form that neither cancels nor divides by zero at an odds ratio of 1.
    return 2.0 * odds_ratio * row * column / (linear + np.sqrt(linear**2 - 4.0 * square * odds_ratio * row * column))


def _homogeneity(statistic: FloatArray, says: NDArray[np.bool]) -> StrataTest:
    from scipy.special import gammaincc

    df = np.maximum(says.sum(axis=-1) - 1.0, 0.0)
    enough = df > 0
    p = np.where(enough, gammaincc(np.maximum(df, 1.0) / 2.0, statistic / 2.0), np.nan)
    return StrataTest(np.where(enough, statistic, np.nan), df, p)
