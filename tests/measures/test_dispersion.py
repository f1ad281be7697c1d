"""Dispersion: worked examples, libraries, and dense brute force against the sparse formulas."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest
from scipy import stats
from scipy.spatial.distance import cityblock

from colloc.errors import UsageError
from colloc.measures.dispersion import Dispersion, dispersion

from .rounding import rounds_to


def spread(table: list[list[int]], sizes: list[int]) -> Dispersion:
    counts = np.array(table)
    words, parts = np.nonzero(counts)
    return dispersion(words, parts, counts[words, parts], sizes, len(table))


def test_gries_toy_corpus() -> None:
    # Gries 2020, Analyzing dispersion (from memory): five parts, the word a.
    result = spread([[1, 2, 3, 4, 5]], [9, 10, 10, 10, 11])
    printed = {
        "dp": "0.18",
        "dp_norm_original": "0.225",
        "dp_norm": "0.2195",
        "juilland_d": "0.785",
        "carroll_d2": "0.938",
        "rosengren_s": "0.950",
        "kl": "0.137",
    }
    for name, text in printed.items():
        assert rounds_to(getattr(result, name)[0], text), name
    assert result.parts[0] == 5
    assert result.frequency[0] == 15
    assert result.largest_share[0] == pytest.approx(1 / 3)
    # The variants on raw counts and on equal parts are those of parts of size one.
    raw = spread([[1, 2, 3, 4, 5]], [1] * 5)
    assert rounds_to(raw.juilland_d[0], "0.764")
    assert rounds_to(raw.carroll_d2[0], "0.926")
    assert rounds_to(raw.rosengren_s[0], "0.937")


def test_lijffijt_gries() -> None:
    # Lijffijt & Gries 2012, Int. J. of Corpus Linguistics 17(1): three equal parts, shares 2/3, 1/3, 0.
    result = spread([[2, 1, 0]], [100, 100, 100])
    assert result.dp[0] == pytest.approx(1 / 3)
    assert result.dp_norm[0] == pytest.approx(1 / 2)


def test_four_equal_parts() -> None:
    # A worked example of four equal parts: .50 .25 .15 .10 gives .25, all in one part gives .75 and 1.
    result = spread([[50, 25, 15, 10], [0, 0, 9, 0]], [1000] * 4)
    np.testing.assert_allclose(result.dp, [0.25, 0.75])
    assert result.dp_norm[1] == pytest.approx(1)


def test_agrees_with_dense_libraries() -> None:
    generator = np.random.default_rng(6)
    counts = generator.poisson(generator.gamma(0.3, 2, size=(40, 25)))
    counts = counts[counts.sum(axis=1) > 0]
    sizes = generator.integers(50, 5000, 25)
    result = spread(counts.tolist(), sizes.tolist())
    s = sizes / sizes.sum()
    for row, v in enumerate(counts):
        share, rates = v / v.sum(), v / sizes
        dp = cityblock(share, s) / 2
        assert result.dp[row] == pytest.approx(dp, abs=1e-12)
        assert result.dp_norm[row] == pytest.approx(dp / (1 - s.min()), abs=1e-12)
        assert result.kl[row] == pytest.approx(stats.entropy(share, s, base=2), abs=1e-12)
        assert result.carroll_d2[row] == pytest.approx(stats.entropy(rates) / np.log(25), abs=1e-12)
        assert result.juilland_d[row] == pytest.approx(1 - stats.variation(rates) / np.sqrt(24), abs=1e-12)
        assert result.rosengren_s[row] == pytest.approx(np.sqrt(s * v).sum() ** 2 / v.sum(), abs=1e-12)
        assert result.parts[row] == np.count_nonzero(v)
        assert result.largest_share[row] == share.max()


def test_perfectly_even_and_absent_words() -> None:
    result = spread([[1, 2, 3], [0, 0, 0]], [10, 20, 30])
    assert result.dp[0] == pytest.approx(0, abs=1e-15)
    assert result.kl[0] == pytest.approx(0, abs=1e-15)
    for name in ("juilland_d", "carroll_d2", "rosengren_s"):
        assert getattr(result, name)[0] == pytest.approx(1)
    for field in dataclasses.fields(result):
        if field.name not in ("frequency", "parts"):
            assert np.isnan(getattr(result, field.name)[1]), field.name
    assert (result.frequency[1], result.parts[1]) == (0, 0)


def test_parts_without_tokens_are_no_parts() -> None:
    plain, padded = spread([[3, 1]], [10, 20]), spread([[3, 0, 1]], [10, 0, 20])
    for field in dataclasses.fields(plain):
        np.testing.assert_array_equal(getattr(plain, field.name), getattr(padded, field.name))


def test_a_single_part_says_nothing_about_spread() -> None:
    result = spread([[4]], [10])
    assert result.dp[0] == 0
    assert np.isnan([result.dp_norm[0], result.dp_norm_original[0], result.juilland_d[0], result.carroll_d2[0]]).all()


def test_nonsense_is_refused() -> None:
    with pytest.raises(UsageError, match="counted in a part that has no tokens"):
        spread([[1, 1]], [10, 0])
    with pytest.raises(UsageError, match="at least one part with tokens"):
        spread([[]], [])
