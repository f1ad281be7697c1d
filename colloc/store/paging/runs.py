"""One run of a tally: the table as counted, or a signed change of it. And merging runs by key."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from colloc.errors import StoreDamagedError
from colloc.records import Int64Array, PairBlock, UInt64Array
from colloc.store.connection import Store
from colloc.store.database import packing
from colloc.store.pages import ORDERS, Order, decode_page, keys_of
from colloc.store.paging.directory import Directory, unpack_directory


@dataclass(frozen=True, slots=True)
class StoredRun:
    """A row of ``tally_runs``, verified.

    Attributes
    ----------
    total : int
        Sum of the counts (of observations where margins are not sums), signed.
    n_pairs : int
    """

    number: int
    base: bool
    total: int
    n_pairs: int
    margin_parts: int
    directories: dict[Order, Directory]

    def page(self, store: Store, order: Order, page: int, terms: int) -> PairBlock:
        """One page, which must be the one that the directory means."""
        what = f"{store.path}: page {page} of run {self.number} by {order}"
        sql = "SELECT data FROM tally_pages WHERE run = ? AND ordering = ? AND page = ?"
        data = store.value(sql, (self.number, ORDERS.index(order), page))
        block = decode_page(data, order, head=self.directories[order].head(page), what=what)
        if int(block.high.max()) >= terms or int(block.low.max()) >= terms:
            raise StoreDamagedError(f"{what}: holds terms that the layer does not have; build the store again")
        return block


def load_runs(store: Store, tally: int) -> list[StoredRun]:
    """The runs of a tally: the base first."""
    sql = (
        "SELECT id, base, summary, low_directory, high_directory FROM tally_runs WHERE tally = ? ORDER BY base DESC, id"
    )
    runs = []
    for number, base, summary, *directories in store.rows(sql, (tally,)):
        what = f"{store.path}: run {number}"
        values = packing.unpack_as(summary, np.int64, f"{what}, summary")
        if len(values) != len(SUMMARY) or values[0] != number or values[1] != base:
            raise StoreDamagedError(f"{what}: its summary does not fit; build the store again")
        by_order = {
            order: unpack_directory(data, f"{what}, directory by {order}")
            for order, data in zip(ORDERS, directories, strict=True)
        }
        total, n_pairs, parts = (int(value) for value in values[2:])
        if any(int(directory.n.sum()) != n_pairs for directory in by_order.values()):
            raise StoreDamagedError(f"{what}: its pages do not add up to {n_pairs} pairs; build the store again")
        runs.append(StoredRun(number, bool(base), total, n_pairs, parts, by_order))
    if [run.base for run in runs].count(True) != 1:
        raise StoreDamagedError(f"{store.path}: tally {tally} has no table to begin with; build the store again")
    return runs


SUMMARY = ("run", "base", "total", "pairs", "margin parts")
"""What the packed int64 of ``summary`` mean."""


def merge_blocks(blocks: Sequence[PairBlock], order: Order) -> PairBlock:
    """Add up blocks pair by pair; zero pairs stay out. Each block sorted by ``order``, or in any order."""
    filled = [block for block in blocks if len(block)]
    if len(filled) <= 1:
        return without_zeros(filled[0]) if filled else EMPTY
    joined = join_blocks(filled)
    keys = keys_of(joined, order)
    # A stable sort of a few sorted stretches is close to a merge.
    sorting = np.argsort(keys, kind="stable")
    keys = keys[sorting]
    starts = np.flatnonzero(np.concatenate(([True], keys[1:] != keys[:-1])))
    chosen = sorting[starts]
    forward = np.add.reduceat(joined.forward[sorting], starts)
    backward = np.add.reduceat(joined.backward[sorting], starts)
    return without_zeros(PairBlock(joined.low[chosen], joined.high[chosen], forward, backward))


def without_zeros(block: PairBlock) -> PairBlock:
    """The pairs that were ever together."""
    there = (block.forward != 0) | (block.backward != 0)
    return block if there.all() else take(block, there)


def take(block: PairBlock, index: np.ndarray | slice) -> PairBlock:
    """Rows of a block, by mask, numbers or slice."""
    return PairBlock(block.low[index], block.high[index], block.forward[index], block.backward[index])


def join_blocks(blocks: Sequence[PairBlock]) -> PairBlock:
    """Blocks one after the other; needs at least one."""
    return PairBlock(
        np.concatenate([block.low for block in blocks]),
        np.concatenate([block.high for block in blocks]),
        np.concatenate([block.forward for block in blocks]),
        np.concatenate([block.backward for block in blocks]),
    )


EMPTY = PairBlock(np.empty(0, np.uint32), np.empty(0, np.uint32), np.empty(0, np.int64), np.empty(0, np.int64))
"""No pairs."""


class _Cursor:
    """Reads one run page by page, giving out what lies below a bound."""

    def __init__(self, pages: Iterator[PairBlock], order: Order) -> None:
        self._pages = pages
        self._order = order
        self.block = EMPTY
        self.keys: UInt64Array = np.empty(0, dtype=np.uint64)
        self._load()

    def _load(self) -> None:
        self.block = next(self._pages, EMPTY)
        self.keys = keys_of(self.block, self._order)

    def up_to(self, bound: np.uint64) -> PairBlock:
        """The pairs of the page at hand with keys up to the bound."""
        stop = int(np.searchsorted(self.keys, bound, side="right"))
        part = take(self.block, slice(0, stop))
        self.block, self.keys = take(self.block, slice(stop, None)), self.keys[stop:]
        if not len(self.keys):
            self._load()
        return part


def merged(runs: Sequence[Iterator[PairBlock]], order: Order) -> Iterator[PairBlock]:
    """Stream several sorted runs as one: at most a page of each in memory, zero pairs dropped."""
    cursors = [_Cursor(pages, order) for pages in runs]
    while open_cursors := [cursor for cursor in cursors if len(cursor.keys)]:
        bound = min(cursor.keys[-1] for cursor in open_cursors)
        block = merge_blocks([cursor.up_to(bound) for cursor in open_cursors], order)
        if len(block):
            yield block


def add_margins(sums: tuple[Int64Array, Int64Array], store: Store, run: StoredRun) -> None:
    """Add the margins of a run to ``sums``: row and column sums by term."""
    sql = "SELECT part, numbers, first, second FROM margin_pages WHERE run = ? ORDER BY part"
    parts = store.rows(sql, (run.number,))
    if [row[0] for row in parts] != list(range(run.margin_parts)):
        raise StoreDamagedError(f"{store.path}: margins of run {run.number} are missing; build the store again")
    for part, packed, *columns in parts:
        what = f"{store.path}: margins of run {run.number}, part {part}"
        numbers = packing.unpack_as(packed, np.uint32, what)
        if len(numbers) and (numbers[-1] >= len(sums[0]) or (numbers[1:] <= numbers[:-1]).any()):
            raise StoreDamagedError(f"{what}: terms out of range or order")
        for total, column in zip(sums, columns, strict=True):
            values = packing.unpack_as(column, np.int64, what)
            if len(values) != len(numbers):
                raise StoreDamagedError(f"{what}: columns of different length")
            total[numbers] += values  # the numbers of one part are distinct
