"""Small operations on ascending arrays."""

from __future__ import annotations

import numpy as np

from colloc.records import Int64Array
from colloc.tokens.classes import Kinds, Mask


def distinct(ascending: Int64Array) -> Int64Array:
    """The different values of an ascending array (``np.unique`` would sort or hash it first)."""
    if len(ascending) < 2:
        return ascending
    fresh = np.ones(len(ascending), np.bool_)
    np.not_equal(ascending[1:], ascending[:-1], out=fresh[1:])
    return ascending[fresh]


def any_within(kinds: Kinds, table: Mask, starts: Int64Array, ends: Int64Array) -> Mask:
    """Whether each of the non-empty spans holds a kind of the table; takes time for what is in the spans only."""
    if not len(starts):
        return np.zeros(0, np.bool_)
    lengths = ends - starts
    first = np.cumsum(lengths) - lengths
    places = np.repeat(starts - first, lengths) + np.arange(first[-1] + lengths[-1])
    return np.logical_or.reduceat(table[kinds[places]], first)
