"""Pointwise mutual information and its relatives, in bits (log base 2)."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray, Rule, Table, evaluate, table_function


@table_function
def pmi(table: Table) -> FloatArray:
    """Pointwise mutual information, log2(O / E) (Church & Hanks 1990).

    -inf where the words never meet, 0 at independence, at most the smaller of the two surprisals; nan where a word
    never occurs.
    """
    return table.pmi.copy()


@table_function
def npmi(table: Table) -> FloatArray:
    """Normalised PMI, PMI / -log2 p(x, y), from -1 to 1 (Bouma 2009).

    The limits are filled in: -1 where the words never meet, 1 where neither occurs without the other (also where
    both are everywhere, p(x, y) = 1). nan where a word never occurs.
    """
    result: FloatArray = table.pmi / np.log2(table.total / table.joint)
    result[(table.joint == 0) & (table.margin_product > 0)] = -1.0
    always = (table.joint == table.first_total) & (table.joint == table.second_total) & (table.joint > 0)
    result[always] = 1.0
    return result


@table_function
def ppmi(table: Table) -> FloatArray:
    """Positive PMI, max(PMI, 0): 0 also where the words never meet; nan where a word never occurs."""
    return np.maximum(table.pmi, 0.0)


def shifted_ppmi(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike, shift: float = 1.0
) -> FloatArray:
    """max(PMI - log2 shift, 0) (Levy & Goldberg 2014; Levy, Goldberg & Dagan 2015, section 3.2).

    Parameters
    ----------
    shift : float
        The k of "k negative samples"; 1 leaves PPMI.

    Raises
    ------
    UsageError
        ``shift`` is not above zero.
    """
    if not shift > 0:
        raise UsageError(f"shift must be above 0, not {shift}")
    offset = np.log2(shift)
    return evaluate([lambda table: np.maximum(table.pmi - offset, 0.0)], joint, first_total, second_total, total)[0]


def smoothed_totals(totals: ArrayLike, alpha: float = 0.75) -> FloatArray:
    """Context distribution smoothing: totals^alpha, brought back to the old sum (Levy et al. 2015, section 3.2).

    Parameters
    ----------
    totals : array, shape (n,)
        Totals of *all* contexts; use the result as ``second_total`` beside the unchanged ``total``.
    alpha : float
        1 leaves the totals as they are, 0 makes all equal.

    Returns
    -------
    float64 array, shape (n,)
        Not counts any more: only the PMI family takes them.
    """
    counts = np.asarray(totals, dtype=np.float64)
    if not 0 <= alpha <= 1:
        raise UsageError(f"alpha must be between 0 and 1, not {alpha}")
    powers = np.where(counts > 0, counts**alpha, 0.0)
    mass = powers.sum()
    return powers * (counts.sum() / mass) if mass > 0 else powers


def _power_rule(k: float) -> Rule:
    def rule(table: Table) -> FloatArray:
        return table.pmi + (k - 1) * np.log2(table.joint / table.total)

    return rule


def pmi_k(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike, k: float = 2.0
) -> FloatArray:
    """log2(p(x,y)^k / (p(x) p(y))), the probability form (Daille 1994): never above 0 from k = 2 on.

    -inf where the words never meet. k = 1 is PMI.
    """
    return evaluate([_power_rule(k)], joint, first_total, second_total, total)[0]


@table_function
def pmi2(table: Table) -> FloatArray:
    """log2(p(x,y)^2 / (p(x) p(y))) (Daille 1994): 0 where neither word occurs without the other."""
    return _power_rule(2)(table)


@table_function
def pmi3(table: Table) -> FloatArray:
    """log2(p(x,y)^3 / (p(x) p(y))) (Daille 1994): log2 p(x,y) where neither occurs without the other."""
    return _power_rule(3)(table)


@table_function
def mi_share(table: Table) -> FloatArray:
    """The pair's contribution to the mutual information, p(x,y) PMI, in bits; 0 (the limit) where never together.

    Negative for pairs met less often than expected; the sum over all cells of a table is never negative.
    """
    share: FloatArray = table.joint / table.total * table.pmi
    share[(table.joint == 0) & (table.margin_product > 0)] = 0.0
    return share


def mutual_information(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike
) -> np.float64:
    """Mutual information in bits of a whole table given by its cells that are not zero: the sum of ``mi_share``.

    The plug-in value: in a sparse table most of it is bias, about (rows - 1)(columns - 1) / (2 N ln 2) bits for
    independent words (Miller 1955). Compare it with the value of shuffled text.
    """
    return np.sum(mi_share(joint, first_total, second_total, total))


def surprisal(count: ArrayLike, total: ArrayLike) -> FloatArray:
    """-log2(count / total) in bits: inf for 0 of some, 0 for all; nan where total is 0.

    ``surprisal(second_total, total)`` is the surprise at the second word before the first is known,
    ``surprisal(joint, first_total)`` the surprise after; their difference is PMI.
    """
    with np.errstate(all="ignore"):
        return np.log2(np.asarray(total, dtype=np.float64) / np.asarray(count, dtype=np.float64))
