"""Tokens of one term that have another term somewhere in their window, each counted once."""

from __future__ import annotations

import numpy as np

from colloc.counts.accumulating import Accumulator, PairSink
from colloc.counts.keys import Run
from colloc.counts.windows import tokens_left
from colloc.records import Int64Array, TokenSpan

_FAR = np.int64(2**62)


def gaps_to_previous(span: TokenSpan) -> Int64Array:
    """For each token the distance to the token before it with the same term in the same unit; 2**62 without one."""
    n = len(span.terms)
    marks = np.zeros(n, np.int64)
    marks[span.units[(span.units > 0) & (span.units < n)]] = 1
    unit = np.cumsum(marks)
    # equal terms come to stand together, in order of place
    order = np.argsort(span.terms.astype(np.uint64) << np.uint64(32) | np.arange(n, dtype=np.uint64))
    gaps = np.full(n, _FAR)
    same = (span.terms[order[1:]] == span.terms[order[:-1]]) & (unit[order[1:]] == unit[order[:-1]])
    gaps[order[1:][same]] = np.diff(order)[same]
    return gaps


def add_positions(span: TokenSpan, left: int, right: int, into: PairSink) -> None:
    """Count into the cell [x, y] the tokens of x that have a y at distance -left..right (not 0) in their unit.

    Counted are tokens from ``span.context`` up to ``span.ahead`` before the end; those around them are
    looked at only, so a token's whole window must be in the span as far as its unit goes.
    """
    n = len(span.terms)
    begin, stop = span.context, n - span.ahead
    into.load(span.terms)
    remaining = tokens_left(span)
    gaps = gaps_to_previous(span)
    for offset in range(-left, right + 1):
        lo, hi = max(begin, -offset), min(stop, n - offset)
        if offset == 0 or lo >= hi:
            continue
        centre, other = slice(lo, hi), slice(lo + offset, hi + offset)
        valid = remaining[min(centre.start, other.start) : min(centre.stop, other.stop)] >= abs(offset)
        # the first occurrence in the window counts for all: the one before it lies before the window
        valid &= gaps[other] > offset + left
        valid &= span.terms[centre] != span.terms[other]
        into.pair(centre, other, valid)
    following = np.full(n, _FAR)
    later = np.flatnonzero(gaps < _FAR)
    following[later - gaps[later]] = gaps[later]
    twins = np.flatnonzero((gaps <= left) | (following <= right))
    twins = twins[(twins >= begin) & (twins < stop)]
    into.pair(twins, twins)


def count_positions(span: TokenSpan, left: int, right: int) -> Run:
    """The positions of ``span`` alone, as a run."""
    into = Accumulator()
    add_positions(span, left, right, into)
    return into.finish()
