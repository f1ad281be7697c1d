"""Ranks of relative frequencies over documents, and what exchanging the documents' labels or times does to them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colloc.measures.contingency import FloatArray

Int64Array = NDArray[np.int64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class DocumentRates:
    """Relative frequencies of many items in many documents; those that are not named are 0.

    Attributes
    ----------
    items, documents : int64 arrays, shape (m,)
        Each combination at most once.
    rates : float64 array, shape (m,)
        Above 0.
    n_items, n_documents : int
    """

    items: Int64Array
    documents: Int64Array
    rates: FloatArray
    n_items: int
    n_documents: int


class RankScores:
    """Midranks less the midrank of the documents without the item, so that most scores are 0."""

    def __init__(self, rates: DocumentRates) -> None:
        self._rates = rates
        order = np.lexsort((rates.rates, rates.items))
        items, values = rates.items[order], rates.rates[order]
        held = np.bincount(rates.items, minlength=rates.n_items)
        starts = np.cumsum(held) - held
        place = np.arange(len(items)) - starts[items] + 1.0
        fresh = np.ones(len(items), dtype=np.bool_)
        fresh[1:] = (items[1:] != items[:-1]) | (values[1:] != values[:-1])
        run = np.cumsum(fresh) - 1
        lengths = np.bincount(run, minlength=1)
        midplace = (place[fresh] + (lengths - 1) / 2.0)[run] if len(items) else place
        absent = rates.n_documents - held
        # Ranks of the absent are 1 .. absent, their midrank (absent + 1) / 2.
        self._score = np.empty(len(items))
        self._score[order] = midplace + (absent[items] - 1) / 2.0
        n = float(rates.n_documents)
        first, second, third = (self._total(self._score**power) / n for power in (1, 2, 3))
        self._mean = first
        self._spread = np.maximum(second - first**2, 0.0)
        self._lean = third - 3 * first * second + 2 * first**3

    def _total(self, values: FloatArray) -> FloatArray:
        return np.bincount(self._rates.items, weights=values, minlength=self._rates.n_items).astype(np.float64)

    def standardised(self, weights: FloatArray) -> FloatArray:
        """z of the sum of scores times weights, over all ways to deal the weights out; 0 where all scores are equal.

        Parameters
        ----------
        weights : float64 array, shape (n_documents, n)

        Returns
        -------
        float64 array, shape (n_items, n)
        """
        n = float(self._rates.n_documents)
        centred = weights - weights.mean(axis=0)
        sums = by_documents(self._rates, self._score, centred)
        se = n * np.sqrt(np.outer(self._spread, (centred**2).mean(axis=0)) / (n - 1.0))
        return np.where(se > 0, sums / se, 0.0)

    def between(self, members: BoolArray) -> FloatArray:
        """Kruskal-Wallis H of the groups in the columns of ``members``; 0 where all scores are equal."""
        n, sizes = float(self._rates.n_documents), members.sum(axis=0)
        sums = by_documents(self._rates, self._score, members.astype(np.float64))
        gaps = sums - np.outer(self._mean, sizes)
        # The ranks' variance has the divisor n - 1, which brings the correction for ties with it.
        spread = self._spread * n / (n - 1.0)
        return np.where(spread > 0, (gaps**2 / sizes).sum(axis=1) / spread, 0.0)

    def judge(self, weights: FloatArray) -> tuple[FloatArray, FloatArray]:
        """z, and ln of the two-sided p-value from the Pearson type III curve; weights of shape (n_documents,)."""
        n = float(self._rates.n_documents)
        z = self.standardised(weights[:, np.newaxis])[:, 0]
        centred = weights - weights.mean()
        se = n * np.sqrt(self._spread * (centred**2).mean() / (n - 1.0))
        third = n**3 * self._lean * (centred**3).mean() / ((n - 1.0) * (n - 2.0))
        skewness = np.where(se > 0, third / se**3, 0.0)
        # Twice the smaller tail: a skewed curve has no natural other tail.
        tail = np.minimum(_upper_tail(z, skewness), _upper_tail(-z, -skewness))
        return z, np.minimum(np.log(2.0) + tail, 0.0)


def _upper_tail(z: FloatArray, skewness: FloatArray) -> FloatArray:
    """ln P(Z >= z) for the Pearson type III curve with mean 0, variance 1 and the given skewness."""
    from scipy.special import gammainc, gammaincc, log_ndtr

    lean = np.abs(skewness)
    curved = lean > 1e-3
    shape = 4.0 / np.where(curved, lean, 1.0) ** 2
    # Standardised gamma deviates: Z = (G - shape) / sqrt(shape), mirrored where the skewness is negative.
    deviate = np.maximum(shape + np.where(skewness < 0, -z, z) * np.sqrt(shape), 0.0)
    upper = np.where(skewness < 0, gammainc(shape, deviate), gammaincc(shape, deviate))
    with np.errstate(divide="ignore"):
        return np.where(curved, np.log(upper), log_ndtr(-z))


def by_documents(rates: DocumentRates, values: FloatArray, weights: FloatArray) -> FloatArray:
    """Values of the items in documents times each column of document weights, added up; shape (n_items, n)."""
    from scipy.sparse import csr_array

    table = csr_array((values, (rates.items, rates.documents)), shape=(rates.n_items, rates.n_documents))
    return np.asarray(table @ weights, dtype=np.float64)


def agreed_log_p(z: FloatArray, rank_log_p: FloatArray, mean: FloatArray, mean_log_p: FloatArray) -> FloatArray:
    """ln of the p-value of two tests that must agree."""
    agree = np.sign(z) == np.sign(mean)
    return np.minimum(np.where(agree, np.maximum(rank_log_p, mean_log_p), 0.0), 0.0)
