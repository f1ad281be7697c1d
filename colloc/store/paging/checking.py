"""Whether the pages, margins and total of a tally agree."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from colloc.errors import CollocError
from colloc.records import Int64Array, PairBlock
from colloc.settings import TallySpec
from colloc.store.connection import Store
from colloc.store.pages import ORDERS, Order, keys_of
from colloc.store.paging.runs import StoredRun, load_runs
from colloc.store.tallies import Tally

_SUMMED = ("window", "span", "relation")
"""Kinds whose margins are row and column sums; in the others a cell is at most its margins."""

_MIX = np.uint64(0x9E3779B97F4A7C15)


def check_tally(store: Store, number: int, spec: TallySpec) -> Iterator[str]:
    """What is wrong with a tally, page by page; then whether its parts agree.

    A signature of each order (a sum over its pairs that does not depend on
    their order) shows whether both orders hold the same pairs.
    """
    tally = Tally(store, number, spec)
    sound = True
    for run in load_runs(store, number):
        signatures = set()
        for order in ORDERS:
            signature = 0
            for page in range(len(run.directories[order])):
                try:
                    block = run.page(store, order, page, len(tally.first))
                except CollocError as error:
                    sound = False
                    yield str(error)
                    continue
                problem = _page_problem(block, order)
                if problem:
                    sound = False
                    yield f"page {page} of run {run.number} by {order}: {problem}"
                signature = (signature + _signature(block)) % 2**64
            signatures.add(signature)
        yield from _extra_pages(store, run)
        if sound and len(signatures) > 1:
            sound = False
            yield f"run {run.number}: its two orders do not hold the same pairs"
    if sound:
        yield from _disagreements(tally)


def _page_problem(block: PairBlock, order: Order) -> str:
    keys = keys_of(block, order)
    if (keys[1:] <= keys[:-1]).any():
        return "its pairs do not ascend"
    if (block.low > block.high).any():
        return "it holds pairs the wrong way round"
    if block.backward[block.low == block.high].any():
        return "it counts pairs of a word with itself backward"
    return ""


def _signature(block: PairBlock) -> int:
    mixed = keys_of(block, "low") * _MIX
    mixed ^= mixed >> np.uint64(29)
    mixed += block.forward.view(np.uint64) * np.uint64(3) + block.backward.view(np.uint64) * np.uint64(5)
    mixed *= _MIX
    mixed ^= mixed >> np.uint64(32)
    return int(mixed.sum(dtype=np.uint64))


def _extra_pages(store: Store, run: StoredRun) -> Iterator[str]:
    for position, order in enumerate(ORDERS):
        sql = "SELECT count(*) FROM tally_pages WHERE run = ? AND ordering = ?"
        stored = store.value(sql, (run.number, position))
        if stored != len(run.directories[order]):
            yield f"run {run.number} by {order}: {stored} pages for {len(run.directories[order])} in its directory"


def _disagreements(tally: Tally) -> Iterator[str]:
    """Margins and total beside the sums of the pairs."""
    n = len(tally.first)
    rows, columns = np.zeros(n, dtype=np.int64), np.zeros(n, dtype=np.int64)
    summed = tally.spec.kind in _SUMMED
    for block in tally.blocks():
        if (block.forward < 0).any() or (block.backward < 0).any():
            yield "counts fall below zero"
            return
        if summed:
            rows += _sums(block.low, block.forward, n) + _sums(block.high, block.backward, n)
            columns += _sums(block.high, block.forward, n) + _sums(block.low, block.backward, n)
        elif _exceeds(block, tally):
            yield "pairs are counted more often than their words"
            return
    if summed and not (np.array_equal(rows, tally.first) and np.array_equal(columns, tally.second)):
        wrong = int(((rows != tally.first) | (columns != tally.second)).sum())
        yield f"margins of {wrong} words are not the sums of their pairs"
    if summed and int(rows.sum()) != tally.total:
        yield f"its total is {tally.total}, its pairs add up to {int(rows.sum())}"


def _sums(terms: np.ndarray, counts: Int64Array, n: int) -> Int64Array:
    # np.bincount adds floats, exact only below 2^53; np.add.at adds integers.
    sums = np.zeros(n, dtype=np.int64)
    np.add.at(sums, terms, counts)
    return sums


def _exceeds(block: PairBlock, tally: Tally) -> bool:
    forward = (block.forward > tally.first[block.low]) | (block.forward > tally.second[block.high])
    backward = (block.backward > tally.first[block.high]) | (block.backward > tally.second[block.low])
    return bool((forward | backward).any())
