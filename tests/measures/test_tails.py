"""Tails of the chi-square and the t distribution against scipy, over all of their range."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import special

from colloc.measures.tails import chi_square_log_p, chi_square_p, t_quantile

STATISTICS = np.concatenate(
    [
        [0.0, 5e-324, 1e-300],
        np.logspace(-30, 3, 200_000),
        # on either side of where the approximations change, x^2 = 0.46875^2 and 4^2
        2 * 0.46875**2 * (1 + np.arange(-8, 9) * 2.0**-52),
        2 * 4.0**2 * (1 + np.arange(-8, 9) * 2.0**-52),
    ]
)


def test_p_values_to_the_last_digits() -> None:
    """Source: scipy.special.erfc (Cephes). exp(-x^2) turns the rounding of x into x^2 times as much."""
    found = chi_square_p(STATISTICS)
    wanted = special.erfc(np.sqrt(STATISTICS / 2))
    assert np.all(np.abs(found / wanted - 1) <= 2e-15 + 4e-16 * STATISTICS)


def test_published_p_values() -> None:
    """Source: critical values of chi-square with one degree of freedom (Abramowitz & Stegun 1964, table 26.8)."""
    found = chi_square_p([2.70554, 3.84146, 6.63490, 10.828])
    np.testing.assert_allclose(found, [0.1, 0.05, 0.01, 0.001], rtol=3e-4)


def test_logs_far_beyond_what_a_float_holds() -> None:
    """Source: scipy.special.log_ndtr of the root, the normal tail doubled."""
    statistics = np.concatenate([STATISTICS, np.logspace(3, 15, 20_000)])
    found = chi_square_log_p(statistics)
    wanted = np.log(2) + special.log_ndtr(-np.sqrt(statistics))
    np.testing.assert_allclose(found, wanted, rtol=1e-14, atol=4e-16)


def test_small_statistics_keep_their_log() -> None:
    """ln(1 - erf x) is about -2 x / sqrt(pi) for small x: not lost beside 1. Source: mathematics."""
    statistics = np.logspace(-30, -10, 50)
    np.testing.assert_allclose(chi_square_log_p(statistics), -2 * np.sqrt(statistics / 2) / np.sqrt(np.pi), rtol=1e-5)


def test_tiny_p_values() -> None:
    """The smallest that a float holds, then 0; the logarithm goes on, to minus infinity."""
    np.testing.assert_allclose(chi_square_p(1400.0), special.erfc(np.sqrt(700.0)), rtol=1e-12)
    assert chi_square_p(1.0e4) == 0.0
    assert chi_square_p(np.inf) == 0.0
    assert chi_square_log_p(np.inf) == -np.inf
    assert chi_square_p(0.0) == 1.0
    assert chi_square_log_p(0.0) == 0.0


def test_what_is_no_statistic_is_no_number() -> None:
    assert np.isnan(chi_square_p([np.nan, -1.0])).all()
    assert np.isnan(chi_square_log_p([np.nan, -1.0])).all()


def test_each_value_alone_as_among_many() -> None:
    """p-values are looked up among those of a whole table: they must agree to the last bit."""
    some = STATISTICS[:: len(STATISTICS) // 500]
    for function in (chi_square_p, chi_square_log_p):
        together = function(some)
        assert together.tolist() == [float(function(one)) for one in some]
        assert function(some[:-1].reshape(-1, 2)).shape == (len(some[:-1]) // 2, 2)


@pytest.mark.parametrize("freedom", [*range(1, 40), 99, 100, 999, 1000])
def test_t_quantiles(freedom: int) -> None:
    """Source: scipy.special.stdtrit (Cephes/Boost)."""
    for confidence in (1e-3, 0.1, 0.5, 0.8, 0.9, 0.95, 0.99, 0.999):
        wanted = special.stdtrit(freedom, 0.5 + 0.5 * confidence)
        assert t_quantile(confidence, freedom) == pytest.approx(wanted, rel=1e-12)


def test_published_t_quantiles() -> None:
    """Source: Abramowitz & Stegun (1964), table 26.10, 95 % two-sided."""
    found = [t_quantile(0.95, freedom) for freedom in (1, 2, 5, 10, 19, 30, 120)]
    np.testing.assert_allclose(found, [12.706, 4.303, 2.571, 2.228, 2.093, 2.042, 1.980], atol=5e-4)
