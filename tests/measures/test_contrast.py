"""Contrasts of two sub-corpora: printed numbers, libraries, simulation."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from statsmodels.stats.contingency_tables import Table2x2

from colloc.measures.catalogue import compute_all
from colloc.measures.contrast import (
    as_table,
    difference,
    keyness_g2,
    keyness_g2_two_cells,
    log_ratio_interval,
    relative_frequency_ratio,
    t_of_difference,
    welch_test,
)

from .rounding import cuts_to, rounds_to


def test_agresti_relative_risk() -> None:
    # Agresti, Categorical Data Analysis: 189 of 11,034 against 104 of 11,037: 1.818 (1.43, 2.31).
    value, interval = log_ratio_interval(189, 11_034, 104, 11_037)
    assert rounds_to(2.0 ** float(value), "1.818")
    assert rounds_to(2.0 ** float(interval.low), "1.43")
    assert rounds_to(2.0 ** float(interval.high), "2.31")


def test_log_ratio_agrees_with_statsmodels() -> None:
    generator = np.random.default_rng(1)
    for this, that in generator.integers(1, 500, (50, 2)):
        reference = Table2x2([[this, 10_000 - this], [that, 7_000 - that]])
        value, interval = log_ratio_interval(this, 10_000, that, 7_000, confidence=0.9)
        low, high = reference.log_riskratio_confint(alpha=0.1)
        np.testing.assert_allclose(
            np.log(2) * np.array([value, interval.low, interval.high]), [reference.log_riskratio, low, high], rtol=1e-9
        )


def test_dagan_itai_lower_bounds() -> None:
    # Dagan & Itai 1994, Computational Linguistics 20(4): ln(n1/n2) - 1.282 sqrt(1/n1 + 1/n2), counts of two readings
    # out of the same large corpus; 1.282 is the two-sided quantile of 80 %.
    for this, that, printed in ((10, 5, "-0.009"), (29, 5, "1.137"), (20.5, 0.5, "1.879"), (7.5, 0.5, "0.836")):
        _, interval = log_ratio_interval(this, 1e12, that, 1e12, confidence=0.8)
        assert float(interval.low) * np.log(2) == pytest.approx(float(printed), abs=0.0015)


def test_log_ratio_stays_finite_at_zero() -> None:
    value, interval = log_ratio_interval([5, 0, 0], 1000, [0, 5, 0], 1000)
    assert np.isfinite([value, interval.low, interval.high]).all()
    assert value[0] == -value[1]
    assert value[2] == 0


def test_manning_schuetze_relative_frequency_ratios() -> None:
    # Manning & Schuetze 1999, Table 5.18 (from memory): 2 times in 14,307,668 against k times in 11,731,564.
    printed = {68: 0.0241, 44: 0.0372, 41: 0.0399, 40: 0.0409, 34: 0.0482, 33: 0.0496, 32: 0.0512, 31: 0.0529}
    values = relative_frequency_ratio(2, 14_307_668, list(printed), 11_731_564)
    np.testing.assert_allclose(values, list(printed.values()), atol=1.01e-4)
    np.testing.assert_array_equal(relative_frequency_ratio([3, 0], 10, [0, 0], 10), [np.inf, np.nan])


def test_manning_schuetze_t_of_difference() -> None:
    # Manning & Schuetze 1999, Table 5.7: strong against powerful, cut to four decimals.
    rows = "3.1622 10 0|2.8284 8 0|2.1828 13 4|7.0710 50 0|6.3257 58 7|4.6904 22 0|4.0249 19 1|3.9000 18 1"
    for row in rows.split("|"):
        printed, this, that = row.split()
        assert cuts_to(float(t_of_difference(int(this), int(that))), printed)
    assert np.isnan(t_of_difference(0, 0))


def test_both_likelihood_ratios() -> None:
    # 110 in 2,552 against 111 in 29,225, recomputed with a general library: two cells 267.0293, four 270.7219.
    assert rounds_to(float(keyness_g2_two_cells(110, 2_552, 111, 29_225)), "267.0293")
    assert rounds_to(float(keyness_g2(110, 2_552, 111, 29_225)), "270.7219")
    generator = np.random.default_rng(2)
    for this, that in [*generator.integers(0, 40, (60, 2)), (0, 1), (0, 0)]:
        size = float(keyness_g2_two_cells(this, 5_000, that, 3_000))
        if this + that == 0:
            assert size == 0
            continue
        expected = (this + that) * np.array([5, 3]) / 8
        reference = stats.power_divergence([this, that], expected, lambda_="log-likelihood").statistic
        assert abs(size) == pytest.approx(reference, abs=1e-10)
        assert size == 0 or (size > 0) == (this / 5_000 > that / 3_000)


def test_as_table_serves_every_measure() -> None:
    values = compute_all(["g2", "log_odds"], *as_table([110, 3], 2_552, [111, 3], 2_552))
    assert values["log_odds"][1] == 0
    assert values["g2"][1] == 0


def test_difference_of_log_odds_is_a_z_test() -> None:
    result = difference([2.0, -1.0], [0.3, 0.4], [1.0, -1.0], [0.4, 0.3])
    np.testing.assert_allclose(result.z, [2, 0])
    np.testing.assert_allclose(np.exp(result.log_p), 2 * stats.norm.sf([2, 0]), rtol=1e-12)
    # Two strata: the squared z is Woolf's homogeneity statistic (see test_strata.py for that one).
    assert result.se.tolist() == [0.5, 0.5]


def test_welch_agrees_with_scipy() -> None:
    generator = np.random.default_rng(3)
    this, that = generator.gamma(0.5, 2, (12, 30)), generator.gamma(0.6, 3, (12, 9))
    result, df = welch_test(
        this.mean(axis=1), this.var(axis=1, ddof=1), 30, that.mean(axis=1), that.var(axis=1, ddof=1), 9
    )
    reference = stats.ttest_ind(this, that, axis=1, equal_var=False)
    np.testing.assert_allclose(result.z, reference.statistic, rtol=1e-10)
    np.testing.assert_allclose(df, reference.df, rtol=1e-10)
    np.testing.assert_allclose(np.exp(result.log_p), reference.pvalue, rtol=1e-9)


def test_one_talkative_document_proves_nothing() -> None:
    # 40 occurrences in one of 50 documents: G2 is beyond doubt, the test over documents is not impressed.
    rates = np.zeros(50)
    rates[7] = 40 / 1000
    result, _ = welch_test(rates.mean(), rates.var(ddof=1), 50, 0.0, 0.0, 50)
    assert keyness_g2(40, 50_000, 0, 50_000) > 50
    assert float(np.exp(result.log_p)) > 0.3


def test_welch_without_variance_or_documents() -> None:
    result, _ = welch_test([1.0, 1.0], [0.0, 0.5], [5, 1], [1.0, 2.0], [0.0, 0.5], [5, 1])
    assert np.isnan(result.log_p).all()
