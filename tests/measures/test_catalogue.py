"""One body of tests over every entry of the catalogue."""

from __future__ import annotations

import dataclasses
import subprocess
import sys

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from colloc.errors import UsageError
from colloc.measures.catalogue import MEASURES, Measure, compute_all, find
from colloc.measures.contingency import BLOCK_ROWS

from .oracle import ORACLE, Counts, cells, value

every = pytest.mark.parametrize("measure", MEASURES.values(), ids=MEASURES.keys())


def counts_of(a: int, b: int, c: int, d: int) -> Counts:
    return a, a + b, a + c, a + b + c + d


cell = st.integers(0, 60)
tables = st.builds(counts_of, cell, cell, cell, cell).filter(lambda n: 0 < n[1] < n[3] and 0 < n[2] < n[3])


def test_names_are_those_of_the_oracle() -> None:
    assert list(MEASURES) == list(ORACLE)
    assert all(name == measure.name for name, measure in MEASURES.items())


@every
def test_every_field_is_filled(measure: Measure) -> None:
    for field in dataclasses.fields(measure):
        content = getattr(measure, field.name)
        assert not isinstance(content, str) or content.strip(" .")
    assert measure.function.__doc__


@every
@settings(max_examples=25)
@given(counts=tables)
@example(counts=(0, 5, 7, 100))
@example(counts=(3, 3, 3, 31777))
@example(counts=(1, 1, 31776, 31777))
@example(counts=(5, 10, 10, 20))
def test_agrees_with_decimal_arithmetic(measure: Measure, counts: Counts) -> None:
    # Rounding: a dozen float64 operations; differences near zero are judged absolutely.
    assert float(measure.compute(*counts)) == pytest.approx(value(measure.name, counts), rel=1e-11, abs=1e-12)


LARGE = [
    (2**40, 2**41, 2**42, 2**45),
    (2**40 + 12345, 2**42 + 1, 2**43 + 7, 2**45 + 3),
    (1, 2**40, 2**40, 2**44),
    (0, 2**40, 2**40, 2**44),
    (2**38, 2**41, 2**42, 2**45),
    (2**40, 2**40, 2**40, 2**44),
]


@pytest.mark.parametrize("counts", LARGE)
@pytest.mark.parametrize("name", [name for name in MEASURES if not name.startswith("fisher")])
def test_counts_beyond_two_to_the_forty(name: str, counts: Counts) -> None:
    # Products of these margins pass 2**63, where integers would wrap around. The oracle for Fisher's test adds up
    # binomials and cannot go so far: test_exact.py has large counts for it.
    got = float(MEASURES[name].compute(*(np.int64(number) for number in counts)))
    assert got == pytest.approx(value(name, counts), rel=1e-9, abs=1e-12)


@every
@settings(max_examples=25)
@given(counts=tables)
def test_exchanging_the_words(measure: Measure, counts: Counts) -> None:
    joint, first, second, total = counts
    one = float(measure.compute(joint, first, second, total))
    other = float(measure.compute(joint, second, first, total))
    if measure.symmetric:
        assert one == pytest.approx(other, rel=1e-12, abs=1e-13)
    else:
        swapped = measure.name.replace("second", "x").replace("first", "second").replace("x", "first")
        assert other == pytest.approx(float(MEASURES[swapped].compute(*counts)), rel=1e-12, abs=1e-13)


@every
def test_takes_whole_columns_and_lets_no_warning_out(measure: Measure) -> None:
    # Warnings are errors in this suite. Every table of small cells, the empty one included, over several blocks.
    small = np.arange(5)
    a, b, c, d = (grid.reshape(-1) for grid in np.meshgrid(small, small, small, small))
    repeats = BLOCK_ROWS // a.size + 2
    columns = [np.tile(column, repeats) for column in (a, a + b, a + c, a + b + c + d)]
    result = measure.compute(*columns)
    assert result.dtype == np.float64
    assert result.shape == columns[0].shape
    np.testing.assert_array_equal(result[: a.size], result[-a.size :])
    for row in (7, 100, 333, 624):
        np.testing.assert_array_equal(result[row], measure.compute(*(int(column[row]) for column in columns)))


@every
def test_broadcasts(measure: Measure) -> None:
    joint, first = np.array([[1, 2, 3]]), np.array([[10], [20]])
    result = measure.compute(joint, first, 30, 1000)
    assert result.shape == (2, 3)
    assert result[1, 2] == pytest.approx(float(measure.compute(3, 20, 30, 1000)), rel=1e-14)
    assert measure.compute([], [], [], 10).shape == (0,)
    assert measure.compute(1, 10, 30, 1000).shape == ()


@every
def test_leaves_its_arguments_alone(measure: Measure) -> None:
    columns = [np.array(column, dtype=np.float64) for column in ([1, 0, 5], [10, 8, 5], [30, 9, 5], [100, 100, 100])]
    before = [column.copy() for column in columns]
    compute_all([measure.name, *MEASURES], *columns)
    for column, copy in zip(columns, before, strict=True):
        np.testing.assert_array_equal(column, copy)


def test_limits_at_zero_cells() -> None:
    # The table "Limits at zero cells" of docs/measures.md, row by row.
    never = compute_all(list(MEASURES), 0, 10, 20, 1000)
    assert [never[name] for name in ("pmi", "pmi2", "pmi3", "t")] == [-np.inf] * 4
    assert never["npmi"] == -1
    assert [never[name] for name in ("ppmi", "mi_share", "dice", "jaccard", "min_sensitivity")] == [0] * 5
    assert never["z"] == pytest.approx(-np.sqrt(0.2))
    apart = compute_all(list(MEASURES), 7, 7, 7, 1000)
    assert [apart[name] for name in ("npmi", "dice", "jaccard", "min_sensitivity")] == [1] * 4
    assert apart["pmi2"] == pytest.approx(0, abs=1e-14)
    absent = compute_all(list(MEASURES), 0, 0, 20, 1000)
    assert np.isnan([absent[name] for name in ("pmi", "npmi", "ppmi", "pmi2", "pmi3", "mi_share", "t", "z")]).all()
    assert np.isnan(absent["p_second_given_first"])
    assert np.isnan(absent["delta_p_second_given_first"])
    assert np.isfinite(absent["log_odds"])
    always = compute_all(list(MEASURES), 20, 1000, 20, 1000)
    for table in (absent, always):
        assert [table[name] for name in ("g2", "chi2", "g2_log10_p", "chi2_log10_p", "fisher_log10_p")] == [0] * 5
        assert [table[name] for name in ("g2_p", "chi2_p", "fisher_p")] == [1] * 3
    assert np.isnan(always["delta_p_second_given_first"])


def test_computing_all_is_computing_each() -> None:
    generator = np.random.default_rng(3)
    a, b, c, d = generator.integers(0, 50, (4, 1000))
    columns = (a, a + b, a + c, a + b + c + d)
    together = compute_all(list(MEASURES), *columns)
    assert list(together) == list(MEASURES)
    for name, measure in MEASURES.items():
        np.testing.assert_array_equal(together[name], measure.compute(*columns))


def test_cells_are_those_of_the_oracle() -> None:
    assert cells((110, 2552, 221, 31777)) == (110, 2442, 111, 29114)


def test_unknown_name_lists_the_known() -> None:
    with pytest.raises(UsageError, match=r"unknown measure 'PMI'; there are pmi, npmi, .*p_first_given_second$"):
        find("PMI")


def test_wrong_arguments_are_refused() -> None:
    with pytest.raises(UsageError, match=r"must broadcast together, not \(2,\), \(3,\), \(\), \(\)"):
        find("pmi").compute([1, 2], [1, 2, 3], 4, 5)
    with pytest.raises(UsageError, match="whole numbers or floats, not <U1"):
        find("pmi").compute(["1"], 2, 3, 4)


def test_only_the_pmi_family_does_without_a_real_table() -> None:
    assert [name for name, measure in MEASURES.items() if not measure.needs_cells] == [
        "pmi",
        "npmi",
        "ppmi",
        "pmi2",
        "pmi3",
    ]


@every
def test_the_strongest_end_is_where_association_grows(measure: Measure) -> None:
    # More joint occurrences between the same margins: attraction grows, and so must the value, or fall.
    weaker, stronger = (float(measure.compute(joint, 300, 400, 10_000)) for joint in (40, 120))
    if measure.name == "log_odds_se":
        assert measure.strongest == "lowest", "the surest first"
    else:
        assert (stronger > weaker) == (measure.strongest == "highest")


def test_the_catalogue_loads_no_scipy() -> None:
    code = "import sys, colloc.measures.catalogue as c; c.find('g2').compute(1, 2, 3, 9); print('scipy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout == "False\n"
