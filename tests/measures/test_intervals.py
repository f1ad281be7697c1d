"""Intervals: the published ones, simulation of their coverage, and the jackknife against its definition."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from colloc.errors import UsageError
from colloc.measures.intervals import (
    jackknife,
    jackknife_difference,
    log_odds_interval,
    normal_quantile,
    pmi_interval,
    pmi_variance,
)
from colloc.measures.pmi import pmi

from .rounding import rounds_to


def test_agresti_aspirin() -> None:
    # Agresti, Categorical Data Analysis: ln odds ratio of (189, 10845, 104, 10933) from .365 to .846.
    interval = log_odds_interval(189, 189 + 10_845, 189 + 104, 189 + 10_845 + 104 + 10_933)
    assert rounds_to(float(interval.low), "0.365")
    assert rounds_to(float(interval.high), "0.846")
    assert rounds_to(float(np.exp(interval.low)), "1.44")
    assert rounds_to(float(np.exp(interval.high)), "2.33")


def test_odds_interval_of_the_swiss() -> None:
    # Cells: Dunning 1993, Table 2; the interval recomputed with a general statistics library: 9.0472 to 15.4290.
    interval = log_odds_interval(110, 2552, 221, 31_777)
    assert rounds_to(float(np.exp(interval.low)), "9.0472")
    assert rounds_to(float(np.exp(interval.high)), "15.4290")


def test_quantiles() -> None:
    assert normal_quantile(0.95) == pytest.approx(stats.norm.ppf(0.975), rel=1e-14)
    assert normal_quantile(0.99) == pytest.approx(stats.norm.ppf(0.995), rel=1e-14)
    for wrong in (0, 1, 95):
        with pytest.raises(UsageError, match=f"confidence must be between 0 and 1, such as 0.95, not {wrong}"):
            normal_quantile(wrong)


def test_pmi_variance_is_the_delta_method() -> None:
    # Gradient of PMI by the four cells, by differences, and the multinomial covariance (Agresti 2013, 16.1).
    cells = np.array([110.0, 442.0, 111.0, 9114.0])
    total = cells.sum()

    def value(table: np.ndarray) -> float:
        a, b, c, d = table
        return float(pmi(a, a + b, a + c, a + b + c + d))

    step = 1e-3 * cells
    gradient = np.array([(value(cells + e) - value(cells - e)) / (2 * e.sum()) for e in np.diag(step)])
    covariance = np.diag(cells) - np.outer(cells, cells) / total
    assert float(pmi_variance(110, 552, 221, total)) == pytest.approx(gradient @ covariance @ gradient, rel=1e-5)


def test_pmi_interval_covers_on_independent_observations() -> None:
    generator = np.random.default_rng(8)
    p = np.array([0.01, 0.04, 0.05, 0.9])
    a, b, c, _ = generator.multinomial(5_000, p, size=20_000).T
    interval = pmi_interval(a, a + b, a + c, 5_000)
    true = np.log2(0.01 / (0.05 * 0.06))
    assert np.mean((interval.low <= true) & (true <= interval.high)) == pytest.approx(0.95, abs=0.01)


def test_pmi_interval_ends() -> None:
    never = pmi_interval(0, 10, 20, 1000)
    assert (never.low, never.high) == (-np.inf, np.inf)
    everywhere = pmi_interval(10, 10, 10, 10)
    assert (everywhere.low, everywhere.high) == (0, 0)
    wide, narrow = (pmi_interval(7, 10, 20, 1000, confidence=level) for level in (0.99, 0.9))
    assert wide.low < narrow.low < narrow.high < wide.high


def test_jackknife_of_a_mean_is_the_textbook_interval() -> None:
    # For a mean the jackknife is exactly mean -/+ t s / sqrt(g) (Efron 1982, section 3.1).
    values = np.random.default_rng(2).normal(size=(20, 3))
    without = np.array([np.delete(values, group, axis=0).mean(axis=0) for group in range(20)])
    interval = jackknife(values.mean(axis=0), without)
    for column in range(3):
        sample = values[:, column]
        low, high = stats.t.interval(0.95, 19, loc=sample.mean(), scale=stats.sem(sample))
        assert interval.low[column] == pytest.approx(low, rel=1e-10)
        assert interval.high[column] == pytest.approx(high, rel=1e-10)


def test_jackknife_covers_where_words_cluster() -> None:
    # Bursty words: each document has its own rate (gamma, shape 0.3). The asymptotic interval fails; the jackknife
    # over documents keeps its promise to within a few points.
    generator = np.random.default_rng(4)
    runs, documents, tokens = 400, 200, 300
    rate = generator.gamma(0.3, 1 / 0.3, size=(runs, documents))
    first = generator.poisson(3 * rate)
    second = generator.poisson(4 * rate)
    joint = generator.binomial(np.minimum(first, second), 0.5)
    counts = np.stack([joint, first, second, np.full_like(joint, tokens)]).astype(float)
    groups = counts.reshape(4, runs, 20, documents // 20).sum(axis=3)
    everything = groups.sum(axis=2)
    without = np.moveaxis(everything[:, :, np.newaxis] - groups, 2, 1)
    estimate = pmi(*everything)
    interval = jackknife(estimate, pmi(*without))
    mean_joint = 0.5 * np.minimum(first, second).mean()
    true = np.log2(mean_joint * tokens / (3 * 4))
    covered = np.mean((interval.low <= true) & (true <= interval.high))
    naive = pmi_interval(*everything)
    assert 0.9 <= covered <= 0.98
    assert np.mean((naive.low <= true) & (true <= naive.high)) < 0.85


def test_jackknife_is_unbounded_where_a_group_carries_everything() -> None:
    replicates = np.ones((20, 2))
    replicates[3, 1] = -np.inf
    interval = jackknife([1.0, 1.0], replicates)
    assert interval.low[0] == interval.high[0] == 1
    assert (interval.low[1], interval.high[1], interval.se[1]) == (-np.inf, np.inf, np.inf)
    assert jackknife_difference(interval, interval).tolist() == [0, np.inf]


def test_jackknife_needs_groups() -> None:
    with pytest.raises(UsageError, match="at least 2 groups, not 1"):
        jackknife(1.0, [1.0])
