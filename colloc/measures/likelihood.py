"""Evidence against independence: the likelihood ratio G2 and Pearson's X2 with p-values, t-score and z-score."""

from __future__ import annotations

import numpy as np

from colloc.measures.contingency import FloatArray, Table, table_function
from colloc.measures.tails import chi_square_log_p, chi_square_p

_ALMOST_MINUS_ONE = np.nextafter(-1.0, 0.0)
LOG10_E = float(np.log10(np.e))
"""Turns natural logs into powers of ten."""


def half_g2(table: Table) -> FloatArray:
    """sum O ln(O / E) over the four cells, never negative; 0 where a margin is empty.

    Written as sum O log1p((O - E) / E), where O - E is the same in all four cells but for the sign: the plain form
    loses every digit to rounding once the total is some 10^12.
    """
    excess = table.excess
    result = np.zeros_like(excess)
    for sign, observed, expected in zip((1.0, -1.0, -1.0, 1.0), table.cells(), table.expected_cells(), strict=True):
        relative = sign * excess / expected
        # An empty cell has -1 here, and 0/0 where its margin is empty: kept finite, so that 0 times its log is 0.
        result += observed * np.log1p(np.fmax(relative, _ALMOST_MINUS_ONE))
    return np.maximum(result, 0.0)


def x2(table: Table) -> FloatArray:
    """Pearson's X2 without continuity correction, as (O - E)^2 (1/E11 + 1/E12 + 1/E21 + 1/E22); 0 on empty margins."""
    excess = table.excess
    inverse = np.zeros_like(excess)
    for expected in table.expected_cells():
        inverse = inverse + 1.0 / expected
    return np.where(excess == 0, 0.0, excess * excess * inverse)


@table_function
def g2(table: Table) -> FloatArray:
    """Log-likelihood ratio 2 sum O ln(O / E) with the sign of O - E (Dunning 1993; nats).

    Its size is chi-square distributed with one degree of freedom where the words are independent. 0 ln 0 = 0; 0
    where a word is never or always there.
    """
    return np.copysign(2.0 * table.once(half_g2), table.excess) + 0.0


@table_function
def chi2(table: Table) -> FloatArray:
    """Pearson's X2 = sum (O - E)^2 / E over the four cells, without continuity correction, with the sign of O - E."""
    return np.copysign(table.once(x2), table.excess) + 0.0


@table_function
def g2_p(table: Table) -> FloatArray:
    """Two-sided p-value of G2 by the chi-square distribution with one degree of freedom; 0 below about 1e-308."""
    return chi_square_p(2.0 * table.once(half_g2))


@table_function
def chi2_p(table: Table) -> FloatArray:
    """Two-sided p-value of X2 by the chi-square distribution with one degree of freedom; 0 below about 1e-308."""
    return chi_square_p(table.once(x2))


@table_function
def g2_log10_p(table: Table) -> FloatArray:
    """log10 of ``g2_p``, exact where the p-value itself is too small for a float."""
    return chi_square_log_p(2.0 * table.once(half_g2)) * LOG10_E


@table_function
def chi2_log10_p(table: Table) -> FloatArray:
    """log10 of ``chi2_p``, exact where the p-value itself is too small for a float."""
    return chi_square_log_p(table.once(x2)) * LOG10_E


@table_function
def t(table: Table) -> FloatArray:
    """t-score (O - E) / sqrt(O) (Church et al. 1991; Manning & Schuetze 1999, section 5.3.1).

    -inf where words expected to meet never do; nan where a word never occurs.
    """
    return table.excess / np.sqrt(table.joint)


@table_function
def z(table: Table) -> FloatArray:
    """z-score (O - E) / sqrt(E) (Berry-Rogghe 1973, without the factor for E / N); nan where a word never occurs."""
    return table.excess / np.sqrt(table.expected)
