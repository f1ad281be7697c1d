"""How large the parts of a count may be, so that all processes together keep to the memory allowed."""

from __future__ import annotations

from dataclasses import dataclass

from colloc.errors import UsageError

LEAST_MEMORY = 64 * 2**20
DEFAULT_MEMORY = 2 * 2**30

_PROCESS = 48 * 2**20
"""What a process takes with its libraries and one block of the stream in hand (measured)."""
_WORTHWHILE = 160 * 2**20
"""With less, processes cut their work into so many parts that one with all the memory is faster (measured)."""
_BYTES_PER_KEY = 40
"""Keys, flags, places and counts while a run is made of keys that are all different (measured)."""
_BYTES_PER_CELL = 36
"""A cell, and key, order and count of its run where every second cell is in use (measured)."""
_BYTES_PER_ENTRY = 160
"""Key, order, both columns of counts, the page and what is dealt out, for each entry of a merge (measured)."""
_BYTES_PER_TERM = 64
"""The map of the layer, three columns of the plan, and the ranking they are made from."""


@dataclass(frozen=True, slots=True)
class Budget:
    """Sizes for one process.

    Attributes
    ----------
    pending : int
        Keys that are collected before they are sorted.
    cells : int
        Cells of the table of frequent pairs; 0: no table.
    entries : int
        Run entries that are merged at a time.
    """

    pending: int
    cells: int
    entries: int


def affordable_jobs(memory: int, jobs: int) -> int:
    """As many of ``jobs`` processes as can have enough memory each to be worth having, beside the one that writes."""
    return max(1, min(jobs, (memory - _PROCESS) // _WORTHWHILE))


def plan_memory(memory: int, jobs: int, n_terms: int) -> Budget:
    """Sizes for each of ``jobs`` processes.

    Parameters
    ----------
    memory : int
        Bytes for all of them together.

    Raises
    ------
    UsageError
        Too little to work with at all.
    """
    if memory < LEAST_MEMORY:
        raise UsageError(f"memory must be at least {LEAST_MEMORY // 2**20} MB, not {memory / 2**20:.0f} MB")
    shared = memory - _PROCESS if jobs > 1 else memory
    free = max(shared // jobs - _PROCESS, LEAST_MEMORY // 8)
    table = free // 4
    # for very large vocabularies the plan itself would take what the table is to save
    fits = n_terms * _BYTES_PER_TERM <= free // 4
    cells = min(table // _BYTES_PER_CELL, 2**22) if fits else 0
    return Budget(
        pending=max(2**12, min(free // 2 // _BYTES_PER_KEY, 2**22)),
        cells=int(cells),
        entries=max(2**12, min(free // _BYTES_PER_ENTRY, 2**20)),
    )
