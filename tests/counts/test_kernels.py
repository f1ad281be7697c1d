"""Every kernel equals a plain count in Python on small random streams.

The oracle is the definition written out in `brute.py`; there is no other source.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.counts.accumulating import Accumulator
from colloc.counts.dense import plan_cells
from colloc.counts.keys import Run, backward, high_terms, low_terms, merge, pack, pair_block, run_of_keys
from colloc.counts.positions import add_positions, count_positions
from colloc.counts.units import add_units, count_units, unit_terms
from colloc.counts.windows import add_windows, count_windows
from colloc.records import NO_TERM, TokenSpan
from tests.counts import brute

pytestmark = pytest.mark.usefixtures("loops")

HUGE = 2**31 - 1
terms = st.one_of(st.integers(0, 6), st.sampled_from([HUGE, HUGE - 1, int(NO_TERM)]))
streams = st.tuples(st.lists(terms, max_size=40), st.lists(st.integers(0, 45), max_size=8))
sides = st.tuples(st.integers(0, 7), st.integers(0, 7)).filter(any)
small_streams = st.tuples(
    st.lists(st.one_of(st.integers(0, 9), st.just(int(NO_TERM))), max_size=60), st.lists(st.integers(0, 60), max_size=8)
)


@given(streams, sides)
def test_windows_and_spans(stream: tuple[list[int], list[int]], side: tuple[int, int]) -> None:
    assert brute.cells_of(count_windows(brute.span(*stream), *side)) == brute.windows(*stream, *side)


@given(streams, sides)
def test_positions(stream: tuple[list[int], list[int]], side: tuple[int, int]) -> None:
    assert brute.cells_of(count_positions(brute.span(*stream), *side)) == brute.positions(*stream, *side)


@given(streams)
def test_units(stream: tuple[list[int], list[int]]) -> None:
    assert brute.cells_of(count_units(brute.span(*stream))) == brute.units(*stream)


def test_two_formulations_of_the_oracle_agree() -> None:
    rng = np.random.default_rng(5)
    stream = rng.integers(0, 9, 400).tolist()
    starts = rng.integers(0, 400, 30).tolist()
    for side in ((0, 1), (0, 5), (2, 3), (4, 0)):
        assert brute.windows(stream, starts, *side) == brute.windows_fast(stream, starts, *side)


def pieces(stream: list[int], starts: list[int], cuts: list[int], context: int, ahead: int) -> list[TokenSpan]:
    """A stream cut anywhere, each piece with the tokens before and after it that its windows reach."""
    edges = [0, *sorted({cut for cut in cuts if 0 < cut < len(stream)}), len(stream)]
    spans = []
    for begin, stop in pairwise(edges):
        first, last = max(0, begin - context), min(len(stream), stop + ahead)
        own = [start - first for start in starts if first <= start < last]
        spans.append(brute.span(stream[first:last], own, begin - first, last - stop))
    return spans


@given(streams, sides, st.lists(st.integers(0, 40), max_size=5))
def test_windows_do_not_notice_cuts(
    stream: tuple[list[int], list[int]], side: tuple[int, int], cuts: list[int]
) -> None:
    parts = pieces(*stream, cuts, context=max(side), ahead=0)
    assert brute.cells_of(merge([count_windows(part, *side) for part in parts])) == brute.windows(*stream, *side)


@given(streams, sides, st.lists(st.integers(0, 40), max_size=5))
def test_positions_do_not_notice_cuts(
    stream: tuple[list[int], list[int]], side: tuple[int, int], cuts: list[int]
) -> None:
    left, right = side
    parts = pieces(*stream, cuts, context=left, ahead=right)
    assert brute.cells_of(merge([count_positions(part, *side) for part in parts])) == brute.positions(*stream, *side)


@given(small_streams, sides, st.integers(0, 250), st.integers(1, 20))
def test_table_and_sorting_count_the_same(
    stream: tuple[list[int], list[int]], side: tuple[int, int], cells: int, pending: int
) -> None:
    span = brute.span(*stream)
    frequencies = np.bincount([term for term in stream[0] if term != NO_TERM], minlength=10).astype(np.int64)
    plan = plan_cells(frequencies, cells)
    spilled: list[Run] = []
    into = Accumulator(plan, pending, spilled.append)
    add_windows(span, *side, into)
    assert len(into.finish()) == 0
    assert brute.cells_of(merge(spilled)) == brute.windows(*stream, *side)
    into = Accumulator(plan, pending)
    add_positions(span, *side, into)
    assert brute.cells_of(into.finish()) == brute.positions(*stream, *side)
    add_units(*unit_terms(span), into)
    assert brute.cells_of(into.finish()) == brute.units(*stream)


def test_the_table_takes_what_was_planned_for_it() -> None:
    frequencies = np.array([100, 90, 80, 5, 1, 0])
    plan = plan_cells(frequencies, 1000)
    assert plan.row_starts[0] == 1
    assert plan.n_cells <= 1000 + 2
    # every pair of terms that occur has two cells, the diagonal too, and each row a spare one: 5 + 4 + 3 + 2 + 1 pairs
    assert plan.n_cells == 1 + 2 * 15 + 5 + 1
    assert plan_cells(frequencies, 0).n_cells == 2
    assert plan_cells(np.zeros(0, np.int64), 10).n_cells == 2


@given(st.lists(st.tuples(st.integers(0, HUGE), st.integers(0, HUGE)), max_size=30))
def test_keys_keep_terms_and_direction(pairs: list[tuple[int, int]]) -> None:
    first = np.array([x for x, _ in pairs], np.uint32)
    second = np.array([y for _, y in pairs], np.uint32)
    keys = pack(first, second)
    assert low_terms(keys).tolist() == np.minimum(first, second).tolist()
    assert high_terms(keys).tolist() == np.maximum(first, second).tolist()
    assert backward(keys).tolist() == [x > y for x, y in pairs]


@given(
    st.lists(
        st.dictionaries(st.tuples(st.integers(0, 4), st.integers(0, 4)), st.integers(-(2**40), 2**40), max_size=12),
        max_size=5,
    )
)
def test_merge_adds_exactly(tables: list[dict[tuple[int, int], int]]) -> None:
    runs = []
    expected: dict[tuple[int, int], int] = {}
    for table in tables:
        keys = pack(np.array([x for x, _ in table], np.uint32), np.array([y for _, y in table], np.uint32))
        order = np.argsort(keys)
        runs.append(Run(keys[order], np.array(list(table.values()), np.int64)[order]))
        for pair, count in table.items():
            expected[pair] = expected.get(pair, 0) + count
    whole = merge(runs)
    assert brute.cells_of(whole) == expected
    block = pair_block(whole)
    order = list(zip(block.low.tolist(), block.high.tolist(), strict=True))
    assert order == sorted({(min(pair), max(pair)) for pair in expected})
    for low, high, forward, back in zip(block.low, block.high, block.forward, block.backward, strict=True):
        assert forward == expected.get((int(low), int(high)), 0)
        assert back == (0 if low == high else expected.get((int(high), int(low)), 0))


def test_counts_beyond_32_bits_add_up() -> None:
    key = pack(np.array([HUGE], np.uint32), np.array([3], np.uint32))
    many = Run(key, np.array([2**62], np.int64))
    assert merge([many, Run(key, np.array([2**61], np.int64))]).counts.tolist() == [2**62 + 2**61]


def test_run_of_keys_counts_repeats() -> None:
    run = run_of_keys(np.array([7, 3, 7, 7, 0], np.uint64))
    assert run.keys.tolist() == [0, 3, 7]
    assert run.counts.tolist() == [1, 1, 3]


@pytest.mark.parametrize("length", [0, 1])
def test_too_short_for_pairs(length: int) -> None:
    assert len(count_windows(brute.span([4] * length), 0, 5)) == 0
    assert len(count_positions(brute.span([4] * length), 5, 5)) == 0
    assert len(count_units(brute.span([4] * length))) == 0
