"""Fisher's exact test, as logarithms that stay right however small the p-value and however large the counts.

The probability of a table given its margins is the hypergeometric

    p(a) = R! C! (N-R)! (N-C)! / (N! a! b! c! d!)

With ln n! = n ln n - n + s(n), the n ln n parts together are exactly -G2 / 2, so that

    ln p(a) = -G2/2 + s(R) + s(C) + s(N-R) + s(N-C) - s(N) - s(a) - s(b) - s(c) - s(d)

where s(n) is at most ln(n) / 2 + 1. Differences of log-gamma values, the usual way, are off in the third digit once
the total is some 10^12 (the same decomposition for the binomial: Loader 2000).
"""

from __future__ import annotations

import math
from functools import cache
from typing import Literal, get_args

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray, Table, evaluate, table_function
from colloc.measures.likelihood import LOG10_E, half_g2
from colloc.measures.tails import chi_square_log_p

Alternative = Literal["two-sided", "greater", "less"]

EXACT_BELOW = 5.0
"""Expected counts below which the exact mid-p value is taken."""
_SUM_TERMS = 1024
"""Tails of at most this many terms are added up; longer ones are integrated."""
_NEGLIGIBLE = 45.0
"""Terms e^-45 times the first no longer change a float64 sum."""
_NODES = 64
_TIE = 1e-7
"""Tables are "as unlikely" when their probabilities agree to this, relative: rounding must not split ties."""


def fisher_log_p(
    joint: ArrayLike,
    first_total: ArrayLike,
    second_total: ArrayLike,
    total: ArrayLike,
    *,
    alternative: Alternative = "two-sided",
    mid: bool = False,
) -> FloatArray:
    """Natural log of the p-value of Fisher's exact test (Fisher 1935).

    Parameters
    ----------
    alternative : "two-sided", "greater" or "less"
        ``greater`` asks for attraction, ``less`` for avoidance; ``two-sided`` adds up all tables with these margins
        that are at most as probable as the one observed.
    mid : bool
        Count the observed table (and, two-sided, those exactly as probable) by half: the mid-p value (Lancaster
        1961), which does not overstate the p-value of discrete data on average.

    Returns
    -------
    float64 array
        At most 0. 0 (p = 1) where a margin is empty or full; with ``mid`` ln 0.5 there.
    """
    if alternative not in get_args(Alternative):
        raise UsageError(f"alternative must be one of {', '.join(get_args(Alternative))}, not {alternative!r}")
    return evaluate([lambda table: _log_p(table, alternative, mid)], joint, first_total, second_total, total)[0]


@table_function
def fisher_p(table: Table) -> FloatArray:
    """Two-sided p-value of Fisher's exact test; 0 below about 1e-308, where ``fisher_log10_p`` goes on."""
    return np.exp(table.once(_two_sided))


@table_function
def fisher_log10_p(table: Table) -> FloatArray:
    """log10 of ``fisher_p``, right where the p-value itself is too small for a float."""
    return table.once(_two_sided) * LOG10_E


def association_log_p(
    joint: ArrayLike,
    first_total: ArrayLike,
    second_total: ArrayLike,
    total: ArrayLike,
    exact_below: float = EXACT_BELOW,
) -> FloatArray:
    """Natural log of a two-sided p-value fit for any table: mid-p where E is small, else the G2 test.

    The chi-square distribution of G2 is an approximation for large E; rare pairs, which are most pairs, need the
    exact distribution.

    Parameters
    ----------
    exact_below : float
        Expected counts below this take the exact mid-p value; ``numpy.inf`` makes every row exact.
    """

    def rule(table: Table) -> FloatArray:
        result = chi_square_log_p(2.0 * table.once(half_g2))
        small = table.expected < exact_below
        if small.any():
            columns = np.broadcast_arrays(table.joint, table.first_total, table.second_total, table.total)
            result[small] = _log_p(Table(*(column[small] for column in columns)), "two-sided", mid=True)
        return result

    return evaluate([rule], joint, first_total, second_total, total)[0]


def _two_sided(table: Table) -> FloatArray:
    return _log_p(table, "two-sided", mid=False)


def _log_p(table: Table, alternative: Alternative, mid: bool) -> FloatArray:
    cells = tuple(np.array(cell) for cell in np.broadcast_arrays(*table.cells()))
    point = _log_point(*cells)
    own_share = np.log(0.5) if mid else 0.0
    # Exchanging the columns turns "fewer joint" into "more joint": only upper tails, from tables at or above the most
    # probable one, are ever added up.
    mirrored = (cells[1], cells[0], cells[3], cells[2])
    attracted = cells[0] * cells[3] >= cells[1] * cells[2]
    a, b, c, d = (np.where(attracted, cell, mirror) for cell, mirror in zip(cells, mirrored, strict=True))
    rest = _log_rest(point, a, b, c, d)
    near = point + np.logaddexp(own_share, rest)
    if alternative == "two-sided":
        result = np.logaddexp(near, _log_far_tail(point, a, b, c, d, own_share))
    else:
        other_share = np.log(0.5) if mid else -np.inf
        complement = np.log1p(-np.minimum(np.exp(point + np.logaddexp(other_share, rest)), 1.0))
        result = np.where(attracted == (alternative == "greater"), near, complement)
    return np.minimum(result, 0.0)


def _log_point(a: FloatArray, b: FloatArray, c: FloatArray, d: FloatArray) -> FloatArray:
    """ln of the hypergeometric probability of a table; the module docstring has the formula."""
    first, second, total = a + b, a + c, (a + b) + (c + d)
    margins = _s(first) + _s(second) + _s(total - first) + _s(total - second)
    return margins - _s(total) - _s(a) - _s(b) - _s(c) - _s(d) - half_g2(Table(a, first, second, total))


def _s(n: FloatArray) -> FloatArray:
    """ln n! - n ln n + n: Stirling's series from 16 on, where its next term is below 1e-14."""
    large = np.maximum(n, 16.0)
    inverse = 1.0 / large
    square = inverse * inverse
    series = inverse * (1 / 12 - square * (1 / 360 - square * (1 / 1260 - square / 1680)))
    result: FloatArray = 0.5 * np.log(2 * np.pi * large) + series
    small = n < 16
    few = n[small]
    whole = np.maximum(few, 0.0).astype(np.int64)
    exact = _WHOLE[whole]
    odd = np.flatnonzero(whole != few)
    exact[odd] = [_s_of(one) for one in few[odd].tolist()]
    result[small] = exact
    return result


def _s_of(n: float) -> float:
    if n < 0:
        return math.nan
    return math.lgamma(n + 1.0) - (n * math.log(n) if n else 0.0) + n


_WHOLE = np.array([_s_of(n) for n in range(16)])


def _log_rest(point: FloatArray, a: FloatArray, b: FloatArray, c: FloatArray, d: FloatArray) -> FloatArray:
    """ln of the sum of p(a + j) / p(a) over j >= 1, for tables at or above the most probable one."""
    ratio = b * c / ((a + 1.0) * (d + 1.0))
    spread = 1.0 / (1.0 / (a + 1.0) + 1.0 / (b + 1.0) + 1.0 / (c + 1.0) + 1.0 / (d + 1.0))
    slope = -np.log(np.minimum(ratio, 1.0))
    # Where slope j + j^2 / (2 spread) reaches _NEGLIGIBLE, in the form that does not cancel.
    length = 2.0 * _NEGLIGIBLE / (slope + np.sqrt(slope * slope + 2.0 * _NEGLIGIBLE / spread))
    long = length > _SUM_TERMS
    result = np.empty_like(point)
    if long.any():
        result[long] = _integrated(point[long], a[long], b[long], c[long], d[long], length[long])
    short = ~long
    result[short] = _added_up(a[short], b[short], c[short], d[short])
    return result


def _added_up(a: FloatArray, b: FloatArray, c: FloatArray, d: FloatArray) -> FloatArray:
    """The sum term by term; rows drop out once their terms no longer matter."""
    sums = np.zeros_like(a)
    rows = np.arange(a.size)
    term = np.ones_like(a)
    step = 1.0
    while rows.size:
        # Counts that are not whole stop at the last table whose cells are not negative.
        factor = np.maximum(b, 0.0) * np.maximum(c, 0.0) / ((a + 1.0) * (d + 1.0))
        term = term * factor
        sums[rows] += term
        going = term > 1e-17 * sums[rows]
        rows, term = rows[going], term[going]
        a, b, c, d = a[going] + step, b[going] - step, c[going] - step, d[going] + step
    return np.log(sums)


def _integrated(
    point: FloatArray, a: FloatArray, b: FloatArray, c: FloatArray, d: FloatArray, length: FloatArray
) -> FloatArray:
    """The sum of a long, hence smooth, tail: the midpoint Euler-Maclaurin formula with one correction term."""
    end = np.minimum(1.3 * length, np.minimum(b, c))
    half_width = 0.5 * (end - 0.5)
    integral = np.zeros_like(point)
    for node, weight in zip(*_gauss_legendre(), strict=True):
        j = 0.5 + half_width * (1.0 + node)
        integral += weight * np.exp(_log_point(a + j, b - j, c - j, d + j) - point)
    slope_at_half = b * c / ((a + 1.0) * (d + 1.0)) - 1.0
    return np.log(half_width * integral + slope_at_half / 24.0)


@cache
def _gauss_legendre() -> tuple[FloatArray, FloatArray]:
    nodes, weights = np.polynomial.legendre.leggauss(_NODES)
    return nodes, weights


def _log_far_tail(
    point: FloatArray, a: FloatArray, b: FloatArray, c: FloatArray, d: FloatArray, own_share: float
) -> FloatArray:
    """ln of the probability of the tables on the other side that are at most as probable as the one observed."""
    result = np.full(point.shape, -np.inf)
    farthest = np.floor(np.minimum(a, d))
    bound = point + _TIE

    def point_at(steps: FloatArray, rows: NDArray[np.intp]) -> FloatArray:
        return _log_point(a[rows] - steps, b[rows] + steps, c[rows] + steps, d[rows] - steps)

    rows = np.flatnonzero(farthest >= 1)
    rows = rows[point_at(farthest[rows], rows) <= bound[rows]]
    # Beyond the most probable table probabilities only fall: bisect for the first that is low enough.
    too_near, enough = np.zeros(rows.size), farthest[rows]
    while np.any(enough - too_near > 1):
        middle = np.floor(0.5 * (too_near + enough))
        low = point_at(middle, rows) <= bound[rows]
        # Rows that are done must not move on while others go: at step 0 the table itself would count as far.
        open_rows = enough - too_near > 1
        enough, too_near = np.where(open_rows & low, middle, enough), np.where(open_rows & ~low, middle, too_near)
    if rows.size:
        first = point_at(enough, rows)
        tied = first >= point[rows] - _TIE
        # The tail runs downwards, so the mirrored table is handed on.
        rest = _log_rest(first, b[rows] + enough, a[rows] - enough, d[rows] - enough, c[rows] + enough)
        result[rows] = first + np.logaddexp(np.where(tied, own_share, 0.0), rest)
    return result
