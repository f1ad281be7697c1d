"""Two sub-corpora, this and that: how much more frequent a word is, and how much stronger a pair.

A word occurs ``count_this`` times in ``total_this`` tokens, and ``count_that`` times in ``total_that``. As a
two-by-two table, joint = count_this, first_total = total_this, second_total = count_this + count_that and
total = total_this + total_that.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from colloc.measures.contingency import FloatArray
from colloc.measures.intervals import Interval, normal_quantile
from colloc.measures.likelihood import g2
from colloc.measures.odds import ZERO_CORRECTION
from colloc.measures.tails import chi_square_log_p


def as_table(
    count_this: ArrayLike, total_this: ArrayLike, count_that: ArrayLike, total_that: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """``joint, first_total, second_total, total`` of the table in the module docstring, for any measure."""
    this, all_this, that, all_that = _floats(count_this, total_this, count_that, total_that)
    return this, all_this, this + that, all_this + all_that


def relative_frequency_ratio(
    count_this: ArrayLike, total_this: ArrayLike, count_that: ArrayLike, total_that: ArrayLike
) -> FloatArray:
    """(count_this / total_this) / (count_that / total_that) (Manning & Schuetze 1999, section 5.3.4).

    inf where the word occurs in this only, nan where in neither.
    """
    this, all_this, that, all_that = _floats(count_this, total_this, count_that, total_that)
    with np.errstate(divide="ignore", invalid="ignore"):
        return (this / all_this) / (that / all_that)


def log_ratio_interval(
    count_this: ArrayLike,
    total_this: ArrayLike,
    count_that: ArrayLike,
    total_that: ArrayLike,
    *,
    confidence: float = 0.95,
) -> tuple[FloatArray, Interval]:
    """log2 of the relative frequency ratio, and its asymptotic interval, in bits: one unit is a doubling.

    Variance of the natural log: 1/count_this - 1/total_this + 1/count_that - 1/total_that (Agresti 2013,
    chapter 3). Where a count is 0, every cell gets 0.5 more, so the value stays finite.
    """
    this, all_this, that, all_that = _floats(count_this, total_this, count_that, total_that)
    more = np.where((this == 0) | (that == 0), ZERO_CORRECTION, 0.0)
    this, that, all_this, all_that = this + more, that + more, all_this + 2 * more, all_that + 2 * more
    with np.errstate(divide="ignore", invalid="ignore"):
        value = np.log2((this / all_this) / (that / all_that))
        variance = 1.0 / this - 1.0 / all_this + 1.0 / that - 1.0 / all_that
        se = np.sqrt(np.maximum(variance, 0.0)) / np.log(2.0)
    reach = normal_quantile(confidence) * se
    return value, Interval(value - reach, value + reach, se)


def keyness_g2(
    count_this: ArrayLike, total_this: ArrayLike, count_that: ArrayLike, total_that: ArrayLike
) -> FloatArray:
    """G2 over all four cells, positive where the word is more frequent in this (Dunning 1993)."""
    return g2(*as_table(count_this, total_this, count_that, total_that))


def keyness_g2_two_cells(
    count_this: ArrayLike, total_this: ArrayLike, count_that: ArrayLike, total_that: ArrayLike
) -> FloatArray:
    """2 (a ln(a/E1) + b ln(b/E2)) over the two cells that hold the word, signed (Rayson & Garside 2000).

    It leaves out the cells of the other words, and is a little smaller than :func:`keyness_g2`.
    """
    this, all_this, that, all_that = _floats(count_this, total_this, count_that, total_that)
    with np.errstate(divide="ignore", invalid="ignore"):
        share = all_this / (all_this + all_that)
        excess = this * (1.0 - share) - that * share
        expected_this, expected_that = (this + that) * share, (this + that) * (1.0 - share)
        size = _x_log_ratio(this, expected_this) + _x_log_ratio(that, expected_that)
    return np.copysign(2.0 * np.maximum(size, 0.0), excess) + 0.0


def t_of_difference(count_this: ArrayLike, count_that: ArrayLike) -> FloatArray:
    """(O1 - O2) / sqrt(O1 + O2) for counts out of the same total (Church et al. 1991; Manning & Schuetze 1999, 5.3.2).

    For words that tell two near-synonyms apart; nan where both counts are 0.
    """
    this, that = np.asarray(count_this, dtype=np.float64), np.asarray(count_that, dtype=np.float64)
    with np.errstate(invalid="ignore"):
        return (this - that) / np.sqrt(this + that)


@dataclass(frozen=True, slots=True)
class Difference:
    """A difference this - that, its standard error, z = difference / se, and ln of the two-sided normal p-value."""

    difference: FloatArray
    se: FloatArray
    z: FloatArray
    log_p: FloatArray


def difference(this: ArrayLike, se_this: ArrayLike, that: ArrayLike, se_that: ArrayLike) -> Difference:
    """Difference of two independent estimates; for log odds ratios this is Woolf's test (Woolf 1955)."""
    gap = np.asarray(this, dtype=np.float64) - np.asarray(that, dtype=np.float64)
    se = np.hypot(np.asarray(se_this, dtype=np.float64), np.asarray(se_that, dtype=np.float64))
    with np.errstate(divide="ignore", invalid="ignore"):
        z = gap / se
    return Difference(gap, se, z, chi_square_log_p(z * z))


def welch_test(
    mean_this: ArrayLike,
    variance_this: ArrayLike,
    documents_this: ArrayLike,
    mean_that: ArrayLike,
    variance_that: ArrayLike,
    documents_that: ArrayLike,
) -> tuple[Difference, FloatArray]:
    """Difference of two means over documents, the variances unequal (Welch 1947), and its degrees of freedom.

    With relative frequencies of documents as the values, one talkative document raises the variance as much as the
    mean, and so proves nothing by itself.

    Parameters
    ----------
    mean_*, variance_* : arrays
        Mean and sample variance (divisor n - 1) of the values of the documents.
    documents_* : arrays
        How many documents there are; below two the p-value is nan.

    Returns
    -------
    Difference, df
        ``z`` holds the t statistic; ``log_p`` is ln of the two-sided p-value of the t distribution, nan where both
        variances are 0.
    """
    n_this, n_that = np.asarray(documents_this, dtype=np.float64), np.asarray(documents_that, dtype=np.float64)
    gap = np.asarray(mean_this, dtype=np.float64) - np.asarray(mean_that, dtype=np.float64)
    with np.errstate(divide="ignore", invalid="ignore"):
        share_this = np.asarray(variance_this, dtype=np.float64) / n_this
        share_that = np.asarray(variance_that, dtype=np.float64) / n_that
        se = np.sqrt(share_this + share_that)
        df = (share_this + share_that) ** 2 / (share_this**2 / (n_this - 1.0) + share_that**2 / (n_that - 1.0))
        t = gap / se
        log_p = np.where(np.minimum(n_this, n_that) < 2, np.nan, t_log_p(t, df))
    return Difference(gap, se, t, log_p), df


def t_log_p(t: FloatArray, df: FloatArray) -> FloatArray:
    """ln P(|T| > abs(t)) for the t distribution with ``df`` degrees of freedom."""
    from scipy.special import betainc

    # The tail as an incomplete beta function of df / (df + t^2), which is small where the p-value is.
    return np.log(np.asarray(betainc(0.5 * df, 0.5, df / (df + t * t)), dtype=np.float64))


def _floats(*arguments: ArrayLike) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    first, second, third, fourth = (np.asarray(argument, dtype=np.float64) for argument in arguments)
    return first, second, third, fourth


def _x_log_ratio(observed: FloatArray, expected: FloatArray) -> FloatArray:
    return np.where(observed == 0, 0.0, observed * np.log(observed / expected))
