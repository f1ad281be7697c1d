"""Boundaries: fragments belong to their whole, and go on where the next word is all but sure."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from colloc.answers.expressions.gathering import Gathered
from colloc.records import FloatArray, Int64Array

SHARE = 0.75
"""Share of a sequence's occurrences that a longer one takes up for it to be a fragment of the longer one."""


def wholes(table: Gathered, eligible: NDArray[np.bool_], share: float = SHARE) -> Int64Array:
    """The whole of each sequence of two words and more: its own row, or that of a longer one.

    A sequence is a fragment of the one that is a word longer (on either side) where the longer one takes up at least
    ``share`` of its occurrences and of its documents' half; and so on from there, a word at a time.

    Parameters
    ----------
    eligible : bool array, shape (n,)
        Which sequences can be wholes.
    """
    first, rows = table.edges[1], table.edges[-1]
    most, parent = np.zeros(rows, np.int64), np.arange(rows)
    for words in range(table.longest, 2, -1):
        longer = table.rows(words)
        longer = longer[eligible[longer - first]]
        for part in (table.left[longer], table.right[longer]):
            # last write wins: in ascending order of count that is the most frequent, of equals the first row
            order = np.lexsort((-longer, table.counts[longer]))
            chosen, whole = part[order], longer[order]
            better = table.counts[whole] > most[chosen]
            parent[chosen[better]] = whole[better]
            most[chosen[better]] = table.counts[whole[better]]
    own = np.arange(first, rows)
    shares = most[first:] / table.counts[first:]
    documents = table.spread.documents
    spread = np.zeros(len(own), bool)
    has = parent[first:] != own
    spread[has] = 2 * documents[parent[first:][has] - first] >= documents[has]
    folded = has & (shares >= share) & spread
    whole = np.where(folded, parent[first:], own)
    for words in range(table.longest - 1, 1, -1):
        rows_here = table.rows(words) - first
        inner = whole[rows_here] != table.rows(words)
        whole[rows_here[inner]] = whole[whole[rows_here[inner]] - first]
    return whole


def folded_into(whole: Int64Array, strength: FloatArray, first: int) -> tuple[Int64Array, FloatArray, Int64Array]:
    """What each sequence takes over from its fragments.

    Returns
    -------
    fragment : int64 array
        Row of the strongest fragment, -1 where there is none.
    strength : float64 array
        The largest strength of the sequence and its fragments.
    fragments : int64 array
        How many there are.
    """
    own = np.arange(first, first + len(whole))
    part = whole != own
    fragments = np.bincount(whole[part] - first, minlength=len(whole))
    fragment = np.full(len(whole), -1)
    order = np.flatnonzero(part)
    order = order[np.argsort(strength[order], kind="stable")]
    fragment[whole[order] - first] = own[order]
    best = strength.copy()
    np.maximum.at(best, whole[part] - first, strength[part])
    return fragment, best, fragments
