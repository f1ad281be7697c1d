"""Counting of directed pairs as they are found: kernels say which pairs, this adds them up."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from colloc.counts.dense import DensePlan, run_of_cells
from colloc.counts.keys import Run, merge, pack, run_of_keys
from colloc.kernels import pairs
from colloc.kernels.switch import compiled
from colloc.records import NO_TERM, Int64Array, TokenSpan, UInt32Array

BoolArray = NDArray[np.bool_]
Places = slice | Int64Array
"""Tokens of the loaded span: a stretch, or their offsets."""

DEFAULT_PENDING = 2**22
_MOST_IN_CELLS = 2**31 - 1


class PairSink(Protocol):
    """Whoever takes the pairs that a kernel finds."""

    def load(self, terms: UInt32Array) -> None:
        """Set the tokens that `pair` speaks of."""

    def pair(self, first: Places, second: Places, valid: BoolArray | None = None) -> None:
        """Take the pairs [first, second] of places, those that are valid where that is said."""


class Accumulator:
    """Adds up directed pairs of terms.

    Parameters
    ----------
    plan : DensePlan or None
        Pairs that are counted in a table; all others are kept as keys until sorted.
    pending : int
        Keys that are kept before they are sorted (8 bytes each, as much again while sorting).
    spill : callable or None
        Takes each sorted run when ``pending`` keys have come together; without it runs stay in memory.
    """

    def __init__(
        self, plan: DensePlan | None = None, pending: int = DEFAULT_PENDING, spill: Callable[[Run], None] | None = None
    ) -> None:
        self._plan = plan
        # Narrow cells are twice as many in the processor's cache; `windows` sees to it that they do not overflow.
        kind = np.int32 if compiled() else np.int64
        self._cells: NDArray[Any] | None = np.zeros(plan.n_cells, kind) if plan is not None else None
        self._in_cells = 0
        self._keys = np.empty(pending, np.uint64)
        self._n_keys = 0
        self._runs: list[Run] = []
        self._spill = spill if spill is not None else self._runs.append

    def load(self, terms: UInt32Array) -> None:
        """Set the tokens that `pair` speaks of."""
        self._terms = terms
        absent = terms == NO_TERM
        self._present = ~absent if absent.any() else None
        if self._plan is not None:
            known = np.where(absent, np.uint32(0), terms) if self._present is not None else terms
            self._base = self._plan.base[known]
            self._stop = self._plan.stop[known]
            self._twice = self._plan.twice[known]

    def pair(self, first: Places, second: Places, valid: BoolArray | None = None) -> None:
        """Count the cell [first, second] once for each of the pairs of places that is valid.

        Tokens without a term are left out.
        """
        if self._present is not None:
            both = self._present[first] & self._present[second]
            valid = both if valid is None else valid & both
        if self._plan is None or self._cells is None:
            chosen = slice(None) if valid is None else np.flatnonzero(valid)
            self._keep(self._terms[first][chosen], self._terms[second][chosen])
            return
        one, two = self._twice[first], self._twice[second]
        cell = np.maximum(one, two)
        cell += np.minimum(self._base[first], self._base[second])
        cell += one > two
        if valid is not None:
            cell *= valid
        stop = np.minimum(self._stop[first], self._stop[second])
        outside = np.flatnonzero(cell >= stop)
        np.minimum(cell, stop, out=cell)
        np.add.at(self._cells, cell.astype(np.int64), 1)
        self._keep(self._terms[first][outside], self._terms[second][outside])

    def takes_windows(self, reach: int) -> bool:
        """Whether `windows` can be called for windows of this reach."""
        return self._plan is not None and 2 * reach + 1 < len(self._keys)

    def windows(self, span: TokenSpan, left: int, right: int) -> None:
        """What `colloc.counts.windows.add_windows` does, by a compiled loop."""
        assert self._plan is not None
        assert self._cells is not None
        plan = self._plan
        terms, units = np.ascontiguousarray(span.terms), np.ascontiguousarray(span.units)
        self._in_cells += len(terms) * (left + right)
        if self._in_cells > _MOST_IN_CELLS:
            self._flush_cells()
            self._in_cells = len(terms) * (left + right)
        rows = np.empty((len(terms), 3), np.int32)
        state = np.array([span.context, self._n_keys], np.int64)
        while state[0] < len(terms):
            arguments = (plan.base, plan.stop, plan.twice, rows, self._cells, self._keys, state)
            pairs.add_windows(terms, units, span.context, left, right, *arguments)
            self._n_keys = int(state[1])
            if state[0] < len(terms):
                self._flush_keys()
                state[1] = 0

    def _keep(self, first: UInt32Array, second: UInt32Array) -> None:
        done = 0
        while done < len(first):
            room = len(self._keys) - self._n_keys
            taken = min(room, len(first) - done)
            stretch = slice(done, done + taken)
            self._keys[self._n_keys : self._n_keys + taken] = pack(first[stretch], second[stretch])
            self._n_keys += taken
            done += taken
            if self._n_keys == len(self._keys):
                self._flush_keys()

    def _flush_keys(self) -> None:
        if self._n_keys:
            self._spill(run_of_keys(self._keys[: self._n_keys]))
            self._n_keys = 0

    def _flush_cells(self) -> None:
        if self._plan is not None and self._cells is not None:
            self._spill(run_of_cells(self._plan, self._cells))
            self._in_cells = 0

    def finish(self) -> Run:
        """Hand the last keys and the table to ``spill``; without ``spill`` return the sum of all as one run."""
        self._flush_keys()
        self._flush_cells()
        whole = merge(self._runs)
        self._runs.clear()
        return whole
