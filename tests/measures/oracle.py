"""Every measure once more, slow and obvious, in 60-digit decimal arithmetic: what the fast ones are checked against."""

from __future__ import annotations

import math
from collections.abc import Callable
from decimal import MAX_EMAX, MIN_EMIN, Decimal, localcontext
from fractions import Fraction

Counts = tuple[int, int, int, int]
"""joint, first_total, second_total, total."""

DIGITS = 60
PI = Decimal("3.14159265358979323846264338327950288419716939937510582097494459")
INFINITY = Decimal("Infinity")


def cells(counts: Counts) -> tuple[int, int, int, int]:
    joint, first, second, total = counts
    return joint, first - joint, second - joint, total - first - second + joint


def _log2(numerator: int, denominator: int) -> Decimal:
    if numerator == 0:
        return -INFINITY
    return (Decimal(numerator) / Decimal(denominator)).ln() / Decimal(2).ln()


def _pmi(counts: Counts) -> Decimal:
    joint, first, second, total = counts
    return _log2(joint * total, first * second)


def _npmi(counts: Counts) -> Decimal:
    joint, first, second, total = counts
    if joint == 0:
        return Decimal(-1)
    return Decimal(1) if joint == first == second else _pmi(counts) / _log2(total, joint)


def _share(counts: Counts) -> Decimal:
    return Decimal(counts[0]) / Decimal(counts[3]) * _pmi(counts) if counts[0] else Decimal(0)


def _expected(counts: Counts) -> list[Decimal]:
    _, first, second, total = counts
    rows, columns = (first, total - first), (second, total - second)
    return [Decimal(row * column) / Decimal(total) for row in rows for column in columns]


def _sign(counts: Counts) -> int:
    joint, first, second, total = counts
    return 1 if joint * total >= first * second else -1


def _g2(counts: Counts) -> Decimal:
    pairs = zip(cells(counts), _expected(counts), strict=True)
    return _sign(counts) * 2 * sum((o * (Decimal(o) / e).ln() for o, e in pairs if o), Decimal(0))


def _chi2(counts: Counts) -> Decimal:
    pairs = zip(cells(counts), _expected(counts), strict=True)
    return _sign(counts) * sum(((o - e) ** 2 / e for o, e in pairs if e), Decimal(0))


def _erfc(x: Decimal) -> Decimal:
    """Taylor series, and Laplace's continued fraction from 6 on (Abramowitz & Stegun 7.1.5, 7.1.14)."""
    if x < 6:
        term = total = x
        n = 0
        while abs(term) > Decimal(10) ** -DIGITS:
            n += 1
            term *= -x * x / n
            total += term / (2 * n + 1)
        return 1 - 2 * total / PI.sqrt()
    tail = x
    for n in range(300, 0, -1):
        tail = x + Decimal(n) / 2 / tail
    return (-x * x).exp() / (tail * PI.sqrt())


def _p(statistic: Decimal) -> Decimal:
    return _erfc((abs(statistic) / 2).sqrt())


def _fisher(counts: Counts) -> Decimal:
    joint, first, second, total = counts
    ways = {
        a: math.comb(first, a) * math.comb(total - first, second - a)
        for a in range(max(0, first + second - total), min(first, second) + 1)
    }
    return Decimal(sum(way for way in ways.values() if way <= ways[joint])) / Decimal(sum(ways.values()))


def _t(counts: Counts) -> Decimal:
    excess = counts[0] - _expected(counts)[0]
    return excess / Decimal(counts[0]).sqrt() if counts[0] else -INFINITY


def _corrected(counts: Counts) -> list[Decimal]:
    table = [Decimal(cell) for cell in cells(counts)]
    return [cell + Decimal("0.5") for cell in table] if 0 in table else table


def _log_odds(counts: Counts) -> Decimal:
    a, b, c, d = _corrected(counts)
    return (a * d / (b * c)).ln()


def _ratio(numerator: int, denominator: int) -> Decimal:
    return Decimal(numerator) / Decimal(denominator)


def _difference(this: Fraction, that: Fraction) -> Decimal:
    gap = this - that
    return Decimal(gap.numerator) / Decimal(gap.denominator)


ORACLE: dict[str, Callable[[Counts], Decimal]] = {
    "pmi": _pmi,
    "npmi": _npmi,
    "ppmi": lambda n: max(_pmi(n), Decimal(0)),
    "pmi2": lambda n: _log2(n[0] ** 2, n[1] * n[2]),
    "pmi3": lambda n: _log2(n[0] ** 3, n[1] * n[2] * n[3]),
    "mi_share": _share,
    "g2": _g2,
    "chi2": _chi2,
    "g2_p": lambda n: _p(_g2(n)),
    "g2_log10_p": lambda n: _p(_g2(n)).log10(),
    "chi2_p": lambda n: _p(_chi2(n)),
    "chi2_log10_p": lambda n: _p(_chi2(n)).log10(),
    "fisher_p": _fisher,
    "fisher_log10_p": lambda n: _fisher(n).log10(),
    "t": _t,
    "z": lambda n: (n[0] - _expected(n)[0]) / _expected(n)[0].sqrt(),
    "dice": lambda n: _ratio(2 * n[0], n[1] + n[2]),
    "jaccard": lambda n: _ratio(n[0], n[1] + n[2] - n[0]),
    "min_sensitivity": lambda n: _ratio(n[0], max(n[1], n[2])),
    "delta_p_second_given_first": lambda n: _difference(Fraction(n[0], n[1]), Fraction(n[2] - n[0], n[3] - n[1])),
    "delta_p_first_given_second": lambda n: _difference(Fraction(n[0], n[2]), Fraction(n[1] - n[0], n[3] - n[2])),
    "log_odds": _log_odds,
    "log_odds_se": lambda n: sum((1 / cell for cell in _corrected(n)), Decimal(0)).sqrt(),
    "p_second_given_first": lambda n: _ratio(n[0], n[1]),
    "p_first_given_second": lambda n: _ratio(n[0], n[2]),
}


def value(name: str, counts: Counts) -> float:
    """The measure of one table in which both words occur and neither is everywhere."""
    with localcontext() as context:
        context.prec, context.Emin, context.Emax = DIGITS, MIN_EMIN, MAX_EMAX
        return float(ORACLE[name](counts))
