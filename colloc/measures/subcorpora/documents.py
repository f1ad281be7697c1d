"""Two groups of documents: is an item more frequent in one of them, document by document?

The values are relative frequencies in documents, and documents are the observations: an item that one document
repeats five hundred times is one large value among many. Two tests are made, and the weaker of them counts:

* the rank sum test (Wilcoxon 1945; Mann & Whitney 1947), which does not care how large a value is. Its p-value is that
  of exchanging the labels of documents: a Pearson type III curve with the exact mean, variance and skewness of the
  rank sum over all exchanges (as Mielke, Berry & Brier 1981 do for a related statistic). A normal curve promises far
  too much where groups differ in size and few documents hold the item;
* Welch's (1947) test of the mean relative frequency, which does not take "occurs in more documents" for "is more
  frequent" where the documents of one group are longer.

Both must point the same way. A finding needs both, so the larger p-value is a valid p-value for "either test's
hypothesis of no difference is true" (the intersection-union test: Berger 1982).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray
from colloc.measures.contrast import t_log_p, welch_test

Int64Array = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

_LABELLINGS_AT_ONCE = 64


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


@dataclass(frozen=True, slots=True)
class GroupsTest:
    """Kruskal-Wallis over any number of groups, arrays of shape (n_items,): H, and ln of its p-value."""

    h: FloatArray
    log_p: FloatArray


def groups_test(rates: DocumentRates, group: Int64Array) -> GroupsTest:
    """Whether the relative frequencies of items rank alike in all groups of documents (Kruskal & Wallis 1952).

    H with the correction for ties, chi-square distributed with one degree of freedom less than there are groups.

    Parameters
    ----------
    group : int64 array, shape (n_documents,)
        0 .. n_groups - 1, each with a document.
    """
    from scipy.special import gammaincc

    n_groups = int(group.max()) + 1
    members = group[:, np.newaxis] == np.arange(n_groups)
    scores = _Scores(rates)
    with np.errstate(divide="ignore", invalid="ignore"):
        h = scores.between(members)
        log_p = np.log(np.asarray(gammaincc((n_groups - 1) / 2.0, h / 2.0), dtype=np.float64))
    return GroupsTest(h, log_p)


@dataclass(frozen=True, slots=True)
class DocumentTest:
    """Arrays of shape (n_items,).

    Attributes
    ----------
    difference : float64
        Mean relative frequency of the first group less that of the second.
    rank_z : float64
        Standardised rank sum, above 0 where the first group has the higher ranks.
    welch_t : float64
    log_p : float64
        ln of the larger of the two p-values; 0 where the tests point different ways, nan where either group has
        fewer than two documents.
    """

    difference: FloatArray
    rank_z: FloatArray
    welch_t: FloatArray
    log_p: FloatArray


def document_test(rates: DocumentRates, in_this: BoolArray) -> DocumentTest:
    """The test of the module docstring for every item.

    Parameters
    ----------
    in_this : bool array, shape (n_documents,)
        Whether a document belongs to the first group; else to the second.
    """
    scores = _Scores(rates)
    with np.errstate(divide="ignore", invalid="ignore"):
        rank_z, rank_log_p = scores.judge(in_this.astype(np.float64))
        welch, difference, welch_log_p = _welch(rates, in_this)
    log_p = _both(rank_z, rank_log_p, difference, welch_log_p)
    n_this = np.count_nonzero(in_this)
    if min(n_this, rates.n_documents - n_this) < 2:
        log_p = np.full(rates.n_items, np.nan)
    return DocumentTest(difference, rank_z, welch, log_p)


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
        rank_z, rank_log_p = _Scores(rates).judge(moments)
        slope, slope_t, slope_log_p = _robust_slope(rates, moments)
    log_p = _both(rank_z, rank_log_p, slope, slope_log_p)
    if rates.n_documents < 4 or not np.ptp(moments):
        log_p = np.full(rates.n_items, np.nan)
    return TrendTest(slope, rank_z, slope_t, log_p)


def _both(z: FloatArray, rank_log_p: FloatArray, mean: FloatArray, mean_log_p: FloatArray) -> FloatArray:
    """ln of the p-value of two tests that must agree."""
    agree = np.sign(z) == np.sign(mean)
    return np.minimum(np.where(agree, np.maximum(rank_log_p, mean_log_p), 0.0), 0.0)


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


def permuted_p(rates: DocumentRates, in_this: BoolArray, permutations: int, seed: int = 1) -> FloatArray:
    """Adjusted p-values by exchanging the labels of documents: Westfall & Young's (1993) max-T.

    The statistic of an item is the smaller of the sizes of its standardised rank sum and of Welch's t, 0 where they
    point different ways. An item's p-value is the share of exchanges (the actual labels being one) in which the
    largest statistic of *any* item reaches its own: with all those at most 0.05 called findings, the chance of a
    single false one is at most 5 %, however the items depend on one another.

    Parameters
    ----------
    permutations : int
        The smallest p-value there can be is 1 / (permutations + 1).

    Raises
    ------
    UsageError
        Fewer than 19 permutations: none could reach 0.05.
    """
    if permutations < 19:
        raise UsageError(f"permutations must be at least 19, or no p-value can reach 0.05, not {permutations}")
    scores = _Scores(rates)
    moments = _Moments(rates)
    actual = _smaller(scores, moments, in_this[:, np.newaxis])[:, 0]
    reached = np.ones(rates.n_items)
    for labels in _exchanged(in_this, permutations, seed):
        largest = _smaller(scores, moments, labels).max(axis=0, initial=0.0)
        # The tolerance takes equal values for equal: sums in another order differ in the last digits.
        reached += (largest[np.newaxis, :] >= actual[:, np.newaxis] * (1 - 1e-9)).sum(axis=1)
    return reached / (permutations + 1)


def _exchanged(in_this: BoolArray, permutations: int, seed: int) -> Iterator[BoolArray]:
    """Random labellings as columns, a bounded number at a time."""
    random = np.random.default_rng(seed)
    for start in range(0, permutations, _LABELLINGS_AT_ONCE):
        width = min(_LABELLINGS_AT_ONCE, permutations - start)
        yield random.permuted(np.repeat(in_this[:, np.newaxis], width, axis=1), axis=0)


def _smaller(scores: _Scores, moments: _Moments, labels: BoolArray) -> FloatArray:
    """The smaller of the sizes of the two statistics, by item and labelling."""
    with np.errstate(divide="ignore", invalid="ignore"):
        z = scores.standardised(labels.astype(np.float64))
        t = moments.welch_t(labels)
        same = np.sign(z) == np.sign(t)
        return np.nan_to_num(np.where(same, np.minimum(np.abs(z), np.abs(t)), 0.0), nan=0.0)


class _Scores:
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
        sums = _by_documents(self._rates, self._score, centred)
        se = n * np.sqrt(np.outer(self._spread, (centred**2).mean(axis=0)) / (n - 1.0))
        return np.where(se > 0, sums / se, 0.0)

    def between(self, members: BoolArray) -> FloatArray:
        """Kruskal-Wallis H of the groups in the columns of ``members``; 0 where all scores are equal."""
        n, sizes = float(self._rates.n_documents), members.sum(axis=0)
        sums = _by_documents(self._rates, self._score, members.astype(np.float64))
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


class _Moments:
    """Sums of rates and of their squares over any choice of documents."""

    def __init__(self, rates: DocumentRates) -> None:
        self._rates = rates
        self._squares = rates.rates**2
        everything = np.ones((rates.n_documents, 1))
        self._sum = _by_documents(rates, rates.rates, everything)
        self._square_sum = _by_documents(rates, self._squares, everything)

    def welch_t(self, labels: BoolArray) -> FloatArray:
        """Welch's t by item and column of ``labels``."""
        chosen = labels.astype(np.float64)
        n_this = chosen.sum(axis=0)
        n_that = len(labels) - n_this
        this = _by_documents(self._rates, self._rates.rates, chosen)
        squares = _by_documents(self._rates, self._squares, chosen)
        that, other_squares = self._sum - this, self._square_sum - squares
        share = (
            _sample_variance(this, squares, n_this) / n_this + _sample_variance(that, other_squares, n_that) / n_that
        )
        return np.where(share > 0, (this / n_this - that / n_that) / np.sqrt(share), 0.0)


def _sample_variance(sums: FloatArray, squares: FloatArray, n: FloatArray | float) -> FloatArray:
    return np.maximum(squares - sums**2 / n, 0.0) / (n - 1.0)


def _by_documents(rates: DocumentRates, values: FloatArray, weights: FloatArray) -> FloatArray:
    """Values of the items in documents times each column of document weights, added up; shape (n_items, n)."""
    from scipy.sparse import csr_array

    table = csr_array((values, (rates.items, rates.documents)), shape=(rates.n_items, rates.n_documents))
    return np.asarray(table @ weights, dtype=np.float64)


def _welch(rates: DocumentRates, in_this: BoolArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Welch's t, difference of the means, ln p."""
    sides = []
    chosen = in_this[rates.documents]
    n_this = float(np.count_nonzero(in_this))
    for inside, n in ((chosen, n_this), (~chosen, rates.n_documents - n_this)):
        part = rates.rates[inside]
        items = rates.items[inside]
        sums = np.bincount(items, weights=part, minlength=rates.n_items).astype(np.float64)
        squares = np.bincount(items, weights=part**2, minlength=rates.n_items).astype(np.float64)
        sides.append((sums / n, _sample_variance(sums, squares, n), n))
    gap, _ = welch_test(*sides[0], *sides[1])
    return gap.z, gap.difference, np.where(gap.difference == 0, 0.0, gap.log_p)
