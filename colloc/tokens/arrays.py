"""Small operations on ascending arrays."""

from __future__ import annotations

import numpy as np

from colloc.records import Int64Array
from colloc.tokens.classes import Mask


def distinct(ascending: Int64Array) -> Int64Array:
    """The different values of an ascending array (``np.unique`` would sort or hash it first)."""
    if len(ascending) < 2:
        return ascending
    fresh = np.ones(len(ascending), np.bool_)
    np.not_equal(ascending[1:], ascending[:-1], out=fresh[1:])
    return ascending[fresh]


def any_within(flags: Mask, starts: Int64Array, ends: Int64Array) -> Mask:
    """Whether a flag is set within each of the disjoint, ascending, non-empty spans."""
    if not len(starts):
        return np.zeros(0, np.bool_)
    bounds = np.empty(2 * len(starts), np.int64)
    bounds[0::2], bounds[1::2] = starts, ends
    if ends[-1] == len(flags):
        bounds = bounds[:-1]
    return np.logical_or.reduceat(flags, bounds)[::2]
