"""Tests over documents against scipy, statsmodels, and all exchanges of labels counted one by one."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest
from scipy import stats

from colloc.errors import UsageError
from colloc.measures.subcorpora.documents import document_test, groups_test, permuted_p
from colloc.measures.subcorpora.ranks import DocumentRates
from colloc.measures.subcorpora.trends import trend_test

ITEMS, DOCUMENTS = 120, 40


def table_of(seed: int, documents: int = DOCUMENTS, items: int = ITEMS) -> np.ndarray:
    """Relative frequencies of words that come in bursts, many of them rare, with equal values among them."""
    random = np.random.default_rng(seed)
    rate = random.gamma(0.3, 3.0, size=(items, 1)) * random.gamma(0.7, 1.5, size=(items, documents))
    return np.asarray(random.poisson(rate) / random.integers(50, 60, size=documents))


def rates_of(table: np.ndarray) -> DocumentRates:
    items, documents = np.nonzero(table)
    return DocumentRates(items, documents, table[items, documents], *table.shape)


@pytest.fixture(scope="module")
def table() -> np.ndarray:
    return table_of(1)


@pytest.mark.parametrize("n_this", [3, 12, 20])
def test_rank_sum_and_welch_are_those_of_scipy(table: np.ndarray, n_this: int) -> None:
    labels = np.arange(DOCUMENTS) < n_this
    found = document_test(rates_of(table), labels)
    for item in np.flatnonzero(table.any(axis=1)):
        this, that = table[item, labels], table[item, ~labels]
        ranks = stats.mannwhitneyu(this, that, method="asymptotic", use_continuity=False)
        assert 2 * stats.norm.sf(abs(found.rank_z[item])) == pytest.approx(ranks.pvalue, abs=1e-9)
        if np.ptp(this) or np.ptp(that):
            welch = stats.ttest_ind(this, that, equal_var=False)
            assert found.welch_t[item] == pytest.approx(welch.statistic)
            assert found.log_p[item] >= np.log(welch.pvalue) - 1e-9 or not found.log_p[item]


def test_kruskal_wallis_is_that_of_scipy(table: np.ndarray) -> None:
    group = np.arange(DOCUMENTS) % 4
    found = groups_test(rates_of(table), group)
    for item in np.flatnonzero(table.any(axis=1)):
        expected = stats.kruskal(*(table[item, group == one] for one in range(4)))
        assert found.h[item] == pytest.approx(expected.statistic)
        assert found.log_p[item] == pytest.approx(np.log(expected.pvalue))


def test_slope_over_time_is_that_of_statsmodels(table: np.ndarray) -> None:
    import statsmodels.api as sm

    times = np.random.default_rng(2).integers(1800, 1900, size=DOCUMENTS).astype(float)
    found = trend_test(rates_of(table), times)
    for item in np.flatnonzero((table > 0).sum(axis=1) > 2):
        fitted = sm.OLS(table[item], sm.add_constant(times)).fit(cov_type="HC3", use_t=True)
        assert found.slope[item] == pytest.approx(fitted.params[1])
        assert found.slope_t[item] == pytest.approx(fitted.tvalues[1])


def test_a_trend_over_two_moments_is_the_rank_sum_test(table: np.ndarray) -> None:
    labels = np.arange(DOCUMENTS) % 3 == 0
    two, trend = document_test(rates_of(table), labels), trend_test(rates_of(table), labels.astype(float))
    assert trend.rank_z == pytest.approx(two.rank_z)


def test_the_curve_comes_close_to_all_exchanges() -> None:
    """14 documents, 4 of them this: all 1001 exchanges; in the tails the curve promises at most a third too much."""
    table = table_of(3, 14)
    labels = np.arange(14) < 4
    ranks = stats.rankdata(table, axis=1)
    sums = np.stack([ranks[:, list(chosen)].sum(axis=1) for chosen in combinations(range(14), 4)])
    actual = ranks[:, labels].sum(axis=1)
    upper, lower = (sums >= actual - 1e-9).mean(axis=0), (sums <= actual + 1e-9).mean(axis=0)
    exact = np.minimum(2 * np.minimum(upper, lower), 1)
    curve = np.exp(document_test(rates_of(table), labels).log_p)
    low = exact <= 0.1
    assert low.sum() >= 3
    assert (curve[low] >= exact[low] * 2 / 3).all()


def test_one_document_proves_nothing() -> None:
    table = np.zeros((1, 40))
    table[0, 0] = 500.0
    found = document_test(rates_of(table), np.arange(40) < 20)
    assert np.exp(found.log_p[0]) > 0.3


def test_length_is_no_difference() -> None:
    """The same rate in documents of 100 and of 2000 words: ranks alone find "more documents", both tests do not."""
    random = np.random.default_rng(5)
    sizes = np.repeat([2000, 100], 100)
    table = random.poisson(np.full((50, 200), 0.003) * sizes) / sizes
    labels = np.arange(200) < 100
    found = document_test(rates_of(table), labels)
    assert np.median(2 * stats.norm.sf(np.abs(found.rank_z))) < 1e-6
    assert (np.exp(found.log_p) > 0.01 / 50).all()


def test_too_few_documents_are_no_test(table: np.ndarray) -> None:
    assert np.isnan(document_test(rates_of(table), np.arange(DOCUMENTS) < 1).log_p).all()
    assert np.isnan(trend_test(rates_of(table[:, :3]), np.arange(3.0)).log_p).all()
    assert np.isnan(trend_test(rates_of(table), np.ones(DOCUMENTS)).log_p).all()


def test_adjusted_p_values_count_exchanges() -> None:
    table = np.zeros((2, 12))
    table[0, :6] = np.arange(1, 7)
    table[1, ::2] = 1.0
    labels = np.arange(12) < 6
    adjusted = permuted_p(rates_of(table), labels, 999, seed=4)
    # 2 of the 924 exchanges part the first item as well as the labels do.
    assert adjusted[0] == pytest.approx(2 / 924, abs=0.004)
    assert adjusted[1] > 0.5
    assert (permuted_p(rates_of(table), labels, 999, seed=4) == adjusted).all()
    with pytest.raises(UsageError, match="at least 19"):
        permuted_p(rates_of(table), labels, 10)


@pytest.mark.parametrize("n_this", [20, 5])
def test_false_alarms_are_rare_in_random_texts(n_this: int) -> None:
    """At q 0.05 anything at all is found in at most 7 % of runs (the project's own bound), here 60 of bursty words."""
    from colloc.measures.discoveries import log_q_values

    alarms = 0
    for seed in range(60):
        labels = np.random.default_rng(seed).permutation(DOCUMENTS) < n_this
        log_q = log_q_values(document_test(rates_of(table_of(100 + seed, items=400)), labels).log_p)
        alarms += bool(np.nanmin(log_q) <= np.log(0.05))
    assert alarms <= 4
