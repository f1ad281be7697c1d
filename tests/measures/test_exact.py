"""Fisher's exact test: against scipy, whole-number arithmetic, and sums in 50 digits where counts are large."""

from __future__ import annotations

import math
from decimal import Decimal, localcontext
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from colloc.errors import UsageError
from colloc.measures.catalogue import compute_all
from colloc.measures.exact import association_log_p, fisher_log_p

from .test_reference_libraries import four, random_tables

small = st.integers(0, 25)


@pytest.mark.parametrize("alternative", ["two-sided", "greater", "less"])
@pytest.mark.parametrize("largest", [5, 30, 400])
def test_agrees_with_scipy(alternative: str, largest: int) -> None:
    tables = random_tables(largest, 120, largest)
    values = np.exp(fisher_log_p(*four(tables), alternative=alternative))  # type: ignore[arg-type]
    reference = [stats.fisher_exact(table, alternative=alternative).pvalue for table in tables]
    np.testing.assert_allclose(values, reference, rtol=1e-9)


def ways(a: int, b: int, c: int, d: int) -> tuple[dict[int, int], int]:
    """How many of the arrangements with these margins have each joint count, and how many there are."""
    first, second, total = a + b, a + c, a + b + c + d
    support = range(max(0, first + second - total), min(first, second) + 1)
    number = {k: math.comb(first, k) * math.comb(total - first, second - k) for k in support}
    return number, math.comb(total, second)


@settings(max_examples=40)
@given(a=small, b=small, c=small, d=small)
def test_mid_p_agrees_with_whole_numbers(a: int, b: int, c: int, d: int) -> None:
    # Lancaster 1961: the observed probability by half; two-sided, all equally probable tables by half.
    number, everything = ways(a, b, c, d)
    own = number[a]
    expected = {
        "greater": Fraction(2 * sum(n for k, n in number.items() if k > a) + own, 2 * everything),
        "less": Fraction(2 * sum(n for k, n in number.items() if k < a) + own, 2 * everything),
        "two-sided": Fraction(
            2 * sum(n for n in number.values() if n < own) + sum(n for n in number.values() if n == own), 2 * everything
        ),
    }
    for alternative, p in expected.items():
        got = fisher_log_p(a, a + b, a + c, a + b + c + d, alternative=alternative, mid=True)  # type: ignore[arg-type]
        assert float(np.exp(got)) == pytest.approx(float(p), rel=1e-10)


def log_factorial(n: int) -> Decimal:
    """Stirling's series in 50 digits, for n above a few thousand (Abramowitz & Stegun 6.1.41)."""
    x = Decimal(n)
    half_log_two_pi = Decimal("0.91893853320467274178032973640561763986139747363778")
    series = 1 / (12 * x) - 1 / (360 * x**3) + 1 / (1260 * x**5) - 1 / (1680 * x**7) + 1 / (1188 * x**9)
    return (x + Decimal("0.5")) * x.ln() - x + half_log_two_pi + series


def upper_tail(joint: int, first: int, second: int, total: int) -> float:
    """ln P(at least so many), the first term in 50 digits and the others by their ratios."""
    a, b, c, d = joint, first - joint, second - joint, total - first - second + joint
    with localcontext() as context:
        context.prec = 50
        margins = sum(map(log_factorial, (first, second, total - first, total - second)), Decimal(0))
        point = float(margins - sum(map(log_factorial, (total, a, b, c, d)), Decimal(0)))
    steps = np.arange(min(b, c, 400_000))
    terms = np.exp(np.cumsum(np.log((b - steps) / (a + 1 + steps)) + np.log((c - steps) / (d + 1 + steps))))
    return point + math.log1p(float(np.sum(terms)))


@pytest.mark.parametrize(
    "counts",
    [
        (755_000, 2_000_000, 3_000_000, 8_000_000),
        (750_000, 2_000_000, 3_000_000, 8_000_000),
        (1_000_000, 2_000_000, 3_000_000, 8_000_000),
        (1_003_000, 10**9, 10**9, 10**12),
        (2**20 + 5000, 2**40, 2**40, 2**60),
        (60_000, 2**38, 2**30, 2**53),
        (12_000, 100_000, 10**12, 10**13),
    ],
)
def test_large_counts(counts: tuple[int, int, int, int]) -> None:
    got = float(fisher_log_p(*counts, alternative="greater"))
    assert got == pytest.approx(upper_tail(*counts), rel=1e-8)


def test_small_p_values_do_not_vanish() -> None:
    # 5,000 words that are never apart: one arrangement in C(10^6, 5000).
    values = compute_all(["fisher_p", "fisher_log10_p"], 5000, 5000, 5000, 10**6)
    assert values["fisher_p"] == 0
    exact = -(math.lgamma(10**6 + 1) - math.lgamma(5001) - math.lgamma(10**6 - 5000 + 1)) / math.log(10)
    assert float(values["fisher_log10_p"]) == pytest.approx(exact, rel=1e-9)


def test_against_the_grain() -> None:
    # An upper tail below expectation is one less the lower tail; complete where that is nothing.
    assert float(fisher_log_p(755_000, 2_000_000, 3_000_000, 8_000_000, alternative="less")) == pytest.approx(
        0, abs=1e-15
    )
    both = np.exp([fisher_log_p(3, 10, 40, 100, alternative=side, mid=True) for side in ("less", "greater")])
    assert both.sum() == pytest.approx(1, rel=1e-12)


@pytest.mark.parametrize("scale", [1, 100, 10**4, 10**7])
def test_two_sided_of_a_symmetric_distribution_is_twice_one_sided(scale: int) -> None:
    # Margins of one half make the distribution symmetric, so both tails are equal.
    joint, half = 26 * scale + math.isqrt(scale), 50 * scale
    table = (joint, half, half, 2 * half)
    one, two = (float(fisher_log_p(*table, alternative=side)) for side in ("greater", "two-sided"))
    assert two == pytest.approx(one + math.log(2), rel=1e-8)


def test_empty_and_full_margins_say_nothing() -> None:
    for table in ((0, 0, 5, 10), (5, 10, 5, 10), (0, 0, 0, 0)):
        assert fisher_log_p(*table) == 0
        assert float(np.exp(fisher_log_p(*table, mid=True))) == pytest.approx(0.5)


def test_half_counts_lie_between_whole_ones() -> None:
    # A word beside itself has halved margins, which need not be whole.
    values = fisher_log_p(4, np.array([10, 10.5, 11]), np.array([10, 10.5, 11]), 100)
    assert values[0] < values[1] < values[2]


def test_unknown_alternative() -> None:
    with pytest.raises(UsageError, match="alternative must be one of two-sided, greater, less, not 'more'"):
        fisher_log_p(1, 2, 3, 10, alternative="more")  # type: ignore[arg-type]


def test_combined_p_is_exact_below_five_and_g2_above() -> None:
    joint = np.array([3, 3, 0, 40])
    first = np.array([10, 100, 1000, 500])
    second = np.array([20, 200, 900, 300])
    total = 10_000
    combined = association_log_p(joint, first, second, total)
    exact = fisher_log_p(joint, first, second, total, mid=True)
    ratio = np.log(10) * compute_all(["g2_log10_p"], joint, first, second, total)["g2_log10_p"]
    np.testing.assert_allclose(combined, [exact[0], exact[1], ratio[2], ratio[3]], rtol=1e-12)
    np.testing.assert_allclose(association_log_p(joint, first, second, total, exact_below=np.inf), exact)


def test_combined_p_is_fair_on_random_pairs() -> None:
    # Independent words: a p-value below 0.05 must come about as often as that. Chi-square alone fails here.
    generator = np.random.default_rng(5)
    first, second, total = generator.integers(5, 400, 20_000), generator.integers(5, 400, 20_000), 20_000
    joint = generator.hypergeometric(first, total - first, second)
    p = np.exp(association_log_p(joint, first, second, total))
    for level in (0.01, 0.05, 0.2):
        assert np.mean(p <= level) <= 1.15 * level
    seen = joint > 0
    assert np.mean(compute_all(["chi2_p"], joint, first, second, total)["chi2_p"][seen] <= 0.01) > 0.02
