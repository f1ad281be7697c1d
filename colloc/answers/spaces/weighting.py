"""Windows in which near words count more.

A window of reach w with weights v_1 >= ... >= v_w for the distances 1 .. w is a sum of whole windows,

    sum over d of v_d M_d  =  sum over d of (v_d - v_(d+1)) T_d,    v_(w+1) = 0,

where M_d counts pairs at distance d and T_d pairs at distances 1 .. d. So it is read from ordinary tables,
which are counted exactly, in bounded memory, and found again the next time. A pass of its own over the stream
was measured too: see "Weighted windows" in docs/performance.md.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property
from typing import Literal, get_args

import numpy as np

from colloc.errors import UsageError
from colloc.records import FloatArray, Int64Array, PairBlock, UInt32Array, UInt64Array
from colloc.settings import TallySpec
from colloc.store.pages import Order, keys_of
from colloc.store.paging.runs import EMPTY, join_blocks, take
from colloc.store.tallies import Tally

Weighting = Literal["flat", "harmonic", "linear"]


def distance_weights(weighting: str, reach: int) -> list[Fraction]:
    """Weights of the distances 1 .. reach.

    ``flat``: 1. ``harmonic``: 1/d. ``linear``: (reach + 1 - d) / reach, from 1 down to 1/reach.

    Raises
    ------
    UsageError
        For another name.
    """
    if weighting not in get_args(Weighting):
        raise UsageError(f"weighting must be one of {', '.join(get_args(Weighting))}, not {weighting!r}")
    distances = range(1, reach + 1)
    if weighting == "harmonic":
        return [Fraction(1, d) for d in distances]
    if weighting == "linear":
        return [Fraction(reach + 1 - d, reach) for d in distances]
    return [Fraction(1)] * reach


def nested_specs(spec: TallySpec, weighting: Weighting) -> list[tuple[TallySpec, float]]:
    """The tables whose weighted sum is the weighted window, the widest (that of ``spec``) first.

    Raises
    ------
    UsageError
        Where the tally has no window.
    """
    if spec.kind not in ("window", "span"):
        raise UsageError(f"weighting {weighting!r} is for windows: leave out unit, relation and margins positions")
    reach = max(spec.left, spec.right)
    weights = [*distance_weights(weighting, reach), Fraction(0)]
    return [
        (replace(spec, left=min(spec.left, d), right=min(spec.right, d)), float(weights[d - 1] - weights[d]))
        for d in range(reach, 0, -1)
        if d == reach or weights[d - 1] != weights[d]
    ]


@dataclass(frozen=True, slots=True)
class Cells:
    """Cells of a stretch of a table; the fields are those of `PairBlock`, the counts may be weighted."""

    low: UInt32Array
    high: UInt32Array
    forward: FloatArray
    backward: FloatArray

    def __len__(self) -> int:
        return len(self.low)


class WeightedTally:
    """The weighted sum of nested tables, read like one table.

    Parameters
    ----------
    parts : sequence of (Tally, float)
        The widest first: it holds every pair of the others.
    """

    def __init__(self, parts: Sequence[tuple[Tally, float]]) -> None:
        self._parts = parts
        self.spec = parts[0][0].spec
        self.total = sum(weight * tally.total for tally, weight in parts)
        self.n_pairs = parts[0][0].n_pairs

    @cached_property
    def first(self) -> FloatArray:
        """Weighted row sums, by term."""
        sums: FloatArray = np.sum([weight * tally.first for tally, weight in self._parts], axis=0)
        return sums

    @cached_property
    def second(self) -> FloatArray:
        """Weighted column sums, by term."""
        sums: FloatArray = np.sum([weight * tally.second for tally, weight in self._parts], axis=0)
        return sums

    def blocks(self, order: Order = "low") -> Iterator[Cells]:
        """All pairs of the widest table with their weighted counts, a page or so of each table in memory."""
        (widest, weight), *others = self._parts
        cursors = [(_Cursor(tally.blocks(order), order), share) for tally, share in others]
        for block in widest.blocks(order):
            keys = keys_of(block, order)
            forward: FloatArray = np.multiply(weight, block.forward, dtype=np.float64)
            backward: FloatArray = np.multiply(weight, block.backward, dtype=np.float64)
            for cursor, share in cursors:
                places, part = cursor.up_to(keys)
                forward[places] += share * part.forward
                backward[places] += share * part.backward
            yield Cells(block.low, block.high, forward, backward)


class _Cursor:
    """Walks through a table beside another one that holds all its pairs."""

    def __init__(self, blocks: Iterator[PairBlock], order: Order) -> None:
        self._blocks = blocks
        self._order: Order = order
        self._waiting: list[tuple[UInt64Array, PairBlock]] = []
        self._done = False

    def up_to(self, keys: UInt64Array) -> tuple[Int64Array, PairBlock]:
        """The pairs up to the last of ``keys`` that were not given yet, and their places in ``keys``."""
        last = keys[-1]
        while not self._done and (not self._waiting or self._waiting[-1][0][-1] < last):
            block = next(self._blocks, None)
            if block is None:
                self._done = True
            elif len(block):
                self._waiting.append((keys_of(block, self._order), block))
        ready: list[PairBlock] = []
        rest: list[tuple[UInt64Array, PairBlock]] = []
        for own, block in self._waiting:
            cut = int(np.searchsorted(own, last, side="right"))
            ready.append(take(block, slice(0, cut)))
            if cut < len(own):
                rest.append((own[cut:], take(block, slice(cut, None))))
        self._waiting = rest
        part = join_blocks([EMPTY, *ready])
        return np.searchsorted(keys, keys_of(part, self._order)), part
