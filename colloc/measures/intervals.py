"""How sure a value is: asymptotic intervals for one table, and the jackknife over groups of documents.

The asymptotic intervals take observations as independent. Words cluster in documents, and the pairs of one window
overlap, so these intervals are too narrow on running text; the delete-a-group jackknife is not.
"""

from __future__ import annotations

from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
from numpy.typing import ArrayLike

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray, Table, evaluate, table_function
from colloc.measures.odds import log_odds, log_odds_se
from colloc.measures.tails import t_quantile


@dataclass(frozen=True, slots=True)
class Interval:
    """Bounds and standard error, float64 arrays of one shape, in the unit of the estimate."""

    low: FloatArray
    high: FloatArray
    se: FloatArray


def normal_quantile(confidence: float) -> float:
    """The two-sided standard normal quantile: 1.96 for 0.95.

    Raises
    ------
    UsageError
        ``confidence`` is not between 0 and 1.
    """
    return NormalDist().inv_cdf(0.5 + 0.5 * _checked(confidence))


def _checked(confidence: float) -> float:
    if not 0 < confidence < 1:
        raise UsageError(f"confidence must be between 0 and 1, such as 0.95, not {confidence}")
    return confidence


@table_function
def pmi_variance(table: Table) -> FloatArray:
    """Asymptotic variance of PMI in bits^2: (1/O - 1/R - 1/C + 2 O/(R C) - 1/N) / ln^2 2; inf where O is 0.

    The delta method for multinomial cells (Agresti 2013, section 16.1). 0 where the words are never apart and all
    observations hold both.
    """
    variance = (
        1.0 / table.joint
        - 1.0 / table.first_total
        - 1.0 / table.second_total
        + 2.0 * table.joint / table.margin_product
        - 1.0 / table.total
    )
    # Rounding may leave a tiny negative number where the variance vanishes.
    return np.where(table.joint == 0, np.inf, np.maximum(variance, 0.0) / np.log(2.0) ** 2)


def pmi_interval(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike, *, confidence: float = 0.95
) -> Interval:
    """PMI -/+ z times its asymptotic standard error, in bits; (-inf, inf) where the words never meet."""
    value, variance = evaluate([lambda table: table.pmi, pmi_variance.rule], joint, first_total, second_total, total)
    return _symmetric(value, np.sqrt(variance), normal_quantile(confidence))


def log_odds_interval(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike, *, confidence: float = 0.95
) -> Interval:
    """Log odds ratio -/+ z times its standard error (Woolf 1955), in nats, on cells corrected where one is zero."""
    value, se = evaluate([log_odds.rule, log_odds_se.rule], joint, first_total, second_total, total)
    return _symmetric(value, se, normal_quantile(confidence))


def jackknife(estimate: ArrayLike, replicates: ArrayLike, *, confidence: float = 0.95) -> Interval:
    """Delete-a-group jackknife (Kott 2001): documents dealt into g groups, the measure computed without each.

    Parameters
    ----------
    estimate : array, shape (...)
        The measure on everything.
    replicates : array, shape (g, ...)
        The measure on everything but group i.
    confidence : float
        The t distribution with g - 1 degrees of freedom gives the factor: 2.09 for 20 groups and 0.95.

    Returns
    -------
    Interval
        se = sqrt((g - 1) / g * sum (replicate - their mean)^2). (-inf, inf) where the estimate or a replicate is not
        finite: then the measure hangs on a single group, and the sample bears no claim.

    Raises
    ------
    UsageError
        Fewer than two groups.
    """
    without = np.asarray(replicates, dtype=np.float64)
    groups = without.shape[0] if without.ndim else 0
    if groups < 2:
        raise UsageError(f"the jackknife needs at least 2 groups, not {groups}")
    value = np.asarray(estimate, dtype=np.float64)
    finite = np.isfinite(value) & np.all(np.isfinite(without), axis=0)
    sound = np.where(finite, without, 0.0)
    spread = np.sum((sound - sound.mean(axis=0)) ** 2, axis=0)
    se = np.where(finite, np.sqrt((groups - 1) / groups * spread), np.inf)
    return _symmetric(value, se, t_quantile(_checked(confidence), groups - 1))


def jackknife_difference(this: Interval, that: Interval) -> FloatArray:
    """Standard error of the difference of two measures taken on separate documents."""
    return np.hypot(this.se, that.se)


def _symmetric(value: FloatArray, se: FloatArray, factor: float) -> Interval:
    unknown = np.isinf(se)
    with np.errstate(invalid="ignore"):
        low = np.where(unknown, -np.inf, value - factor * se)
        high = np.where(unknown, np.inf, value + factor * se)
    return Interval(low, high, se)
