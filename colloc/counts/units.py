"""Units (sentences, paragraphs, documents) that contain two different terms."""

from __future__ import annotations

import numpy as np

from colloc.counts.accumulating import Accumulator, PairSink
from colloc.counts.keys import Run
from colloc.counts.windows import tokens_left
from colloc.records import NO_TERM, Int64Array, TokenSpan, UInt32Array

_BATCH = 2**18


def unit_terms(span: TokenSpan) -> tuple[UInt32Array, Int64Array]:
    """The different terms of each unit.

    Returns
    -------
    terms : uint32 array
        Unit by unit, ascending within a unit; `NO_TERM` is left out.
    starts : int64 array
        Offsets in ``terms`` where units with at least one term begin.
    """
    n = len(span.terms)
    marks = np.zeros(n, np.uint64)
    marks[span.units[(span.units > 0) & (span.units < n)]] = 1
    keys = np.cumsum(marks, dtype=np.uint64) << np.uint64(32) | span.terms
    keys = keys[span.terms != NO_TERM]
    keys.sort()
    if len(keys) == 0:
        return np.empty(0, np.uint32), np.empty(0, np.int64)
    keys = keys[np.concatenate([[True], keys[1:] != keys[:-1]])]
    unit = keys >> np.uint64(32)
    starts = np.concatenate([[0], np.flatnonzero(unit[1:] != unit[:-1]) + 1])
    return (keys & np.uint64(0xFFFFFFFF)).astype(np.uint32), starts


def add_units(terms: UInt32Array, starts: Int64Array, into: PairSink) -> None:
    """Count every two terms of a unit once, forward; ``terms`` and ``starts`` as `unit_terms` gives them."""
    into.load(terms)
    followers = tokens_left(TokenSpan(terms, starts))
    reached = np.cumsum(followers)
    begin, before = 0, 0
    while begin < len(terms):
        # as many tokens as make up one batch of pairs; a single token always fits, having fewer than 2**31 followers
        stop = max(begin + 1, int(np.searchsorted(reached, before + _BATCH, side="right")))
        some = followers[begin:stop]
        first = np.repeat(np.arange(begin, stop), some)
        offset = np.arange(len(first)) - np.repeat(np.cumsum(some) - some, some)
        into.pair(first, first + 1 + offset)
        begin, before = stop, int(reached[stop - 1])


def count_units(span: TokenSpan) -> Run:
    """The pairs of the units of ``span``, which must hold whole units; only forward cells (low < high) are set."""
    into = Accumulator()
    add_units(*unit_terms(span), into)
    return into.finish()
