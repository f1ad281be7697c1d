"""Average precision against scikit-learn, the bootstrap against resampling row by row."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from sklearn.metrics import average_precision_score, precision_recall_curve

from colloc.measures.retrieval import (
    average_precision,
    best_threshold,
    bootstrap_average_precision,
    percentile_interval,
    precision_recall_at,
    steps,
)

ROWS = st.lists(st.tuples(st.booleans(), st.integers(-3, 3)), min_size=1, max_size=40)


@given(ROWS.filter(lambda rows: any(wanted for wanted, _ in rows)))
def test_average_precision_and_curve_are_those_of_a_reference_library(rows: list[tuple[bool, int]]) -> None:
    wanted, scores = (np.array(column) for column in zip(*rows, strict=True))
    ranking = steps(wanted, scores)
    assert average_precision(ranking) == pytest.approx(average_precision_score(wanted, scores), rel=1e-12)
    precision, recall, thresholds = precision_recall_curve(wanted, scores)
    np.testing.assert_allclose(ranking.precision[::-1], precision[:-1])
    np.testing.assert_allclose(ranking.recall[::-1], recall[:-1])
    np.testing.assert_allclose(ranking.scores[::-1], thresholds)
    with np.errstate(invalid="ignore"):
        f1 = np.nan_to_num(2 * precision * recall / (precision + recall))
    assert best_threshold(ranking).f1 == pytest.approx(f1.max())


def test_precision_and_recall_by_hand() -> None:
    # Wanted at places 1, 3 and 4 of five: precision at 3 is 2/3, recall 2/3.
    ranking = steps([True, False, True, True, False], [5.0, 4.0, 3.0, 2.0, 1.0])
    assert precision_recall_at(ranking, 3) == pytest.approx((2 / 3, 2 / 3))
    assert precision_recall_at(ranking, 100) == pytest.approx((3 / 5, 1.0))
    # A step of four rows with two wanted, cut after one: half a wanted row on average.
    tied = steps([True, False, True, False], [1.0] * 4)
    assert precision_recall_at(tied, 1) == pytest.approx((0.5, 0.25))


def test_what_is_no_number_ranks_last() -> None:
    assert steps([True, False], [float("nan"), -1e300]).wanted.tolist() == [0, 1]


def test_nothing_wanted() -> None:
    ranking = steps([False, False], [1.0, 2.0])
    assert np.isnan(average_precision(ranking))
    assert np.isnan(bootstrap_average_precision(ranking, 5, np.random.default_rng(0))).all()
    assert np.isnan(percentile_interval([])).all()


def test_bootstrap_is_drawing_rows_with_replacement() -> None:
    generator = np.random.default_rng(3)
    scores = np.round(generator.normal(size=120), 1)  # with ties
    wanted = generator.random(120) < 1 / (1 + np.exp(2 - scores))
    fast = bootstrap_average_precision(steps(wanted, scores), 4000, np.random.default_rng(1))
    plain = []
    for _ in range(4000):
        rows = generator.integers(0, 120, 120)
        plain.append(average_precision(steps(wanted[rows], scores[rows])))
    # Two samples of 4,000: means differ by a few standard errors at most, and so do the ends of the intervals.
    spread = np.std(plain)
    assert abs(fast.mean() - np.mean(plain)) < 5 * spread * np.sqrt(2 / 4000)
    np.testing.assert_allclose(percentile_interval(fast), percentile_interval(plain), atol=0.15 * spread)
