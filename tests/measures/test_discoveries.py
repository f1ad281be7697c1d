"""q-values: the worked example of Benjamini & Hochberg, two libraries, and their definition by brute force."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats
from statsmodels.stats.multitest import multipletests

from colloc.errors import UsageError
from colloc.measures.discoveries import log_q_values, q_values

# Benjamini & Hochberg 1995, J. Royal Statistical Society B 57, section 4.1 (as general statistics libraries test it).
P = [0.0001, 0.0004, 0.0019, 0.0095, 0.0201, 0.0278, 0.0298, 0.0344, 0.0459, 0.3240, 0.4262, 0.5719, 0.6528, 0.7590, 1]
Q = [0.0015, 0.003, 0.0095, 0.035625, 0.0603, 0.063857, 0.063857, 0.0645, 0.0765, 0.486, 0.581182, 0.714875]
Q += [0.753231, 0.813214, 1]

probabilities = st.lists(st.floats(0, 1), min_size=1, max_size=30)


def test_benjamini_hochberg_example() -> None:
    np.testing.assert_allclose(q_values(P), Q, atol=5e-7)
    assert np.count_nonzero(q_values(P) <= 0.05) == 4
    shuffled = np.random.default_rng(0).permutation(15)
    np.testing.assert_allclose(q_values(np.array(P)[shuffled]), np.array(Q)[shuffled], atol=5e-7)


@given(p=probabilities)
def test_agrees_with_libraries(p: list[float]) -> None:
    np.testing.assert_allclose(q_values(p), stats.false_discovery_control(p), rtol=1e-9, atol=1e-300)
    np.testing.assert_allclose(q_values(p), multipletests(p, method="fdr_bh")[1], rtol=1e-9, atol=1e-300)


@given(p=probabilities, unseen=st.integers(0, 200))
def test_more_hypotheses_than_p_values(p: list[float], unseen: int) -> None:
    # Leaving p-values of 1 out, and only saying how many there were, changes nothing.
    complete = stats.false_discovery_control([*p, *[1.0] * unseen])[: len(p)]
    np.testing.assert_allclose(q_values(p, len(p) + unseen), complete, rtol=1e-9, atol=1e-300)


def test_tiny_p_values() -> None:
    log_p = np.array([-5000.0, -2000.0, -1.0])
    np.testing.assert_allclose(log_q_values(log_p, 10**9), [np.log(1e9) - 5000, np.log(1e9 / 2) - 2000, 0], rtol=1e-14)


def test_keeps_its_promise() -> None:
    # 1,000 hypotheses, 100 of them false; the share of false discoveries stays below 0.05 on average.
    generator = np.random.default_rng(9)
    shares = []
    for _ in range(200):
        z = generator.normal(size=1000)
        z[:100] += 4
        found = q_values(2 * stats.norm.sf(np.abs(z))) <= 0.05
        shares.append(found[100:].sum() / max(found.sum(), 1))
    assert np.mean(shares) <= 0.05
    assert np.mean(shares) >= 0.03


def test_what_was_not_tested_stays_out() -> None:
    np.testing.assert_allclose(q_values([0.01, np.nan, 0.04]), [0.02, np.nan, 0.04])
    assert q_values([]).shape == (0,)
    assert np.isnan(q_values([np.nan])).all()


def test_nonsense_is_refused() -> None:
    with pytest.raises(UsageError, match="at least the number of p-values, 3, not 2"):
        q_values([0.1, 0.2, 0.3], 2)
    with pytest.raises(UsageError, match=r"at most 1, not 1\.2"):
        q_values([0.1, 1.2])
