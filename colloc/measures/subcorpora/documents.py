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

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray
from colloc.measures.contrast import welch_test
from colloc.measures.subcorpora.ranks import (
    BoolArray,
    DocumentRates,
    Int64Array,
    RankScores,
    agreed_log_p,
    by_documents,
)

_LABELLINGS_AT_ONCE = 64


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
    scores = RankScores(rates)
    with np.errstate(divide="ignore", invalid="ignore"):
        rank_z, rank_log_p = scores.judge(in_this.astype(np.float64))
        welch, difference, welch_log_p = _welch(rates, in_this)
    log_p = agreed_log_p(rank_z, rank_log_p, difference, welch_log_p)
    n_this = np.count_nonzero(in_this)
    if min(n_this, rates.n_documents - n_this) < 2:
        log_p = np.full(rates.n_items, np.nan)
    return DocumentTest(difference, rank_z, welch, log_p)


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
    scores = RankScores(rates)
    with np.errstate(divide="ignore", invalid="ignore"):
        h = scores.between(members)
        log_p = np.log(np.asarray(gammaincc((n_groups - 1) / 2.0, h / 2.0), dtype=np.float64))
    return GroupsTest(h, log_p)


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
    scores = RankScores(rates)
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


def _smaller(scores: RankScores, moments: _Moments, labels: BoolArray) -> FloatArray:
    """The smaller of the sizes of the two statistics, by item and labelling."""
    with np.errstate(divide="ignore", invalid="ignore"):
        z = scores.standardised(labels.astype(np.float64))
        t = moments.welch_t(labels)
        same = np.sign(z) == np.sign(t)
        return np.nan_to_num(np.where(same, np.minimum(np.abs(z), np.abs(t)), 0.0), nan=0.0)


class _Moments:
    """Sums of rates and of their squares over any choice of documents."""

    def __init__(self, rates: DocumentRates) -> None:
        self._rates = rates
        self._squares = rates.rates**2
        everything = np.ones((rates.n_documents, 1))
        self._sum = by_documents(rates, rates.rates, everything)
        self._square_sum = by_documents(rates, self._squares, everything)

    def welch_t(self, labels: BoolArray) -> FloatArray:
        """Welch's t by item and column of ``labels``."""
        chosen = labels.astype(np.float64)
        n_this = chosen.sum(axis=0)
        n_that = len(labels) - n_this
        this = by_documents(self._rates, self._rates.rates, chosen)
        squares = by_documents(self._rates, self._squares, chosen)
        that, other_squares = self._sum - this, self._square_sum - squares
        share = (
            _sample_variance(this, squares, n_this) / n_this + _sample_variance(that, other_squares, n_that) / n_that
        )
        return np.where(share > 0, (this / n_this - that / n_that) / np.sqrt(share), 0.0)


def _sample_variance(sums: FloatArray, squares: FloatArray, n: FloatArray | float) -> FloatArray:
    return np.maximum(squares - sums**2 / n, 0.0) / (n - 1.0)


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
