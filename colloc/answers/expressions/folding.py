"""Boundaries: where expressions begin and end, and which sequences are only fragments of longer ones."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from colloc.answers.expressions.gathering import Gathered
from colloc.records import FloatArray, Int64Array

SHARE = 0.75
"""Share of a sequence's occurrences that a longer one takes up for it to be a fragment of the longer one."""
OPEN_SHARE = 0.5
"""The same where the sequence hardly ever has the edge of a sentence on the side that is added to."""
OPEN_EDGE = 0.2
"""Rate at the edge of a sentence, of the usual rate, below which that side is open."""
USUAL = 1.0
"""Rate at the end of a sentence, of the usual rate, from which an expression counts as complete."""
OPENING_WORTH = 0.5
"""What beginning sentences is worth beside ending them: many sequences begin one that need something to follow."""


def edge_rates(table: Gathered) -> tuple[FloatArray, FloatArray]:
    """How often sequences begin and end a sentence, in proportion to how often words in general do.

    One occurrence at the usual rate is added to each, so that a rare sequence is not condemned by what it had no
    chance to show.
    """
    counts = table.counts[table.edges[1] :]
    usual = counts * (table.units / max(table.total, 1))
    opening: FloatArray = (table.spread.opening + 1.0) / (usual + 1.0)
    closing: FloatArray = (table.spread.closing + 1.0) / (usual + 1.0)
    return opening, closing


def completeness(table: Gathered) -> FloatArray:
    """How much sequences look complete, from 0 to 1, by whether they can stand at the edge of a sentence.

    1 where a sequence ends sentences as often as words in general do; what never ends one, but begins sentences, gets
    up to a half; what does neither has words missing at both ends. (Own definition.)
    """
    opening, closing = edge_rates(table)
    return np.maximum(np.minimum(closing / USUAL, 1.0), OPENING_WORTH * np.minimum(opening / USUAL, 1.0))


def wholes(table: Gathered, eligible: NDArray[np.bool_]) -> Int64Array:
    """The whole of each sequence of two words and more: its own row, or that of a longer one.

    A sequence is a fragment of one that is a word longer where that takes up at least `SHARE` of its occurrences, or
    `OPEN_SHARE` where the side that is added to is open, and half of its documents. So it goes on, a word at a time,
    as long as the whole takes up that share of the fragment that it began with.

    Parameters
    ----------
    eligible : bool array, shape (n,)
        Which sequences can be wholes.
    """
    first = table.edges[1]
    n = table.edges[-1] - first
    opening, closing = edge_rates(table)
    sides = (
        _needed(table, eligible, table.left, np.where(closing < OPEN_EDGE, OPEN_SHARE, SHARE)),
        _needed(table, eligible, table.right, np.where(opening < OPEN_EDGE, OPEN_SHARE, SHARE)),
    )
    counts, documents = table.counts[first:], table.spread.documents
    whole, least = np.arange(n), np.zeros(n)
    for _ in range(table.longest - 2):
        # both sides may offer a longer one: the one with more occurrences is taken, of equals that on the right
        offers = [side[0][whole] for side in sides]
        needed = [np.maximum(side[1][whole], least) for side in sides]
        reached = [
            np.where(
                (offer >= 0) & (counts[offer] >= need * counts) & (2 * documents[offer] >= documents), counts[offer], 0
            )
            for offer, need in zip(offers, needed, strict=True)
        ]
        side = (reached[1] > reached[0]).astype(np.intp)
        grows = np.maximum(*reached) > 0
        if not grows.any():
            break
        whole = np.where(grows, np.choose(side, offers), whole)
        least = np.where(grows, np.choose(side, needed), least)
    return whole + first


def _needed(
    table: Gathered, eligible: NDArray[np.bool_], part: Int64Array, share: FloatArray
) -> tuple[Int64Array, FloatArray]:
    """The most frequent sequence that is a word longer on one side, -1 where there is none, and the share it needs.

    Parameters
    ----------
    part : int64 array
        Row of the sequence that is left when the word on that side is taken off.
    """
    first = table.edges[1]
    longer = np.arange(table.edges[2] if table.longest > 1 else first, table.edges[-1])
    longer = longer[eligible[longer - first]]
    # of several writes to one place the last stays: the most frequent, of equals the first row
    longer = longer[np.lexsort((-longer, table.counts[longer]))]
    most = np.full(len(eligible), -1)
    most[part[longer] - first] = longer - first
    return most, share


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
