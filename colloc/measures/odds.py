"""The log odds ratio (natural log) with its standard error, and the log ratio (base 2)."""

from __future__ import annotations

import numpy as np

from colloc.measures.contingency import FloatArray, Table, table_function

ZERO_CORRECTION = 0.5
"""Added to all four cells where one of them is zero (Haldane 1956; Anscombe 1956)."""


def corrected_cells(table: Table) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """The four cells, each 0.5 more in tables that have a zero."""
    joint, only_first, only_second, neither = table.cells()
    zero = (joint == 0) | (only_first == 0) | (only_second == 0) | (neither == 0)
    more = np.where(zero, ZERO_CORRECTION, 0.0)
    return joint + more, only_first + more, only_second + more, neither + more


@table_function
def log_odds(table: Table) -> FloatArray:
    """ln(ad / bc), 0.5 more in every cell where one is zero: always finite (Haldane 1956; Agresti 2013, 3.1.1)."""
    joint, only_first, only_second, neither = corrected_cells(table)
    return np.log((joint * neither) / (only_first * only_second))


@table_function
def log_odds_se(table: Table) -> FloatArray:
    """Standard error of ``log_odds``, sqrt(1/a + 1/b + 1/c + 1/d) (Woolf 1955), on the same corrected cells."""
    joint, only_first, only_second, neither = corrected_cells(table)
    return np.sqrt(1.0 / joint + 1.0 / only_first + 1.0 / only_second + 1.0 / neither)


@table_function
def log_ratio(table: Table) -> FloatArray:
    """log2(p(y|x) / p(y|not x)) in bits: one unit is a doubling.

    -inf where the words never meet, inf where the second never occurs without the first; nan where the second word
    never occurs or the first is never or always there.
    """
    with_first = table.joint / table.first_total
    without_first = table.only_second / (table.total - table.first_total)
    return np.log2(with_first / without_first)
