"""Rates by period against sums written out, information against scikit-learn, known rates against scipy."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from sklearn.metrics import mutual_info_score

from colloc.measures.subcorpora.information import presence_information
from colloc.measures.subcorpora.periods import period_rates
from colloc.measures.subcorpora.reference import g2_to_rate, log_ratio_to_rate, rate_test_log_p


@pytest.fixture(scope="module")
def counted() -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    random = np.random.default_rng(8)
    sizes = random.integers(100, 1000, size=30)
    return random.poisson(0.004 * sizes, size=(5, 30)), sizes, np.arange(30) % 4


def test_rates_and_their_variance(counted: tuple[np.ndarray, np.ndarray, np.ndarray]) -> None:
    counts, sizes, period = counted
    items, documents = np.nonzero(counts)
    found = period_rates(items, documents, counts[items, documents], sizes, period, 5, 4)
    for item in range(5):
        for place in range(4):
            here = period == place
            count, tokens, n = counts[item, here].sum(), sizes[here].sum(), here.sum()
            assert found.count[item, place] == count
            assert found.held[item, place] == (counts[item, here] > 0).sum()
            assert found.rate[item, place] == pytest.approx(count / tokens)
            residuals = counts[item, here] - count / tokens * sizes[here]
            relative = n / (n - 1) * (residuals**2).sum() / count**2
            variance = max(relative, 1 / (count + 0.5))
            assert found.log2_variance[item, place] == pytest.approx(variance / np.log(2) ** 2)
            assert found.low[item, place] == pytest.approx(count / tokens / np.exp(1.959964 * variance**0.5))


def test_nothing_seen_has_the_exact_poisson_bound() -> None:
    none = np.empty(0, np.int64)
    found = period_rates(none, none, none, np.array([500, 500]), np.array([0, 0]), 1, 1)
    # exact Poisson: chi2.ppf(0.975, 2) / 2
    assert found.high[0, 0] == pytest.approx(stats.chi2.ppf(0.95, 2) / 2 / 1000 * np.log(0.025) / np.log(0.05))
    assert found.low[0, 0] == 0


def test_a_single_document_bears_no_interval() -> None:
    one = np.zeros(1, np.int64)
    found = period_rates(one, one, np.array([3]), np.array([100]), np.array([0]), 1, 1)
    assert np.isinf(found.log2_variance[0, 0])


def test_information_of_word_and_slice() -> None:
    counts = np.array([[10, 0, 5], [3, 3, 3], [90, 95, 92]])
    totals = np.array([103, 98, 100])
    found = presence_information(counts, totals)
    for row in counts:
        table = np.stack([row, totals - row])
        nats = mutual_info_score(None, None, contingency=table)
        assert found.bits[list(map(tuple, counts)).index(tuple(row))] == pytest.approx(nats / np.log(2))
        g2 = stats.chi2_contingency(table, lambda_="log-likelihood", correction=False)
        place = list(map(tuple, counts)).index(tuple(row))
        assert found.g2[place] == pytest.approx(g2.statistic)
        assert found.log_p[place] == pytest.approx(np.log(g2.pvalue))


def test_a_known_rate() -> None:
    counts, total, rate = np.array([30, 10, 0]), 1000, 0.02
    g2 = g2_to_rate(counts, total, rate)
    for count, found in zip(counts[:2], g2, strict=False):
        expected = [total * rate, total * (1 - rate)]
        power = stats.power_divergence([count, total - count], expected, lambda_="log-likelihood")
        assert abs(found) == pytest.approx(power.statistic)
    assert g2[0] > 0 > g2[1]
    value, interval = log_ratio_to_rate(counts, total, rate)
    assert value[:2] == pytest.approx(np.log2([1.5, 0.5]))
    assert interval.se[0] == pytest.approx(np.sqrt(1 / 30 - 1 / 1000) / np.log(2))
    assert np.isfinite(value[2])


def test_the_mean_of_documents_against_a_rate() -> None:
    sample = np.random.default_rng(1).gamma(2, 1, size=25)
    expected = stats.ttest_1samp(sample, 2.5)
    found = rate_test_log_p([sample.mean()], [sample.var(ddof=1)], [25], [2.5])
    assert found[0] == pytest.approx(np.log(expected.pvalue))
    assert np.isnan(rate_test_log_p([1.0], [0.0], [5], [2.0])[0])
