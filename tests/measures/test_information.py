"""The identities of information theory, on published tables and on tables at random."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from sklearn.metrics import mutual_info_score

from colloc.measures.likelihood import g2
from colloc.measures.multivariate import co_information, entropy, total_correlation
from colloc.measures.pmi import mutual_information, npmi, pmi, surprisal

from .rounding import rounds_to

# Cover & Thomas, Elements of Information Theory, example 2.2.1, times 32: rows y, columns x.
COVER_THOMAS = np.array([[4, 2, 1, 1], [2, 4, 1, 1], [2, 2, 2, 2], [8, 0, 0, 0]])

matrices = arrays(np.int64, st.tuples(st.integers(2, 5), st.integers(2, 5)), elements=st.integers(0, 40)).filter(
    lambda table: (table.sum(axis=0) > 0).all() and (table.sum(axis=1) > 0).all()
)
counts = st.tuples(*[st.integers(1, 10**6)] + [st.integers(0, 10**6)] * 3).map(
    lambda cells: (cells[0], cells[0] + cells[1], cells[0] + cells[2], sum(cells))
)


def margins(table: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.int64]:
    return table, table.sum(axis=1)[:, np.newaxis], table.sum(axis=0), table.sum()


def test_cover_thomas() -> None:
    assert entropy(COVER_THOMAS.sum(axis=0)) == pytest.approx(7 / 4)
    assert entropy(COVER_THOMAS.sum(axis=1)) == pytest.approx(2)
    assert entropy(COVER_THOMAS) == pytest.approx(27 / 8)
    assert mutual_information(*margins(COVER_THOMAS)) == pytest.approx(3 / 8)
    inf = np.inf
    np.testing.assert_allclose(
        pmi(*margins(COVER_THOMAS)), [[0, 0, 0, 0], [-1, 1, 0, 0], [-1, 0, 1, 1], [1, -inf, -inf, -inf]], atol=1e-15
    )
    np.testing.assert_allclose(
        npmi(*margins(COVER_THOMAS)),
        [[0, 0, 0, 0], [-1 / 4, 1 / 3, 0, 0], [-1 / 4, 0, 1 / 4, 1 / 4], [1 / 2, -1, -1, -1]],
        atol=1e-15,
    )


def test_joint_table_of_an_exercise() -> None:
    # p = [[.18, .16], [.02, .64]]; entropies recomputed independently.
    table = np.array([[18, 16], [2, 64]])
    assert rounds_to(float(entropy(table)), "1.3933")
    assert rounds_to(float(entropy(table.sum(axis=0))), "0.7219")
    assert rounds_to(float(entropy(table.sum(axis=1))), "0.9248")
    assert rounds_to(float(mutual_information(*margins(table))), "0.2535")


@given(table=matrices)
def test_mean_pmi_is_the_mutual_information(table: np.ndarray) -> None:
    mean = float(mutual_information(*margins(table)))
    reference = mutual_info_score(None, None, contingency=table) / np.log(2)
    assert mean == pytest.approx(reference, abs=1e-12)
    assert mean >= -1e-12
    # Other routes to the same number: entropies (Cover & Thomas, equation 2.45).
    assert float(total_correlation(table)) == pytest.approx(mean, abs=1e-12)
    assert float(co_information(table)) == pytest.approx(mean, abs=1e-12)


@given(table=matrices)
def test_symmetric_counting_keeps_the_identity(table: np.ndarray) -> None:
    square = np.zeros((max(table.shape),) * 2, dtype=np.int64)
    square[: table.shape[0], : table.shape[1]] = table
    both = square + square.T
    both = both[np.ix_(both.sum(axis=1) > 0, both.sum(axis=1) > 0)]
    mean = float(mutual_information(*margins(both)))
    assert mean == pytest.approx(mutual_info_score(None, None, contingency=both) / np.log(2), abs=1e-12)
    assert mean >= -1e-12


@given(counts=counts)
def test_pmi_is_surprisal_before_less_surprisal_after(counts: tuple[int, int, int, int]) -> None:
    joint, first, second, total = counts
    value = float(pmi(*counts))
    assert value == pytest.approx(float(surprisal(second, total) - surprisal(joint, first)), abs=1e-10)
    assert value == pytest.approx(float(surprisal(first, total) - surprisal(joint, second)), abs=1e-10)
    assert value == pytest.approx(
        float(surprisal(first, total) + surprisal(second, total) - surprisal(joint, total)), abs=1e-10
    )
    assert value <= float(min(surprisal(first, total), surprisal(second, total))) + 1e-12


@given(counts=counts)
def test_npmi_keeps_its_bounds_and_g2_its_sign(counts: tuple[int, int, int, int]) -> None:
    joint, first, second, total = counts
    assert -1 <= float(npmi(*counts)) <= 1
    difference = joint * total - first * second
    assert np.sign(g2(*counts)) == np.sign(difference)


@given(counts=counts, scale=st.integers(2, 1000))
def test_more_of_the_same_text(counts: tuple[int, int, int, int], scale: int) -> None:
    larger = tuple(scale * number for number in counts)
    assert float(pmi(*larger)) == pytest.approx(float(pmi(*counts)), abs=1e-10)
    assert float(npmi(*larger)) == pytest.approx(float(npmi(*counts)), abs=1e-10)
    assert float(g2(*larger)) == pytest.approx(scale * float(g2(*counts)), rel=1e-9, abs=1e-6)


def test_surprisal_ends() -> None:
    np.testing.assert_array_equal(surprisal([0, 1, 8, 0], [8, 8, 8, 0]), [np.inf, 3, 0, np.nan])
    assert entropy([0, 0]) == 0
    assert entropy([5]) == 0


def test_plug_in_information_is_mostly_bias() -> None:
    # Miller 1955: independent words still have a plug-in value of about (r-1)(c-1) / (2 N ln 2) bits.
    generator = np.random.default_rng(11)
    tables = [np.bincount(generator.integers(0, 20, 500), minlength=20).reshape(4, 5) for _ in range(2000)]
    mean = np.mean([mutual_information(*margins(table)) for table in tables])
    assert mean * np.log(2) == pytest.approx(12 / 1000, rel=0.05)
