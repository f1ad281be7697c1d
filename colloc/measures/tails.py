"""Tails of the chi-square distribution with one degree of freedom, and quantiles of Student's t.

Written out here because a single card of evidence needs them, and loading a library of special functions takes longer
than all else that the card does. The tests hold them against such a library.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from statistics import NormalDist

import numpy as np
from numpy.typing import ArrayLike

from colloc.measures.contingency import FloatArray

# Rational approximations of the error function, each right to the last digits of a float on its range:
# W. J. Cody (1969), Rational Chebyshev approximations for the error function, Mathematics of Computation 23, 631-637.
# Highest power first. erf(x) / x over x^2, for x <= 0.46875:
_ERF_OVER = (1.85777706184603153e-1, 3.16112374387056560, 113.864154151050156, 377.485237685302021, 3209.37758913846947)
_ERF_UNDER = (1.0, 23.6012909523441209, 244.024637934444173, 1282.61652607737228, 2844.23683343917062)
# erfcx(x) = exp(x^2) erfc(x) over x, for 0.46875 < x <= 4:
_MIDDLE_OVER = (
    *(2.15311535474403846e-8, 5.64188496988670089e-1, 8.88314979438837594, 66.1191906371416295, 298.635138197400131),
    *(881.952221241769090, 1712.04761263407058, 2051.07837782607147, 1230.33935479799725),
)
_MIDDLE_UNDER = (
    *(1.0, 15.7449261107098347, 117.693950891312499, 537.181101862009858, 1621.38957456669019),
    *(3290.79923573345963, 4362.61909014324716, 3439.36767414372164, 1230.33935480374942),
)
# (1 / sqrt(pi) - x erfcx(x)) x^2 over 1 / x^2, for x > 4:
_FAR_OVER = (
    *(1.63153871373020978e-2, 3.05326634961232344e-1, 3.60344899949804439e-1, 1.25781726111229246e-1),
    *(1.60837851487422766e-2, 6.58749161529837803e-4),
)
_FAR_UNDER = (
    *(1.0, 2.56852019228982242, 1.87295284992346047, 5.27905102951428412e-1),
    *(6.05183413124413191e-2, 2.33520497626869185e-3),
)
_NEAR, _MIDDLE = 0.46875**2, 4.0**2
"""Where the ranges end, as values of x^2."""


def chi_square_p(statistic: ArrayLike) -> FloatArray:
    """P(chi-square with one degree of freedom > statistic) = erfc(sqrt(statistic / 2)); 0 below about 1e-308.

    One degree of freedom is the square of a normal deviate. nan for statistics below 0 and nan.
    """
    return _by_range(statistic, lambda near: 1.0 - near, lambda half, scaled: np.exp(-half) * scaled)


def chi_square_log_p(statistic: ArrayLike) -> FloatArray:
    """Natural log of :func:`chi_square_p`, right also where that is too small for a float."""
    return _by_range(statistic, lambda near: np.log1p(-near), lambda half, scaled: np.log(scaled) - half)


def t_quantile(confidence: float, freedom: int) -> float:
    """What Student's t lies below in size with a probability of ``confidence``: 2.09 for 0.95 and 19.

    Parameters
    ----------
    confidence : float
        Between 0 and 1.
    freedom : int
        Degrees of freedom, at least 1.
    """
    # The probability grows ever more slowly: Newton's steps from the normal quantile, on the left, never overshoot.
    value = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
    log_scale = math.lgamma(0.5 * freedom + 0.5) - math.lgamma(0.5 * freedom) - 0.5 * math.log(math.pi * freedom)
    while True:
        density = 2.0 * math.exp(log_scale - 0.5 * (freedom + 1) * math.log1p(value * value / freedom))
        further = value + (confidence - _t_inside(value, freedom)) / density
        if further - value <= 1e-15 * further:
            return further
        value = further


def _t_inside(value: float, freedom: int) -> float:
    """P(size of t < value): Abramowitz & Stegun (1964), 26.7.3 and 26.7.4."""
    angle = math.atan2(value, math.sqrt(freedom))
    cosine = math.cos(angle)
    term = cosine if freedom % 2 else 1.0
    total = 0.0
    for power in range(1 + freedom % 2, freedom, 2):
        total += term
        term *= cosine * cosine * power / (power + 1)
    total *= math.sin(angle)
    return (angle + total) * 2.0 / math.pi if freedom % 2 else total


def _by_range(
    statistic: ArrayLike,
    near: Callable[[FloatArray], FloatArray],
    far: Callable[[FloatArray, FloatArray], FloatArray],
) -> FloatArray:
    """``near(erf(x))`` for small x, ``far(x^2, erfcx(x))`` beyond, for statistics 2 x^2."""
    half = 0.5 * np.asarray(statistic, dtype=np.float64)
    flat = half.reshape(-1)
    result = np.full(flat.shape, np.nan)
    ranges = ((0.0, _NEAR, None), (_NEAR, _MIDDLE, _middle), (_MIDDLE, np.inf, _far))
    for low, high, scaled in ranges:
        rows = np.flatnonzero((flat >= low) & (flat <= high) if scaled is None else (flat > low) & (flat <= high))
        if not len(rows):
            continue
        square = flat[rows]
        root = np.sqrt(square)
        if scaled is None:
            result[rows] = near(root * _polynomial(_ERF_OVER, square) / _polynomial(_ERF_UNDER, square))
        else:
            with np.errstate(divide="ignore"):  # the log of nothing, at infinity
                result[rows] = far(square, scaled(root))
    return result.reshape(half.shape)


def _middle(x: FloatArray) -> FloatArray:
    return _polynomial(_MIDDLE_OVER, x) / _polynomial(_MIDDLE_UNDER, x)


def _far(x: FloatArray) -> FloatArray:
    inverse = 1.0 / (x * x)
    return (1.0 / math.sqrt(math.pi) - inverse * _polynomial(_FAR_OVER, inverse) / _polynomial(_FAR_UNDER, inverse)) / x


def _polynomial(coefficients: Sequence[float], x: FloatArray) -> FloatArray:
    value = np.full_like(x, coefficients[0])
    for coefficient in coefficients[1:]:
        value *= x
        value += coefficient
    return value
