"""Tallies: co-occurrence tables in the store, read by page."""

from __future__ import annotations

import time
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from colloc.errors import StoreDamagedError
from colloc.records import Int64Array, PairBlock, UInt32Array
from colloc.settings import TallySpec
from colloc.store.connection import Store
from colloc.store.lexicon import layers
from colloc.store.pages import ORDERS, PAGE_PAIRS, Order, keys_of
from colloc.store.paging.runs import (
    StoredRun,
    add_margins,
    join_blocks,
    load_runs,
    merge_blocks,
    merged,
    take,
)
from colloc.store.paging.writing import TallyWriter, drop, limit_cache, set_kept

__all__ = ["Tally", "TallyWriter", "compact", "drop", "find", "limit_cache", "set_kept", "tally_list"]

_LOWER = (1 << 32) - 1


class Tally:
    """One table, read as it stood in the transaction of each call.

    Attributes
    ----------
    spec : TallySpec
    total : int
        Sum of all cells, or what the kind of tally counts as its observations.
    """

    def __init__(self, store: Store, number: int, spec: TallySpec) -> None:
        self._store = store
        self.number = number
        self.spec = spec
        self._runs = load_runs(store, number)
        self._terms = layers.term_count(store, spec.layer)
        self.total = sum(run.total for run in self._runs)

    @cached_property
    def n_pairs(self) -> int:
        """Distinct unordered pairs. Reads the table through where changes have been added to it."""
        if len(self._runs) == 1:
            return self._runs[0].n_pairs
        return sum(len(block) for block in self.blocks())

    @property
    def change_share(self) -> float:
        """Pairs in the changes as a share of the pairs first counted: what compaction goes by."""
        base, *changes = (run.n_pairs for run in self._runs)
        return sum(changes) / max(base, 1)

    @property
    def first(self) -> Int64Array:
        """Row sums, by term: shape (number of terms,)."""
        return self._margins[0]

    @property
    def second(self) -> Int64Array:
        """Column sums, by term."""
        return self._margins[1]

    @cached_property
    def _margins(self) -> tuple[Int64Array, Int64Array]:
        sums = np.zeros(self._terms, dtype=np.int64), np.zeros(self._terms, dtype=np.int64)
        for run in self._runs:
            add_margins(sums, self._store, run)
        if (sums[0] < 0).any() or (sums[1] < 0).any():
            raise StoreDamagedError(f"{self._store.path}: margins of tally {self.number} fall below zero")
        return sums

    def blocks(self, order: Order = "low") -> Iterator[PairBlock]:
        """All pairs, at most a page of each run in memory; zero pairs are left out."""
        return merged([self._pages(run, order) for run in self._runs], order)

    def _pages(self, run: StoredRun, order: Order) -> Iterator[PairBlock]:
        for page in range(len(run.directories[order])):
            yield run.page(self._store, order, page, self._terms)

    def around(self, term: int) -> PairBlock:
        """Every pair that holds the term: those where it is low, then the others, each sorted by the other term."""
        as_low = self._row("low", term)
        as_high = self._row("high", term)
        # The pair of the term with itself stands in both orders.
        return join_blocks([take(as_high, as_high.low != term), as_low])

    def _row(self, order: Order, term: int) -> PairBlock:
        first, last = term << 32, term << 32 | _LOWER
        found = []
        for run in self._runs:
            for page in run.directories[order].pages_between(first, last):
                block = run.page(self._store, order, page, self._terms)
                keys = keys_of(block, order)
                start = int(np.searchsorted(keys, np.uint64(first)))
                stop = int(np.searchsorted(keys, np.uint64(last), side="right"))
                found.append(take(block, slice(start, stop)))
        return merge_blocks(found, order)

    def pairs(self, low: UInt32Array, high: UInt32Array) -> PairBlock:
        """Given pairs, in their order; counts of 0 where never together.

        Parameters
        ----------
        low, high : uint32 arrays, shape (n,)
            low <= high, pair by pair; in any order, also repeated.
        """
        low, high = low.astype(np.uint32), high.astype(np.uint32)
        if (low > high).any():
            raise ValueError("low must not exceed high")
        zeros = np.zeros(len(low), dtype=np.int64)
        wanted = PairBlock(low, high, zeros, zeros.copy())
        keys = keys_of(wanted, "low")
        for run in self._runs:
            directory = run.directories["low"]
            pages = np.searchsorted(directory.last, keys)
            for page in np.unique(pages[pages < len(directory)]):
                block = run.page(self._store, "low", int(page), self._terms)
                here = np.flatnonzero(pages == page)
                there = keys_of(block, "low")
                places = np.searchsorted(there, keys[here])
                same = there[places] == keys[here]
                wanted.forward[here[same]] += block.forward[places[same]]
                wanted.backward[here[same]] += block.backward[places[same]]
        return wanted


def find(store: Store, spec: TallySpec) -> Tally | None:
    """The tally of this spec, or None. Where the store can be written, the use of one that may be dropped is noted."""
    number = store.value("SELECT id FROM tallies WHERE spec = ?", (spec.to_json(),))
    if number is None:
        return None
    if store.writable:
        store.execute("UPDATE tallies SET last_used = ? WHERE id = ? AND kept = 0", (int(time.time()), number))
    return Tally(store, number, spec)


@dataclass(frozen=True, slots=True)
class TallyEntry:
    """What the list of tallies says of one.

    Attributes
    ----------
    kept : bool
        Asked for by the user; False for one that is only a cache.
    n_bytes : int
        Size of its pages.
    last_used : int
        Seconds since the epoch.
    n_pairs : int
        Pairs of the table as last compacted; changes added since are not in it.
    total : int
    """

    spec: TallySpec
    kept: bool
    n_bytes: int
    last_used: int
    n_pairs: int
    total: int


def tally_list(store: Store) -> list[TallyEntry]:
    """All tallies, in the order in which they were counted."""
    entries = []
    for number, text, kept, size, used in store.rows(
        "SELECT id, spec, kept, bytes, last_used FROM tallies ORDER BY id"
    ):
        runs = load_runs(store, number)
        total = sum(run.total for run in runs)
        entries.append(TallyEntry(TallySpec.from_json(text), bool(kept), size, used, runs[0].n_pairs, total))
    return entries


def compact(store: Store, spec: TallySpec, share: float = 0.25) -> bool:
    """Make one run of a tally whose changes hold more than ``share`` of its pairs; says whether it did.

    Must be used inside a transaction. Page by page: memory stays bounded.
    """
    old = find(store, spec)
    if old is None or old.change_share <= share:
        return False
    writer = TallyWriter(store, spec, kept=False)
    for order in ORDERS:
        for block in _repaged(old.blocks(order)):
            writer.add_block(order, block)
    there = np.flatnonzero((old.first != 0) | (old.second != 0)).astype(np.uint32)
    writer.add_margins(there, old.first[there], old.second[there])
    writer.finish(old.total)
    return True


def _repaged(blocks: Iterator[PairBlock]) -> Iterator[PairBlock]:
    """The same pairs in full pages, so that compaction does not leave crumbs."""
    waiting: list[PairBlock] = []
    for block in blocks:
        waiting.append(block)
        if sum(map(len, waiting)) >= PAGE_PAIRS:
            joined = join_blocks(waiting)
            full = len(joined) // PAGE_PAIRS * PAGE_PAIRS
            yield take(joined, slice(0, full))
            waiting = [take(joined, slice(full, None))]
    if waiting:
        yield join_blocks(waiting)
