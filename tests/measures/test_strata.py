"""Strata: the worked example of Agresti, statsmodels on random strata, and limits."""

from __future__ import annotations

import numpy as np
import pytest
from statsmodels.stats.contingency_tables import StratifiedTable

from colloc.measures.contingency import expected
from colloc.measures.contrast import difference
from colloc.measures.odds import log_odds, log_odds_se
from colloc.measures.strata import breslow_day, mantel_haenszel, mantel_haenszel_test, tells_nothing, woolf

from .rounding import rounds_to

# Liu 1992, smoking and lung cancer in eight Chinese cities, as in Agresti, Categorical Data Analysis, section 6.
CITIES = np.array(
    [
        [126, 100, 35, 61],
        [908, 688, 497, 807],
        [913, 747, 336, 598],
        [235, 172, 58, 121],
        [402, 308, 121, 215],
        [182, 156, 72, 98],
        [60, 99, 11, 43],
        [104, 89, 21, 36],
    ]
)


def four(cells: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    a, b, c, d = np.moveaxis(cells, -1, 0)
    return a, a + b, a + c, a + b + c + d


def test_agresti_cities() -> None:
    pooled = mantel_haenszel(*four(CITIES))
    assert rounds_to(float(np.exp(pooled.log_odds)), "2.17")
    assert rounds_to(float(np.exp(pooled.interval.low)), "1.98")
    assert rounds_to(float(np.exp(pooled.interval.high)), "2.38")
    assert rounds_to(float(mantel_haenszel_test(*four(CITIES)).statistic), "280.1")
    assert rounds_to(float(mantel_haenszel_test(*four(CITIES), correction=True).statistic), "279.4")
    same = breslow_day(*four(CITIES), tarone=False)
    assert rounds_to(float(same.statistic), "5.2")
    assert same.df == 7
    assert rounds_to(float(same.p), "0.64")
    # Recomputed with general statistics libraries.
    weighted, homogeneity = woolf(*four(CITIES))
    assert rounds_to(float(np.exp(weighted.log_odds)), "2.173")
    assert rounds_to(float(homogeneity.statistic), "5.187")
    assert rounds_to(float(homogeneity.p), "0.637")


def test_many_pairs_at_once_agree_with_statsmodels() -> None:
    generator = np.random.default_rng(1)
    cells = generator.integers(1, 40, (30, 5, 4))
    pooled = mantel_haenszel(*four(cells), confidence=0.9)
    independent = mantel_haenszel_test(*four(cells))
    corrected = mantel_haenszel_test(*four(cells), correction=True)
    adjusted, plain = breslow_day(*four(cells)), breslow_day(*four(cells), tarone=False)
    for row, strata in enumerate(cells):
        reference = StratifiedTable([table.reshape(2, 2) for table in strata])
        low, high = reference.logodds_pooled_confint(alpha=0.1)
        got = pooled.log_odds[row], pooled.interval.low[row], pooled.interval.high[row]
        np.testing.assert_allclose(got, (reference.logodds_pooled, low, high), rtol=1e-9, atol=1e-12)
        null = reference.test_null_odds(correction=False)
        assert independent.statistic[row] == pytest.approx(null.statistic, rel=1e-9, abs=1e-12)
        assert independent.p[row] == pytest.approx(null.pvalue, rel=1e-9)
        # The reference lets a correction larger than the difference overshoot; here it stops at 0.
        excess = abs(float(np.sum(strata[:, 0] - expected(*four(strata)))))
        with_correction = reference.test_null_odds(correction=True).statistic if excess > 0.5 else 0.0
        assert corrected.statistic[row] == pytest.approx(with_correction, rel=1e-9, abs=1e-12)
        for mine, adjust in ((adjusted, True), (plain, False)):
            equal = reference.test_equal_odds(adjust=adjust)
            assert mine.statistic[row] == pytest.approx(equal.statistic, rel=1e-7)
            assert mine.p[row] == pytest.approx(equal.pvalue, rel=1e-7)


def test_two_strata_of_woolf_are_the_difference_test() -> None:
    cells = np.array([[20, 30, 10, 90], [9, 40, 12, 50]])
    _, homogeneity = woolf(*four(cells))
    value, se = log_odds(*four(cells)), log_odds_se(*four(cells))
    gap = difference(value[0], se[0], value[1], se[1])
    assert homogeneity.statistic == pytest.approx(float(gap.z) ** 2)
    assert homogeneity.p == pytest.approx(float(np.exp(gap.log_p)))


def test_strata_that_say_nothing_are_left_out() -> None:
    padded = np.concatenate([CITIES, [[0, 0, 5, 9], [0, 4, 0, 9], [0, 0, 0, 0], [3, 0, 4, 0]]])
    assert mantel_haenszel(*four(padded)).log_odds == mantel_haenszel(*four(CITIES)).log_odds
    for test in (mantel_haenszel_test, breslow_day):
        whole, part = test(*four(padded)), test(*four(CITIES))
        assert whole.statistic == pytest.approx(float(part.statistic), rel=1e-12)
        assert whole.df == part.df
    assert woolf(*four(padded))[1].df == 7


def test_limits() -> None:
    never = mantel_haenszel(*four(np.array([[0, 5, 5, 90], [0, 7, 3, 90]])))
    assert (never.log_odds, never.interval.low, never.interval.high) == (-np.inf, -np.inf, np.inf)
    assert np.isnan(breslow_day(*four(np.array([[0, 5, 5, 90], [0, 7, 3, 90]]))).statistic)
    nothing = np.zeros((2, 4))
    assert np.isnan(mantel_haenszel(*four(nothing)).log_odds)
    assert np.isnan(mantel_haenszel_test(*four(nothing)).p)
    assert np.isnan(woolf(*four(CITIES[:1]))[1].p), "one stratum cannot disagree with itself"


def test_woolf_leaves_out_what_only_its_correction_would_tell() -> None:
    """Never met, 0.0008 expected: the value would be that of the 0.5; Breslow-Day and Mantel-Haenszel need none."""
    tiny, rare = [0, 2, 2, 4996], [0, 40, 100, 1860]
    padded = np.concatenate([CITIES, [tiny]])
    assert tells_nothing(*four(np.array([tiny, rare, [1, 1, 1, 4997]]))).tolist() == [True, False, False]
    assert woolf(*four(padded))[1].statistic == pytest.approx(float(woolf(*four(CITIES))[1].statistic), rel=1e-12)
    assert woolf(*four(padded))[1].df == 7
    assert woolf(*four(np.concatenate([CITIES, [rare]])))[1].df == 8
    reference = StratifiedTable([table.reshape(2, 2).astype(float) for table in padded])
    assert breslow_day(*four(padded)).df == 8
    assert mantel_haenszel(*four(padded)).log_odds == pytest.approx(reference.logodds_pooled)
