"""Sizes of parts follow the memory allowed."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.counts.budget import LEAST_MEMORY, affordable_jobs, plan_memory
from colloc.errors import UsageError

MB = 2**20


@given(st.integers(LEAST_MEMORY, 2**36), st.integers(1, 64), st.integers(0, 2**31 - 1))
def test_parts_of_all_processes_fit(memory: int, wanted: int, n_terms: int) -> None:
    """Keys while they are sorted take 16 bytes at least, cells 8, entries of a merge 32: their own arithmetic."""
    jobs = affordable_jobs(memory, wanted)
    assert 1 <= jobs <= wanted
    budget = plan_memory(memory, jobs, n_terms)
    assert jobs * (16 * budget.pending + 8 * budget.cells) <= memory
    assert jobs * 32 * budget.entries <= memory
    assert budget.pending > 0
    assert budget.entries > 0


def test_few_processes_where_memory_is_small() -> None:
    assert affordable_jobs(128 * MB, 8) == 1
    assert affordable_jobs(2048 * MB, 8) == 8


def test_no_table_for_a_vocabulary_that_would_fill_the_memory() -> None:
    assert plan_memory(256 * MB, 1, 10**8).cells == 0
    assert plan_memory(256 * MB, 1, 10**5).cells > 0


def test_too_little_to_work_with() -> None:
    with pytest.raises(UsageError, match=r"at least 64 MB, not 1 MB"):
        plan_memory(MB, 1, 10)
