"""Which pairs are counted in a table in memory instead of being sorted.

In text, pairs of frequent words make up most of all pairs: the four million
cells whose expected counts are largest take in five sixths of the pairs of 11
million tokens. Adding to a cell costs a tenth of sorting a key.

Terms are ranked by frequency. The pair of ranks l <= h has a cell where
f(l) * f(h) is large enough, which holds for h below a limit that falls with l: a
staircase. The rows of the staircase lie one behind the other::

    cell 0        pairs that do not count
    row l         cells of h = l, l + 1, ..., limit - 1, each [l, h] then [h, l]; one spare cell

``base`` (the row's start, less 2 * l) and ``stop`` (the row's spare cell) rise
with l. So for two tokens the values of the more frequent term are the smaller
of the two, and no table is looked up for a pair: all of it is vector arithmetic
on values fetched once for each token.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.counts.keys import Run, pack_ordered, sorted_run
from colloc.kernels import pairs
from colloc.records import Int64Array

Int32Array = NDArray[np.int32]

_HALVINGS = 48


@dataclass(frozen=True, slots=True)
class DensePlan:
    """The staircase, and for each term where its row lies.

    Attributes
    ----------
    n_cells : int
    base, stop, twice : int32 arrays, shape (n_terms,)
        By term: row start less twice the rank; the row's spare cell; twice the rank (no larger than the first limit).
    row_starts : int64 array, shape (n_rows + 1,)
        The first cell of each row; the last entry is the spare cell of all terms without a row.
    terms : int64 array
        The term of each rank that has a column.
    """

    n_cells: int
    base: Int32Array
    stop: Int32Array
    twice: Int32Array
    row_starts: Int64Array
    terms: Int64Array


def plan_cells(frequencies: Int64Array, n_cells: int) -> DensePlan:
    """The staircase of about ``n_cells`` cells (below 2**30) for terms with these frequencies."""
    order = np.argsort(-frequencies, kind="stable")
    ranked = frequencies[order].astype(np.float64)
    ranked = ranked[ranked > 0]
    limits = _limits(ranked, n_cells)
    rows = len(limits)
    widths = limits - np.arange(rows)
    row_starts = np.concatenate([[1], 1 + np.cumsum(2 * widths + 1)])
    columns = int(limits[0]) if rows else 0
    rank = np.empty(len(frequencies), np.int64)
    rank[order] = np.arange(len(order))
    row = np.minimum(rank, rows)
    stops = np.concatenate([row_starts[:-1] + 2 * widths, row_starts[-1:]])
    bases = row_starts - 2 * np.arange(rows + 1)
    return DensePlan(
        n_cells=int(row_starts[-1]) + 1,
        base=bases[row].astype(np.int32),
        stop=stops[row].astype(np.int32),
        twice=(2 * np.minimum(rank, max(columns, rows))).astype(np.int32),
        row_starts=row_starts,
        terms=order[:columns],
    )


def _limits(ranked: NDArray[np.float64], n_cells: int) -> Int64Array:
    """For each row the number of ranks below which it has cells; rows without cells are left off."""
    if len(ranked) == 0:
        return np.empty(0, np.int64)
    everything = _staircase(ranked, 1.0)
    if _size(everything) <= n_cells:
        return everything
    lower, upper = 0.0, 2 * np.log2(ranked[0]) + 1.0
    for _ in range(_HALVINGS):
        middle = (lower + upper) / 2
        if _size(_staircase(ranked, 2.0**middle)) > n_cells:
            lower = middle
        else:
            upper = middle
    return _staircase(ranked, 2.0**upper)


def _staircase(ranked: NDArray[np.float64], least: float) -> Int64Array:
    # a row has cells where its own diagonal cell is large enough
    rows = ranked[: np.searchsorted(-ranked, -np.sqrt(least), side="right")]
    limits = np.searchsorted(-ranked, -least / rows, side="right").astype(np.int64)
    return limits[limits > np.arange(len(limits))]


def _size(limits: Int64Array) -> int:
    return int((2 * (limits - np.arange(len(limits))) + 1).sum())


def run_of_cells(plan: DensePlan, cells: NDArray[Any]) -> Run:
    """The counts of the table ``cells`` (shape (n_cells,)) as a run; the table is zero afterwards.

    Tables of int32 are those of compiled loops.
    """
    if cells.dtype == np.int32:
        n = int(np.count_nonzero(cells))
        keys, counts = np.empty(n, np.uint64), np.empty(n, np.int64)
        n = pairs.list_cells(cells, plan.row_starts, plan.terms, keys, counts)
        return sorted_run(keys[:n], counts[:n])
    used = cells != 0
    # spare cells count nothing: the invalid pairs (before row 0), the end of each row, and the row of all others
    used[0] = used[-1] = False
    used[plan.row_starts[1:] - 1] = False
    filled = np.flatnonzero(used)
    edges = np.searchsorted(filled, plan.row_starts)
    lengths = np.diff(edges)
    within = filled - np.repeat(plan.row_starts[:-1], lengths)
    rows = np.arange(len(lengths))
    lower_terms = np.repeat(plan.terms[rows], lengths)
    higher_terms = plan.terms[np.repeat(rows, lengths) + (within >> 1)]
    # odd cells stand for [h, l]
    swapped = ((within & 1) == 1) ^ (lower_terms > higher_terms)
    keys = pack_ordered(np.minimum(lower_terms, higher_terms), np.maximum(lower_terms, higher_terms), swapped)
    counts = cells[filled].astype(np.int64)
    cells.fill(0)
    return sorted_run(keys, counts)
