"""Measures of three words and more, and of expressions that stand inside longer ones."""

from __future__ import annotations

from itertools import combinations
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray


def specific_correlation(joint: ArrayLike, totals: ArrayLike, total: ArrayLike) -> FloatArray:
    """log2(p(x1..xn) / (p(x1) ... p(xn))) in bits, SI2 of Van de Cruys (2011); PMI for two words.

    Parameters
    ----------
    joint : array, shape (...)
        Times all n occur together.
    totals : array, shape (n, ...)
        Times each occurs.
    """
    together, whole = np.asarray(joint, dtype=np.float64), np.asarray(total, dtype=np.float64)
    with np.errstate(divide="ignore", invalid="ignore"):
        # Logs are added up: the product of many margins would overflow.
        apart: FloatArray = np.log2(np.asarray(totals, dtype=np.float64) / whole).sum(axis=0)
        return np.log2(together / whole) - apart


def specific_interaction(subset_counts: ArrayLike, total: ArrayLike) -> FloatArray:
    """Sum over all non-empty subsets T of the n words of (-1)^|T| log2 p(T), in bits.

    SI1 of Van de Cruys (2011), for three words
    log2(p(xy) p(yz) p(xz) / (p(x) p(y) p(z) p(xyz))); PMI for two. What the words say together beyond their pairs has
    a negative sign for three words.

    Parameters
    ----------
    subset_counts : array, shape (2**n - 1, ...)
        Entry m - 1 holds how often the words whose bits are set in m occur together.

    Raises
    ------
    UsageError
        The first axis is not 2**n - 1 long.
    """
    counts, whole = np.asarray(subset_counts, dtype=np.float64), np.asarray(total, dtype=np.float64)
    subsets = counts.shape[0] if counts.ndim else 0
    if subsets < 1 or subsets & (subsets + 1):
        raise UsageError(f"the counts of all non-empty subsets of n words are 2**n - 1 rows, not {subsets}")
    signs = np.array([(-1.0) ** mask.bit_count() for mask in range(1, subsets + 1)])
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.tensordot(signs, np.log2(counts / whole), axes=1)


def entropy(weights: ArrayLike) -> np.float64:
    """Entropy in bits of a distribution given by weights that need not add up to 1."""
    positive = np.asarray(weights, dtype=np.float64).reshape(-1)
    positive = positive[positive > 0]
    if not positive.size:
        return np.float64(0.0)
    shares = positive / positive.sum()
    return np.float64(np.maximum(-np.sum(shares * np.log2(shares)), 0.0))


def total_correlation(joint_table: ArrayLike) -> np.float64:
    """Sum of the variables' entropies less the joint entropy, in bits (Watanabe 1960): the mean of SI2, never negative.

    Parameters
    ----------
    joint_table : array with one axis for each variable
        Counts or probabilities.
    """
    table = np.asarray(joint_table, dtype=np.float64)
    return sum((entropy(_margin(table, (axis,))) for axis in range(table.ndim)), np.float64(0.0)) - entropy(table)


def co_information(joint_table: ArrayLike) -> np.float64:
    """Sum over subsets T of (-1)^(|T|+1) H(T), in bits (McGill 1954; Bell 2003); mutual information for two axes.

    The mean of SI1 for three variables: negative where two tell about the third only together.
    """
    table = np.asarray(joint_table, dtype=np.float64)
    result = np.float64(0.0)
    for size in range(1, table.ndim + 1):
        for axes in combinations(range(table.ndim), size):
            result += (-1.0) ** (size + 1) * entropy(_margin(table, axes))
    return result


def c_value(
    length: ArrayLike,
    frequency: ArrayLike,
    nested_frequency: ArrayLike,
    nesting: ArrayLike,
    *,
    form: Literal["log2", "length"] = "log2",
) -> FloatArray:
    """C-value: frequency discounted for occurrences inside longer candidates, weighted by length.

    Parameters
    ----------
    length : array
        Words of the candidate.
    frequency : array
        n, its occurrences (those not inside a longer accepted candidate, for ``nested_frequency`` too).
    nested_frequency : array
        t, its occurrences inside longer candidates.
    nesting : array
        c, the number of distinct longer candidates it stands in; 0 for none.
    form : "log2" or "length"
        Weight log2 length (Frantzi, Ananiadou & Mima 2000, doi:10.1007/s007999900023) or length - 1 (Frantzi &
        Ananiadou 1996, ACL Anthology C96-1009).

    Returns
    -------
    float64 array
        weight * (n - t / c), weight * n where c is 0.
    """
    words, n = np.asarray(length, dtype=np.float64), np.asarray(frequency, dtype=np.float64)
    inside, longer = np.asarray(nested_frequency, dtype=np.float64), np.asarray(nesting, dtype=np.float64)
    if form not in ("log2", "length"):
        raise UsageError(f"form must be log2 or length, not {form!r}")
    weight = np.log2(words) if form == "log2" else words - 1.0
    return weight * (n - np.where(longer > 0, inside / np.maximum(longer, 1.0), 0.0))


def weakest_split(
    joint: ArrayLike, left_totals: ArrayLike, right_totals: ArrayLike, total: ArrayLike
) -> tuple[FloatArray, NDArray[np.int64]]:
    """PMI across the cut of an expression where its halves cling least, in bits (common practice, no single source).

    Parameters
    ----------
    joint : array, shape (...)
        Occurrences of the whole expression of n words.
    left_totals, right_totals : arrays, shape (n - 1, ...)
        Occurrences of the first i words, and of the remaining ones, for i = 1 .. n - 1.

    Returns
    -------
    value, cut : arrays, shape (...)
        The smallest PMI and the number of words left of that cut (the leftmost of equals).
    """
    left, right = np.asarray(left_totals, dtype=np.float64), np.asarray(right_totals, dtype=np.float64)
    together, whole = np.asarray(joint, dtype=np.float64), np.asarray(total, dtype=np.float64)
    with np.errstate(divide="ignore", invalid="ignore"):
        across = np.log2(together * whole / (left * right))
    return across.min(axis=0), np.asarray(across.argmin(axis=0) + 1, dtype=np.int64)


def _margin(table: FloatArray, axes: tuple[int, ...]) -> FloatArray:
    others = tuple(axis for axis in range(table.ndim) if axis not in axes)
    return np.asarray(table.sum(axis=others), dtype=np.float64)
