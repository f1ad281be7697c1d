"""Relative frequencies by period, with a variance that lets documents, not words, be the independent observations."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.measures.contingency import FloatArray
from colloc.measures.intervals import normal_quantile

Int64Array = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class PeriodRates:
    """Arrays of shape (n_items, n_periods), but for ``tokens`` and ``documents`` of shape (n_periods,).

    Attributes
    ----------
    count : int64
    held : int64
        Documents of the period that hold the item.
    tokens, documents : int64
    rate : float64
        count / tokens.
    log2_rate, log2_variance : float64
        log2((count + 1/2) / tokens) and its variance: the larger of the Poisson variance 1 / (count + 1/2) and the
        relative variance of the ratio estimator over documents (Cochran 1977, section 6.4), in bits^2; inf where the
        period has a single document.
    low, high : float64
        95 % bounds of the rate; for a count of 0 from 0 to the exact Poisson bound 3.69 / tokens.
    """

    count: Int64Array
    held: Int64Array
    tokens: Int64Array
    documents: Int64Array
    rate: FloatArray
    log2_rate: FloatArray
    log2_variance: FloatArray
    low: FloatArray
    high: FloatArray


def period_rates(
    items: Int64Array,
    documents: Int64Array,
    counts: Int64Array,
    sizes: ArrayLike,
    period: Int64Array,
    n_items: int,
    n_periods: int,
) -> PeriodRates:
    """Rates of many items at once.

    Parameters
    ----------
    items, documents, counts : int64 arrays, shape (m,)
        Which item stands how often in which document; each combination at most once.
    sizes : array, shape (n_documents,)
        Tokens of each document.
    period : int64 array, shape (n_documents,)
        0 .. n_periods - 1.
    """
    size = np.asarray(sizes, dtype=np.float64)
    tokens = np.bincount(period, weights=size, minlength=n_periods)
    squares = np.bincount(period, weights=size**2, minlength=n_periods)
    n_documents = np.bincount(period, minlength=n_periods)
    cell = items * n_periods + period[documents]
    own = size[documents]

    def table(values: FloatArray) -> FloatArray:
        sums = np.bincount(cell, weights=values, minlength=n_items * n_periods)
        return sums.reshape(n_items, n_periods).astype(np.float64)

    count = table(counts.astype(np.float64))
    held = table(np.ones(len(cell)))
    with np.errstate(divide="ignore", invalid="ignore"):
        rate = count / tokens
        # Residuals count - rate * size: those of documents without the item are -rate * size.
        there = table((counts - rate.reshape(-1)[cell] * own) ** 2)
        residual = there + rate**2 * (squares - table(own**2))
        factor = np.where(n_documents > 1, n_documents / (n_documents - 1.0), np.inf)
        relative = np.where(count > 0, factor * residual / count**2, 0.0)
        poisson = 1.0 / (count + 0.5)
        variance = np.where(n_documents > 1, np.maximum(relative, poisson), np.inf)
        reach = np.exp(normal_quantile(0.95) * np.sqrt(variance))
        none = count == 0
        low = np.where(none, 0.0, rate / reach)
        high = np.where(none, -np.log(0.025) / tokens, rate * reach)
        log2_rate = np.log2((count + 0.5) / tokens)
    whole = np.int64
    return PeriodRates(
        count.astype(whole),
        held.astype(whole),
        tokens.astype(whole),
        n_documents.astype(whole),
        rate,
        log2_rate,
        variance / np.log(2.0) ** 2,
        low,
        high,
    )
