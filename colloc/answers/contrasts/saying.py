"""What a row of a contrast amounts to, in plain words."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from colloc.records import FloatArray, Int64Array

SURE = 0.05
"""Findings have q-values of at most 0.05."""
CARRIES = 0.5
"""From this share on one document is said to carry the difference."""

HOLDS = "holds over documents"
NO_FINDING = "no more than chance"
UNEVEN = "not beyond the differences between documents"
TOO_FEW = "too few documents to tell"


def say(
    q: FloatArray,
    document_q: FloatArray,
    counts: tuple[Int64Array, Int64Array],
    largest: tuple[Int64Array, Int64Array],
    more_in_this: np.ndarray,
) -> list[str]:
    """One short remark for each row.

    Parameters
    ----------
    q : float64 array, shape (n,)
        The q-value that takes every occurrence for independent (G2).
    document_q : float64 array
        The q-value of the test over documents; nan where there was none.
    counts, largest : two int64 arrays each
        Occurrences on either side, and the most that one document has.
    more_in_this : bool array
    """
    remarks = []
    for row in range(len(q)):
        side = 0 if more_in_this[row] else 1
        total, top = int(counts[side][row]), int(largest[side][row])
        remark = _finding(float(q[row]), float(document_q[row]), top, total)
        if not counts[1 - side][row]:
            remark = f"{('this', 'that')[side]} only; {remark}"
        remarks.append(remark)
    return remarks


def say_of_association(q: FloatArray, differs: np.ndarray, counts: tuple[Int64Array, Int64Array]) -> list[str]:
    """One short remark on a difference of association for each row.

    Parameters
    ----------
    q : float64 array, shape (n,)
        The q-value of Woolf's test.
    differs : bool array
        Whether the jackknife interval over documents of the PMI difference leaves 0 out.
    """
    remarks = []
    for row in range(len(q)):
        remark = NO_FINDING if q[row] > SURE else HOLDS if differs[row] else UNEVEN
        alone = [name for name, other in (("this", counts[1]), ("that", counts[0])) if not other[row]]
        remarks.append(f"{alone[0]} only; {remark}" if alone else remark)
    return remarks


def _finding(q: float, document_q: float, top: int, total: int) -> str:
    if document_q <= SURE:
        return HOLDS
    if np.isnan(document_q):
        return TOO_FEW
    if q > SURE:
        return NO_FINDING
    if top >= CARRIES * total:
        return f"one document carries it ({top} of {total})"
    return UNEVEN


def both_directions(score: FloatArray, ties: Sequence[FloatArray], more_in_this: np.ndarray, limit: int) -> Int64Array:
    """Rows with the highest scores, half of them from either side: those of this first, then those of that.

    Parameters
    ----------
    score : float64 array, shape (n,)
        Higher comes first, nan last.
    ties : sequence of float64 arrays
        Decide among equal scores, likewise.
    limit : int
        Rows; 0 for all. Where one side has less than its half, the other may have more.
    """
    keys = [np.where(np.isnan(key), -np.inf, key) for key in (score, *ties)]
    order = np.lexsort([np.arange(len(score)), *(-key for key in reversed(keys))])
    this, that = order[more_in_this[order]], order[~more_in_this[order]]
    if limit:
        half = (limit + 1) // 2
        of_that = min(len(that), max(limit - half, limit - len(this)))
        this, that = this[: limit - of_that], that[:of_that]
    return np.concatenate([this, that])
