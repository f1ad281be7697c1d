"""Change over ordered periods: is there a monotone trend, and how steep is it.

Periods lie along the **last** axis, many words or pairs along the axes before it.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray
from colloc.measures.intervals import Interval, normal_quantile
from colloc.measures.tails import chi_square_p

_EXACT_PERIODS = 40
"""Up to here the exact distribution is used where no two values are equal."""


@dataclass(frozen=True, slots=True)
class MonotoneTrend:
    """Mann-Kendall: s (concordant minus discordant pairs), tau_b, its two-sided p-value."""

    s: FloatArray
    tau: FloatArray
    p: FloatArray


@dataclass(frozen=True, slots=True)
class Slope:
    """Change for one unit of time, with its interval; ``p`` (two-sided) is nan where no test belongs to the method."""

    slope: FloatArray
    interval: Interval
    p: FloatArray


def mann_kendall(values: ArrayLike) -> MonotoneTrend:
    """Mann-Kendall test for a monotone trend (Mann 1945; Kendall 1975), two-sided.

    Exact for up to 40 periods without equal values, else normal with continuity and tie correction.

    Parameters
    ----------
    values : array, shape (..., n)
        -inf and inf count as smallest and largest; rows that hold nan give nan.

    Raises
    ------
    UsageError
        Fewer than three periods: no result could be significant.
    """
    series = _series(values, 3)
    n = series.shape[-1]
    i, j = np.triu_indices(n, 1)
    later, earlier = series[..., j], series[..., i]
    # Compared, not subtracted: the difference of two infinities would be nan.
    s = np.sum((later > earlier).astype(np.float64) - (later < earlier), axis=-1)
    pairs = n * (n - 1) / 2
    variance, tied_pairs = _score_variance(series)
    with np.errstate(divide="ignore", invalid="ignore"):
        tau = s / np.sqrt(pairs * (pairs - tied_pairs))
        z = np.maximum(np.abs(s) - 1.0, 0.0) / np.sqrt(variance)
        p = np.where(variance > 0, chi_square_p(z * z), 1.0)
    if n <= _EXACT_PERIODS:
        p = np.where(tied_pairs == 0, _exact_p(n)[np.abs(s).astype(np.int64)], p)
    unknown = np.isnan(series).any(axis=-1)
    return MonotoneTrend(*(np.where(unknown, np.nan, result) for result in (s, tau, p)))


def _score_variance(series: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Variance of S where there is no trend (Kendall 1975, chapter 4), and the number of pairs of equal values."""
    n = series.shape[-1]
    same = np.count_nonzero(series[..., :, np.newaxis] == series[..., np.newaxis, :], axis=-1)
    others = np.asarray(same, dtype=np.float64) - 1
    # Each of the t members of a group of equal values brings the t-th part of the group's term.
    variance = (n * (n - 1) * (2 * n + 5) - np.sum(others * (2 * others + 7), axis=-1)) / 18
    return variance, 0.5 * np.sum(others, axis=-1)


@cache
def _exact_p(n: int) -> FloatArray:
    """P(|S| >= s) for s = 0 .. n(n-1)/2, from the number of permutations with each number of inversions."""
    inversions = np.ones(1)
    for size in range(2, n + 1):
        inversions = np.convolve(inversions, np.full(size, 1.0 / size))
    scores = np.abs(np.arange(inversions.size) * 2 - (inversions.size - 1))
    by_score = np.bincount(scores, weights=inversions, minlength=inversions.size)
    return np.minimum(np.cumsum(by_score[::-1])[::-1], 1.0)


def theil_sen(values: ArrayLike, times: ArrayLike, *, confidence: float = 0.95) -> Slope:
    """Median of the slopes of all pairs of periods, with the interval of Sen (1968); one outlier does not move it.

    Parameters
    ----------
    values : array, shape (..., n)
    times : array, shape (n,)
        Strictly ascending.

    Returns
    -------
    Slope
        ``interval.se`` and ``p`` are nan: the interval comes from ranks; :func:`mann_kendall` is the test. Rows with
        a value that is not finite give nan.
    """
    series = _series(values, 3)
    moments = _times(times, series.shape[-1])
    n = moments.size
    i, j = np.triu_indices(n, 1)
    unknown = np.asarray(~np.isfinite(series).all(axis=-1))
    sound = np.where(unknown[..., np.newaxis], 0.0, series)
    slopes = np.sort((sound[..., j] - sound[..., i]) / (moments[j] - moments[i]), axis=-1)
    variance, _ = _score_variance(sound)
    reach = normal_quantile(confidence) * np.sqrt(np.maximum(variance, 0.0))
    count = i.size
    lower = np.clip(np.round((count - reach) / 2) - 1, 0, count - 1).astype(np.int64)
    upper = np.clip(np.round((count + reach) / 2), 0, count - 1).astype(np.int64)

    def at(rank: NDArray[np.int64]) -> FloatArray:
        return np.take_along_axis(slopes, rank[..., np.newaxis], axis=-1)[..., 0]

    nothing = np.full(unknown.shape, np.nan)
    low, high, middle = (np.where(unknown, np.nan, v) for v in (at(lower), at(upper), np.median(slopes, axis=-1)))
    return Slope(middle, Interval(low, high, nothing), nothing)


def weighted_slope(values: ArrayLike, variances: ArrayLike, times: ArrayLike, *, confidence: float = 0.95) -> Slope:
    """Straight line through values of known variance, by weighted least squares (Agresti 2013, chapter 16).

    Parameters
    ----------
    values, variances : arrays, shape (..., n)
        Periods whose value or variance is not finite, or whose variance is 0, are left out; nan where fewer than two
        are left.
    times : array, shape (n,)
        Strictly ascending.
    """
    series = _series(values, 2)
    spread = np.broadcast_to(np.asarray(variances, dtype=np.float64), series.shape)
    moments = _times(times, series.shape[-1])
    with np.errstate(divide="ignore", invalid="ignore"):
        usable = np.isfinite(series) & np.isfinite(spread) & (spread > 0)
        weight = np.where(usable, 1.0 / spread, 0.0)
        sound = np.where(usable, series, 0.0)
        mass = weight.sum(axis=-1)
        centred = moments - ((weight * moments).sum(axis=-1) / mass)[..., np.newaxis]
        squares = (weight * centred**2).sum(axis=-1)
        enough = usable.sum(axis=-1) >= 2
        slope = np.where(enough, (weight * centred * sound).sum(axis=-1) / squares, np.nan)
        se = np.where(enough, 1.0 / np.sqrt(squares), np.nan)
        z = slope / se
    reach = normal_quantile(confidence) * se
    return Slope(slope, Interval(slope - reach, slope + reach, se), chi_square_p(z * z))


def log_linear_slope(counts: ArrayLike, totals: ArrayLike, times: ArrayLike, *, confidence: float = 0.95) -> Slope:
    """Slope of log2(relative frequency) over time: doublings for one unit of time.

    Weighted least squares on log2((count + 1/2) / total) with weights (count + 1/2) ln^2 2, its inverse Poisson
    variance: zero counts stay in, and large periods count for more. Periods without tokens are left out.

    Parameters
    ----------
    counts : array, shape (..., n)
    totals : array, broadcasts to the shape of ``counts``
    times : array, shape (n,)
    """
    seen = np.asarray(counts, dtype=np.float64) + 0.5
    with np.errstate(divide="ignore"):
        values = np.log2(seen / np.asarray(totals, dtype=np.float64))
    return weighted_slope(values, 1.0 / (seen * np.log(2.0) ** 2), times, confidence=confidence)


def _series(values: ArrayLike, least: int) -> FloatArray:
    series = np.asarray(values, dtype=np.float64)
    periods = series.shape[-1] if series.ndim else 0
    if periods < least:
        raise UsageError(f"a trend needs at least {least} periods, not {periods}")
    return series


def _times(times: ArrayLike, periods: int) -> FloatArray:
    moments = np.asarray(times, dtype=np.float64)
    if moments.shape != (periods,) or not np.all(np.diff(moments) > 0):
        raise UsageError(f"times must be {periods} numbers in ascending order, one for each period")
    return moments
