"""Pairs of tokens at distance 1..w inside one unit."""

from __future__ import annotations

import numpy as np

from colloc.counts.accumulating import Accumulator, PairSink
from colloc.counts.keys import Run
from colloc.kernels.switch import compiled
from colloc.records import Int64Array, TokenSpan


def tokens_left(span: TokenSpan) -> Int64Array:
    """For each token the number of tokens that follow it in its unit."""
    n = len(span.terms)
    starts = np.concatenate([span.units[(span.units > 0) & (span.units < n)], [n]])
    ends = np.repeat(starts, np.diff(starts, prepend=0))
    return ends - 1 - np.arange(n)


def add_windows(span: TokenSpan, left: int, right: int, into: PairSink) -> None:
    """Count ``span`` into ``into``.

    Each pair of tokens i < j in one unit adds to the cell [t_i, t_j] where j - i <= right, and to the
    cell [t_j, t_i] where j - i <= left: the table M_right + transpose(M_left). With left = 0 this is M.
    """
    if compiled() and isinstance(into, Accumulator) and into.takes_windows(max(left, right)):
        into.windows(span, left, right)
        return
    n = len(span.terms)
    into.load(span.terms)
    remaining = tokens_left(span).astype(np.int32)
    for distance in range(1, min(max(left, right), n - 1) + 1):
        # pairs whose second token is in the context were counted with the span before
        begin = max(0, span.context - distance)
        first, second = slice(begin, n - distance), slice(begin + distance, n)
        valid = remaining[first] >= distance
        if distance <= right:
            into.pair(first, second, valid)
        if distance <= left:
            into.pair(second, first, valid)


def add_windows_near(span: TokenSpan, left: int, right: int, into: PairSink, centres: Int64Array) -> None:
    """`add_windows` for the pairs of which one token, or both, is among ``centres`` (offsets, ascending)."""
    into.load(span.terms)
    edges = np.concatenate([[0], span.units, [len(span.terms)]])
    unit = np.searchsorted(span.units, centres, side="right")
    begins, ends = edges[unit], edges[unit + 1]
    is_centre = np.zeros(len(span.terms), np.bool_)
    is_centre[centres] = True
    for distance in range(1, max(left, right) + 1):
        ahead = centres[(centres + distance < ends) & (centres + distance >= span.context)]
        back = centres[(centres - distance >= begins) & (centres >= span.context)]
        # a pair of two centres is found from its first token
        back = back[~is_centre[back - distance]]
        first, second = np.concatenate([ahead, back - distance]), np.concatenate([ahead + distance, back])
        if distance <= right:
            into.pair(first, second)
        if distance <= left:
            into.pair(second, first)


def count_windows(span: TokenSpan, left: int, right: int) -> Run:
    """The pairs of ``span`` alone, as a run."""
    into = Accumulator()
    add_windows(span, left, right, into)
    return into.finish()
