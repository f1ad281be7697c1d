"""Loops of counting: compiled code does what the same lines do as plain Python, and what numpy does.

What the loops are to count is checked against plain counts in ``tests/counts``; here, that compiling changes nothing
(wrapping integers, signs of indexes) and that full tables and buffers lose nothing.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.counts import accumulating
from colloc.counts.accumulating import Accumulator
from colloc.counts.dense import plan_cells
from colloc.counts.keys import Run, merge
from colloc.counts.windows import add_windows
from colloc.kernels import merging, pairs, switch
from colloc.records import NO_TERM, TokenSpan

SEED = 11


def some_span(seed: int, n: int = 300, n_terms: int = 40) -> TokenSpan:
    rng = np.random.default_rng(seed)
    terms = ((rng.zipf(1.4, n) - 1) % n_terms).astype(np.uint32)
    terms[rng.random(n) < 0.1] = NO_TERM
    units = np.flatnonzero(rng.random(n) < 0.1).astype(np.int64)
    return TokenSpan(terms, units, int(rng.integers(0, 6)), 0)


def by_numpy(span: TokenSpan, left: int, right: int) -> Run:
    switch.use_numpy()
    into = Accumulator(plan_cells(np.bincount(span.terms[span.terms != NO_TERM], minlength=40), 200))
    add_windows(span, left, right, into)
    return into.finish()


@pytest.fixture
def compiled_on() -> Iterator[None]:
    assert switch.prefer_compiled(True)
    yield
    switch.use_numpy()


@pytest.mark.parametrize(("left", "right"), [(0, 5), (3, 0), (2, 4), (0, 1), (7, 7)])
@pytest.mark.parametrize("pending", [16, 64, 4096])
def test_buffers_that_fill_in_the_middle_of_a_span(compiled_on: None, left: int, right: int, pending: int) -> None:
    for seed in range(5):
        span = some_span(SEED + seed)
        wanted = by_numpy(span, left, right)
        assert switch.prefer_compiled(True)
        runs: list[Run] = []
        plan = plan_cells(np.bincount(span.terms[span.terms != NO_TERM], minlength=40), 200)
        into = Accumulator(plan, pending, runs.append)
        assert into.takes_windows(max(left, right))
        add_windows(span, left, right, into)
        into.finish()
        found = merge(runs)
        np.testing.assert_array_equal(found.keys, wanted.keys)
        np.testing.assert_array_equal(found.counts, wanted.counts)


def test_a_table_is_emptied_before_a_cell_can_overflow(compiled_on: None, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(accumulating, "_MOST_IN_CELLS", 2000)
    runs: list[Run] = []
    plan = plan_cells(np.full(40, 10), 10_000)
    into = Accumulator(plan, 4096, runs.append)
    spans = [some_span(seed) for seed in range(6)]
    for span in spans:
        add_windows(span, 0, 5, into)
    into.finish()
    assert len(runs) > 2, "the table was handed on in between"
    wanted = merge([by_numpy(span, 0, 5) for span in spans])
    found = merge(runs)
    np.testing.assert_array_equal(found.keys, wanted.keys)
    np.testing.assert_array_equal(found.counts, wanted.counts)


def test_windows_as_plain_python(compiled_on: None) -> None:
    for seed in range(3):
        span = some_span(seed, 80)
        plan = plan_cells(np.bincount(span.terms[span.terms != NO_TERM], minlength=40), 100)
        results = []
        for loop in (pairs.add_windows, pairs.add_windows.python):
            cells, keys = np.zeros(plan.n_cells, np.int32), np.zeros(900, np.uint64)
            state, rows = np.array([span.context, 0]), np.zeros((80, 3), np.int32)
            loop(span.terms, span.units, span.context, 2, 3, plan.base, plan.stop, plan.twice, rows, cells, keys, state)
            results.append((cells, keys[: state[1]], state))
        for compiled, plain in zip(*results, strict=True):
            np.testing.assert_array_equal(compiled, plain)


runs_of = st.lists(st.tuples(st.integers(0, 2**62), st.integers(1, 2**40)), max_size=30, unique_by=lambda pair: pair[0])


def run_of(entries: list[tuple[int, int]]) -> Run:
    entries = sorted(entries)
    return Run(np.array([key for key, _ in entries], np.uint64), np.array([count for _, count in entries], np.int64))


@given(st.lists(runs_of, max_size=5))
def test_merging_equals_numpy(listed: list[list[tuple[int, int]]]) -> None:
    runs = [run_of(entries) for entries in listed]
    switch.use_numpy()
    wanted = merge(runs)
    assert switch.prefer_compiled(True)
    found = merge(runs)
    switch.use_numpy()
    np.testing.assert_array_equal(found.keys, wanted.keys)
    np.testing.assert_array_equal(found.counts, wanted.counts)


@given(runs_of, runs_of)
def test_merging_as_plain_python(one: list[tuple[int, int]], other: list[tuple[int, int]]) -> None:
    first, second = run_of(one), run_of(other)
    results = []
    for loop in (merging.merge_two, merging.merge_two.python):
        keys, counts = np.zeros(len(one) + len(other), np.uint64), np.zeros(len(one) + len(other), np.int64)
        n = loop(first.keys, first.counts, second.keys, second.counts, keys, counts)
        results.append((keys[:n], counts[:n]))
    for compiled, plain in zip(*results, strict=True):
        np.testing.assert_array_equal(compiled, plain)


@given(st.lists(st.integers(0, 2**63), min_size=1, max_size=200), st.integers(3, 12))
def test_radix_passes_sort(values: list[int], digit: int) -> None:
    """All digits, least first, sort whatever the keys; counts go along."""
    keys = np.array(values, np.uint64)
    counts = np.arange(len(keys))
    order = np.argsort(keys, kind="stable")
    alone, spare = keys.copy(), np.empty_like(keys)
    beside, other = (keys.copy(), counts.copy()), (np.empty_like(keys), np.empty_like(counts))
    for shift, bits in pairs.bit_ranges(32, 31, digit):
        places = np.zeros(1 << bits, np.int64)
        pairs.find_places(alone, shift, places)
        pairs.move_entries(*beside, *other, shift, places.copy())
        pairs.move_keys(alone, spare, shift, places)
        alone, spare = spare, alone
        beside, other = other, beside
    np.testing.assert_array_equal(alone, keys[order])
    np.testing.assert_array_equal(beside[0], keys[order])
    np.testing.assert_array_equal(beside[1], counts[order])


@given(st.lists(st.integers(0, 500), max_size=300))
def test_order_of_values_is_the_stable_one(values: list[int]) -> None:
    found = np.empty(len(values), np.int64)
    merging.order_by_value(np.array(values, np.uint32), np.zeros(501, np.int64), found)
    np.testing.assert_array_equal(found, np.argsort(np.array(values, np.uint32), kind="stable"))
