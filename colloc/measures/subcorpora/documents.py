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
from numpy.typing import NDArray

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray
from colloc.measures.contrast import welch_test

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
    n_items : int
    in_this : bool array, shape (n_documents,)
        Whether a document belongs to the first group; else to the second.
    """

    items: Int64Array
    documents: Int64Array
    rates: FloatArray
    n_items: int
    in_this: BoolArray


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
    rates : DocumentRates
        ``in_this`` is not looked at.
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


def document_test(rates: DocumentRates) -> DocumentTest:
    """The test of the module docstring for every item."""
    scores = _Scores(rates)
    with np.errstate(divide="ignore", invalid="ignore"):
        rank_sum = scores.sum_over(rates.in_this)
        rank_z, rank_log_p = scores.judge(rank_sum)
        welch, difference, welch_log_p = _welch(rates)
        agree = np.sign(rank_z) == np.sign(difference)
        log_p = np.where(agree, np.maximum(rank_log_p, welch_log_p), 0.0)
    if min(scores.n_this, scores.n_that) < 2:
        log_p = np.full(rates.n_items, np.nan)
    return DocumentTest(difference, rank_z, welch, np.minimum(log_p, 0.0))


def permuted_p(rates: DocumentRates, permutations: int, seed: int = 1) -> FloatArray:
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
    actual = _smaller(scores, moments, rates.in_this[:, np.newaxis])[:, 0]
    reached = np.ones(rates.n_items)
    for labels in _exchanged(rates.in_this, permutations, seed):
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
        z = scores.standardised(scores.sums_over(labels))
        t = moments.welch_t(labels)
        same = np.sign(z) == np.sign(t)
        return np.nan_to_num(np.where(same, np.minimum(np.abs(z), np.abs(t)), 0.0), nan=0.0)


class _Scores:
    """Midranks less the midrank of the documents without the item, so that most scores are 0."""

    def __init__(self, rates: DocumentRates) -> None:
        self._rates = rates
        self.n_documents = len(rates.in_this)
        self.n_this = int(np.count_nonzero(rates.in_this))
        self.n_that = self.n_documents - self.n_this
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
        absent = self.n_documents - held
        # Ranks of the absent are 1 .. absent, their midrank (absent + 1) / 2.
        self._score = np.empty(len(items))
        self._score[order] = midplace + (absent[items] - 1) / 2.0
        n = float(self.n_documents)
        first, second, third = (self._total(self._score**power) / n for power in (1, 2, 3))
        self._mean = first
        self._spread = np.maximum(second - first**2, 0.0)
        self._lean = third - 3 * first * second + 2 * first**3

    def _total(self, values: FloatArray) -> FloatArray:
        return np.bincount(self._rates.items, weights=values, minlength=self._rates.n_items).astype(np.float64)

    def sum_over(self, labels: BoolArray) -> FloatArray:
        """Sum of the scores of the documents chosen, by item."""
        return self._total(np.where(labels[self._rates.documents], self._score, 0.0))

    def sums_over(self, labels: BoolArray) -> FloatArray:
        """:meth:`sum_over` for each column of ``labels``."""
        return _by_documents(self._rates, self._score, labels)

    @property
    def _standard_error(self) -> FloatArray:
        """Of the sum over a random choice of n_this documents."""
        return np.sqrt(self.n_this * self.n_that / (self.n_documents - 1.0) * self._spread)

    def standardised(self, sums: FloatArray) -> FloatArray:
        """z of sums with the items along the first axis; 0 where all scores are equal."""
        shape = (-1,) + (1,) * (sums.ndim - 1)
        gap, se = sums - (self.n_this * self._mean).reshape(shape), self._standard_error.reshape(shape)
        return np.where(se > 0, gap / se, 0.0)

    def between(self, members: BoolArray) -> FloatArray:
        """Kruskal-Wallis H of the groups in the columns of ``members``; 0 where all scores are equal."""
        n, sizes = float(self.n_documents), members.sum(axis=0)
        gaps = self.sums_over(members) - np.outer(self._mean, sizes)
        # The ranks' variance has the divisor n - 1, which brings the correction for ties with it.
        spread = self._spread * n / (n - 1.0)
        return np.where(spread > 0, (gaps**2 / sizes).sum(axis=1) / spread, 0.0)

    def judge(self, sums: FloatArray) -> tuple[FloatArray, FloatArray]:
        """z, and ln of the two-sided p-value from the Pearson type III curve."""
        n, a, b = float(self.n_documents), float(self.n_this), float(self.n_that)
        z = self.standardised(sums)
        third = a * b * (b - a) / ((n - 1.0) * (n - 2.0)) * self._lean
        skewness = np.where(self._standard_error > 0, third / self._standard_error**3, 0.0)
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
        everything = np.ones((len(rates.in_this), 1), dtype=np.bool_)
        self._sum = _by_documents(rates, rates.rates, everything)
        self._square_sum = _by_documents(rates, self._squares, everything)

    def welch_t(self, labels: BoolArray) -> FloatArray:
        """Welch's t by item and column of ``labels``."""
        n_this = labels.sum(axis=0).astype(np.float64)
        n_that = len(labels) - n_this
        this, squares = (
            _by_documents(self._rates, self._rates.rates, labels),
            _by_documents(self._rates, self._squares, labels),
        )
        that, other_squares = self._sum - this, self._square_sum - squares
        share = (
            _sample_variance(this, squares, n_this) / n_this + _sample_variance(that, other_squares, n_that) / n_that
        )
        return np.where(share > 0, (this / n_this - that / n_that) / np.sqrt(share), 0.0)


def _sample_variance(sums: FloatArray, squares: FloatArray, n: FloatArray | float) -> FloatArray:
    return np.maximum(squares - sums**2 / n, 0.0) / (n - 1.0)


def _by_documents(rates: DocumentRates, values: FloatArray, labels: BoolArray) -> FloatArray:
    """Values added over the documents chosen by each column of ``labels``; shape (n_items, n_labellings)."""
    from scipy.sparse import csr_array

    shape = (rates.n_items, len(labels))
    table = csr_array((values, (rates.items, rates.documents)), shape=shape)
    return np.asarray(table @ labels.astype(np.float64), dtype=np.float64)


def _welch(rates: DocumentRates) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Welch's t, difference of the means, ln p."""
    sides = []
    chosen = rates.in_this[rates.documents]
    n_this = float(np.count_nonzero(rates.in_this))
    for inside, n in ((chosen, n_this), (~chosen, len(rates.in_this) - n_this)):
        part = rates.rates[inside]
        items = rates.items[inside]
        sums = np.bincount(items, weights=part, minlength=rates.n_items).astype(np.float64)
        squares = np.bincount(items, weights=part**2, minlength=rates.n_items).astype(np.float64)
        sides.append((sums / n, _sample_variance(sums, squares, n), n))
    gap, _ = welch_test(*sides[0], *sides[1])
    return gap.z, gap.difference, np.where(gap.difference == 0, 0.0, gap.log_p)
