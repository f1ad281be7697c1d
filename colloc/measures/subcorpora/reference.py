"""A corpus against rates that are known from elsewhere, taken as they are: only the corpus is a sample."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from colloc.measures.contingency import FloatArray
from colloc.measures.contrast import welch_test
from colloc.measures.intervals import Interval, normal_quantile
from colloc.measures.odds import ZERO_CORRECTION


def log_ratio_to_rate(
    count: ArrayLike, total: ArrayLike, rate: ArrayLike, *, confidence: float = 0.95
) -> tuple[FloatArray, Interval]:
    """log2 of the relative frequency over a known rate, with its asymptotic interval, in bits.

    Variance of the natural log of a proportion: 1/count - 1/total (Agresti 2013, section 3.1.6). A count of 0 is
    taken as 0.5 of total + 1.
    """
    seen, size, known = (np.asarray(values, dtype=np.float64) for values in (count, total, rate))
    more = np.where(seen == 0, ZERO_CORRECTION, 0.0)
    seen, size = seen + more, size + 2 * more
    with np.errstate(divide="ignore", invalid="ignore"):
        value = np.log2(seen / size / known)
        se = np.sqrt(np.maximum(1.0 / seen - 1.0 / size, 0.0)) / np.log(2.0)
    reach = normal_quantile(confidence) * se
    return value, Interval(value - reach, value + reach, se)


def g2_to_rate(count: ArrayLike, total: ArrayLike, rate: ArrayLike) -> FloatArray:
    """G2 of one proportion against a known rate: 2 sum O ln(O / E) over "the word" and "other words".

    Positive where the word is more frequent than the rate says; chi-square distributed with one degree of freedom
    (Agresti 2013, section 1.4.1).
    """
    from scipy.special import xlogy

    seen, size, known = (np.asarray(values, dtype=np.float64) for values in (count, total, rate))
    expected = size * known
    with np.errstate(divide="ignore", invalid="ignore"):
        half = xlogy(seen, seen / expected) + xlogy(size - seen, (size - seen) / (size - expected))
    signed: FloatArray = np.copysign(2.0 * np.maximum(half, 0.0), seen - expected) + 0.0
    return signed


def rate_test_log_p(mean: ArrayLike, variance: ArrayLike, documents: ArrayLike, rate: ArrayLike) -> FloatArray:
    """ln of the two-sided p-value of Student's t-test of the mean over documents against a known rate.

    nan where there are fewer than two documents, or all have the same value.
    """
    known = np.asarray(rate, dtype=np.float64)
    # Welch's test with a second group that has no variance is the one-sample test.
    gap, _ = welch_test(mean, variance, documents, known, np.zeros_like(known), 2)
    return np.where(np.asarray(variance) > 0, gap.log_p, np.nan)
