"""Trends over documents: is an item more frequent in later documents?

As for two groups (`colloc.measures.subcorpora.documents`) two tests must agree: one of ranks, which no single document
carries, and one of means, which does not take longer documents for higher frequency.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from colloc.measures.contingency import FloatArray
from colloc.measures.contrast import t_log_p
from colloc.measures.subcorpora.ranks import DocumentRates, RankScores, agreed_log_p


@dataclass(frozen=True, slots=True)
class TrendTest:
    """Arrays of shape (n_items,).

    Attributes
    ----------
    slope : float64
        Least squares slope of relative frequency over time.
    rank_z : float64
        Standardised sum of ranks times time, above 0 where later documents have higher ranks.
    slope_t : float64
    log_p : float64
        ln of the larger of the two p-values; 0 where the tests point different ways, nan below four documents.
    """

    slope: FloatArray
    rank_z: FloatArray
    slope_t: FloatArray
    log_p: FloatArray


def trend_test(rates: DocumentRates, times: ArrayLike) -> TrendTest:
    """Whether items become more or less frequent, document by document: the same two kinds of test over time.

    The rank test takes the sum of ranks times the documents' times; with the times 0 and 1 it is the rank sum test. In
    the place of Welch's test stands the slope of the relative frequency with a standard error that does not take the
    documents' variances for equal (HC3: MacKinnon & White 1985), t with two degrees of freedom less than documents.

    Parameters
    ----------
    times : array, shape (n_documents,)
        In any unit and order.
    """
    moments = np.asarray(times, dtype=np.float64)
    with np.errstate(divide="ignore", invalid="ignore"):
        rank_z, rank_log_p = RankScores(rates).judge(moments)
        slope, slope_t, slope_log_p = _robust_slope(rates, moments)
    log_p = agreed_log_p(rank_z, rank_log_p, slope, slope_log_p)
    if rates.n_documents < 4 or not np.ptp(moments):
        log_p = np.full(rates.n_items, np.nan)
    return TrendTest(slope, rank_z, slope_t, log_p)


def _robust_slope(rates: DocumentRates, times: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Slope, t and ln p; documents without an item count as 0 and are never written out."""
    n = rates.n_documents
    centred = times - times.mean()
    squares = float((centred**2).sum())
    leverage = 1.0 / n + centred**2 / squares
    weight = centred**2 / (1.0 - leverage) ** 2

    def total(values: FloatArray) -> FloatArray:
        return np.bincount(rates.items, weights=values, minlength=rates.n_items).astype(np.float64)

    at, own = centred[rates.documents], weight[rates.documents]
    mean, slope = total(rates.rates) / n, total(at * rates.rates) / squares
    fitted = mean[rates.items] + slope[rates.items] * at
    # Squared residuals as if no document had the item, then put right where one has.
    none = mean**2 * weight.sum() + 2 * mean * slope * (weight * centred).sum()
    none = none + slope**2 * (weight * centred**2).sum()
    spread = none + total(own * ((rates.rates - fitted) ** 2 - fitted**2))
    t = slope / (np.sqrt(np.maximum(spread, 0.0)) / squares)
    return slope, t, np.where(slope == 0, 0.0, t_log_p(t, np.full(len(t), n - 2.0)))
