"""Writing tallies: runs, compaction, and the limit on those kept only as a cache."""

from __future__ import annotations

import time

import numpy as np

from colloc.errors import UsageError
from colloc.records import Int64Array, PairBlock, UInt32Array
from colloc.settings import TallySpec
from colloc.store.connection import Store
from colloc.store.database import packing
from colloc.store.pages import ORDERS, PAGE_PAIRS, Order, PageHead, encode_page, head_of
from colloc.store.paging.directory import pack_directory
from colloc.store.paging.runs import take

MARGIN_PART = 262_144
"""Terms of one margin page: 5 MB before compression."""


class TallyWriter:
    """Writes one run of a tally; must be used inside one transaction.

    Parameters
    ----------
    delta : bool
        Add a signed change to a tally that is there already; otherwise the
        tally is written anew; what was there can be read until :meth:`finish`.
    kept : bool
        Asked for by the user; False for one that may be dropped to save room.
    """

    def __init__(self, store: Store, spec: TallySpec, delta: bool = False, *, kept: bool = True) -> None:
        if not store.connection.in_transaction:
            raise RuntimeError("a tally is written inside a transaction")
        self._store = store
        self._delta = delta
        number = store.value("SELECT id FROM tallies WHERE spec = ?", (spec.to_json(),))
        if delta and number is None:
            raise UsageError(f"{store.path}: no such tally to change: {spec.to_json()}")
        if number is None:
            cursor = store.execute(
                "INSERT INTO tallies (spec, kept, bytes, last_used) VALUES (?, ?, 0, ?)",
                (spec.to_json(), int(kept), int(time.time())),
            )
            number = cursor.lastrowid
        elif not delta:
            store.execute("UPDATE tallies SET kept = max(kept, ?) WHERE id = ?", (int(kept), number))
        self._tally = int(number or 0)
        empty = pack_directory([])
        run = store.execute(
            "INSERT INTO tally_runs (tally, base, summary, low_directory, high_directory) VALUES (?, ?, ?, ?, ?)",
            (self._tally, int(not delta), b"", empty, empty),
        )
        self.run = int(run.lastrowid or 0)
        self._heads: dict[Order, list[PageHead]] = {order: [] for order in ORDERS}
        self._parts = 0
        self._bytes = 0

    def add_page(self, order: Order, head: PageHead, data: bytes) -> None:
        """Add the next page of an order, as :func:`encode_page` and :func:`head_of` made it."""
        heads = self._heads[order]
        if heads and head.first <= heads[-1].last:
            raise ValueError(f"pages must ascend by {order}")
        self._insert("INSERT INTO tally_pages VALUES (?, ?, ?, ?)", ORDERS.index(order), len(heads), data)
        heads.append(head)

    def add_block(self, order: Order, block: PairBlock) -> None:
        """Add pairs, sorted by ``order`` and beyond those added before, as one or more pages."""
        for start in range(0, len(block), PAGE_PAIRS):
            part = take(block, slice(start, start + PAGE_PAIRS))
            data = encode_page(part, order)
            self.add_page(order, head_of(data, part, order), data)

    def add_margins(self, numbers: UInt32Array, first: Int64Array, second: Int64Array) -> None:
        """Add row and column sums of some terms.

        Parameters
        ----------
        numbers : uint32 array, shape (n,)
            Terms, strictly ascending; several calls add up.
        first, second : int64 arrays, shape (n,)
        """
        for start in range(0, len(numbers), MARGIN_PART):
            part = slice(start, start + MARGIN_PART)
            self._insert(
                "INSERT INTO margin_pages VALUES (?, ?, ?, ?, ?)",
                self._parts,
                packing.pack(numbers[part].astype(np.uint32, copy=False), ascending=True),
                packing.pack(first[part].astype(np.int64, copy=False), compress=True),
                packing.pack(second[part].astype(np.int64, copy=False), compress=True),
            )
            self._parts += 1

    def finish(self, total: int) -> None:
        """Seal the run with its total, signed for a change; a new table takes the place of the old runs."""
        pairs = {order: sum(head.n for head in heads) for order, heads in self._heads.items()}
        if pairs["low"] != pairs["high"]:
            raise ValueError(f"the two orders differ: {pairs}")
        summary = np.array([self.run, not self._delta, total, pairs["low"], self._parts], dtype=np.int64)
        self._store.execute(
            "UPDATE tally_runs SET summary = ?, low_directory = ?, high_directory = ? WHERE id = ?",
            (packing.pack(summary), *(pack_directory(self._heads[order]) for order in ORDERS), self.run),
        )
        if not self._delta:
            _drop_runs(self._store, self._tally, but=self.run)
        sql = "UPDATE tallies SET bytes = bytes * ? + ? WHERE id = ?"
        self._store.execute(sql, (int(self._delta), self._bytes, self._tally))

    def _insert(self, sql: str, *values: int | bytes) -> None:
        self._store.execute(sql, (self.run, *values))
        self._bytes += sum(len(value) for value in values if isinstance(value, bytes))


def drop(store: Store, spec: TallySpec) -> None:
    """Remove a tally with its pages; nothing happens where there is none."""
    number = store.value("SELECT id FROM tallies WHERE spec = ?", (spec.to_json(),))
    if number is not None:
        with store.transaction():
            _drop_runs(store, number)
            store.execute("DELETE FROM tallies WHERE id = ?", (number,))


def _drop_runs(store: Store, tally: int, but: int = -1) -> None:
    for (run,) in store.rows("SELECT id FROM tally_runs WHERE tally = ? AND id <> ?", (tally, but)):
        for table in ("tally_pages", "margin_pages"):
            store.execute(f"DELETE FROM {table} WHERE run = ?", (run,))
        store.execute("DELETE FROM tally_runs WHERE id = ?", (run,))


def set_kept(store: Store, spec: TallySpec, kept: bool = True) -> None:
    """Say whether a tally was asked for by the user, or may be dropped to save room."""
    store.execute("UPDATE tallies SET kept = ? WHERE spec = ?", (int(kept), spec.to_json()))


def limit_cache(store: Store, most_bytes: int) -> list[TallySpec]:
    """Drop the tallies that were not asked for, least recently used first, until the rest fits; says which."""
    rows = store.rows("SELECT spec, bytes FROM tallies WHERE kept = 0 ORDER BY last_used DESC, id DESC")
    dropped = []
    room = most_bytes
    for text, size in rows:
        room -= size
        if room < 0:
            spec = TallySpec.from_json(text)
            drop(store, spec)
            dropped.append(spec)
    return dropped
