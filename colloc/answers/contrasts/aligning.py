"""Two tallies of the same terms read side by side, a bounded stretch at a time."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from colloc.records import Int64Array, PairBlock, UInt32Array, UInt64Array
from colloc.store.pages import keys_of
from colloc.store.paging.runs import take
from colloc.store.tallies import Tally

Cells = tuple[UInt32Array, UInt32Array, Int64Array, Int64Array]
"""first, second, joint count in one tally, joint count in the other."""


def side_by_side(this: Tally, that: Tally, ordered: bool) -> Iterator[Cells]:
    """Every pair that is in either tally, with the counts of both; 0 where a tally does not have it.

    Parameters
    ----------
    ordered : bool
        Whether (x, y) and (y, x) are two rows. Otherwise their cells are added, and the words stand in the order in
        which they meet more often, both tallies together.
    """
    for low, high, cells in _aligned(this, that):
        forward, backward = cells[:2], cells[2:]
        if not ordered:
            swap = backward[0] + backward[1] > forward[0] + forward[1]
            first, second = np.where(swap, high, low), np.where(swap, low, high)
            yield first, second, forward[0] + backward[0], forward[1] + backward[1]
            continue
        for one, other, (joint, other_joint) in ((low, high, forward), (high, low, backward)):
            there = np.flatnonzero(joint + other_joint)
            yield one[there], other[there], joint[there], other_joint[there]


def _aligned(this: Tally, that: Tally) -> Iterator[tuple[UInt32Array, UInt32Array, list[Int64Array]]]:
    """low, high, and the cells forward (this, that), backward (this, that)."""
    readers = [this.blocks(), that.blocks()]
    waiting: list[PairBlock | None] = [next(reader, None) for reader in readers]
    while any(block is not None for block in waiting):
        # Up to the nearer end of the two stretches both are complete.
        ends = [keys_of(block, "low")[-1] for block in waiting if block is not None]
        end = min(ends)
        parts: list[PairBlock | None] = [None, None]
        for place, block in enumerate(waiting):
            if block is None:
                continue
            cut = int(np.searchsorted(keys_of(block, "low"), end, side="right"))
            parts[place] = take(block, slice(0, cut))
            waiting[place] = take(block, slice(cut, None)) if cut < len(block) else next(readers[place], None)
        yield _united(parts)


def _united(parts: list[PairBlock | None]) -> tuple[UInt32Array, UInt32Array, list[Int64Array]]:
    keys: list[UInt64Array] = [np.empty(0, np.uint64) if block is None else keys_of(block, "low") for block in parts]
    # Two sorted stretches: the stable sort is a merge.
    together = np.sort(np.concatenate(keys), kind="stable")
    fresh = np.ones(len(together), dtype=np.bool_)
    fresh[1:] = together[1:] != together[:-1]
    together = together[fresh]
    cells = [np.zeros(len(together), np.int64) for _ in range(4)]
    for place, (block, own) in enumerate(zip(parts, keys, strict=True)):
        if block is not None:
            where = np.searchsorted(together, own)
            cells[place][where] = block.forward
            cells[2 + place][where] = block.backward
    low = (together >> np.uint64(32)).astype(np.uint32)
    return low, together.astype(np.uint32), cells
