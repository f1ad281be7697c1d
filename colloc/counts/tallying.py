"""Tallies found, counted and changed: where the rest of the program asks for counts."""

from __future__ import annotations

import os
import weakref
from collections.abc import Callable, Sequence
from contextlib import ExitStack
from pathlib import Path

import numpy as np

from colloc.counts.budget import DEFAULT_MEMORY, affordable_jobs, plan_memory
from colloc.counts.counting import Progress, count_tally
from colloc.counts.processes import crew
from colloc.counts.relations import chosen_relations
from colloc.counts.selection import Selection, documents_selection, slice_selection
from colloc.counts.words import change_word_counts
from colloc.errors import CannotCreateError, LockedError
from colloc.kernels.switch import WORTH_PAIRS, prefer_compiled
from colloc.records import Int64Array
from colloc.settings import TallySpec
from colloc.store import facts, tallies
from colloc.store.aside import store_aside
from colloc.store.connection import Store
from colloc.store.opening import open_for_reading, open_for_writing
from colloc.store.scratch import scratch_folder
from colloc.store.slices import fitting, select
from colloc.store.tallies import Tally, TallyWriter
from colloc.store.vocabulary import ensure_layer, term_count

_WORTH_A_PROCESS = 2**18
"""Tokens for which a worker is started: it takes as long to start as these take to count."""
_ATTEMPTS = 3
CACHE_BYTES = 2**30
"""What tallies take at most that were counted to answer a question, before the next one is added."""


def obtain_tally(
    store_or_path: Store | str | os.PathLike[str],
    spec: TallySpec,
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    keep: bool = True,
    temp: str | os.PathLike[str] | None = None,
    progress: Progress | None = None,
) -> Tally:
    """The tally of a spec: found in the store, or counted from the stored stream.

    What was counted stays in the store where it is open for writing. Otherwise it lies in a temporary
    file that goes when the returned tally does.

    Parameters
    ----------
    jobs : int, optional
        Processes; all processors when None.
    memory : int
        Bytes for all processes together.
    keep : bool
        Keep the tally for good; otherwise it may be dropped to save room.
    temp : path, optional
        Where temporary files go; beside the store when None.

    Raises
    ------
    UsageError
        The layer or the slice is not there, or relations are asked of plain text.
    NotSeenError
        No relation is called so, or no document fits the slice.
    InputOutputError
        The disk is full, or a process was ended from outside.
    LockedError
        The store changed again and again while it was counted.
    """
    if not isinstance(store_or_path, Store):
        store = open_for_reading(store_or_path)
        try:
            tally = obtain_tally(store, spec, jobs=jobs, memory=memory, keep=keep, temp=temp, progress=progress)
        except BaseException:
            store.close()
            raise
        weakref.finalize(tally, store.close)
        return tally
    store = store_or_path
    if spec.kind == "relation":
        chosen_relations(store, spec.relation)  # raises where there is none
    found = tallies.find(store, spec)
    if found is not None:
        if keep and store.writable:
            tallies.set_kept(store, spec)
        return found
    fitting(store, spec.where)  # raises where no document fits, before anything is kept
    if not store.writable:
        return _count_aside(store, spec, jobs, memory, temp, progress)
    ensure_layer(store, spec.layer)
    with scratch_folder(store.path, temp) as folder, store.transaction():
        counter = _Counter(store, jobs, memory, folder, progress)
        counter.count(store, spec, slice_selection(store, spec.where), kept=keep)
    return _found(store, spec)


def cached_tally(
    store: Store,
    spec: TallySpec,
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Progress | None = None,
) -> Tally:
    """The tally of a spec for a question: found, or counted and left in the store as a cache for the next one.

    A store that cannot be written, or that another process is writing, is not waited for: the tally is then counted
    aside and goes when the question is answered. Before a tally is added, those that nobody asked to keep make room
    until they take at most `CACHE_BYTES`, the ones longest unused first.

    Raises
    ------
    UsageError, InputOutputError, LockedError
        As :func:`obtain_tally`.
    """
    if store.writable or tallies.find(store, spec) is not None or not os.access(store.path, os.W_OK):
        return obtain_tally(store, spec, jobs=jobs, memory=memory, keep=False, progress=progress)
    try:
        writer = open_for_writing(store.path, "cache", wait=0.0)
    except (LockedError, CannotCreateError):
        return obtain_tally(store, spec, jobs=jobs, memory=memory, progress=progress)
    with writer:
        tallies.limit_cache(writer, CACHE_BYTES)
        obtain_tally(writer, spec, jobs=jobs, memory=memory, keep=False, progress=progress)
    store.refresh()
    return obtain_tally(store, spec, jobs=jobs, memory=memory, progress=progress)


def count_change(
    store: Store,
    specs: Sequence[TallySpec],
    numbers: Int64Array,
    *,
    sign: int,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | os.PathLike[str] | None = None,
    progress: Progress | None = None,
    finish: Callable[[], None],
) -> None:
    """Count documents into the tallies and word frequencies of a store, or out of them, in one transaction.

    Tallies that are not there yet are begun; those that nobody asked to keep are dropped, since they
    would no longer be true.

    Parameters
    ----------
    specs : sequence of TallySpec
        The tallies to bring up to date.
    numbers : int64 array
        Documents. Their tokens must be committed, and still there where they are taken out.
    sign : int
        1 to add, -1 to take out.
    finish : callable
        Changes the documents themselves, inside the same transaction: makes new ones visible, or removes old ones.
    """
    for spec in specs:
        # committed before the count begins: processes that count see what is committed
        ensure_layer(store, spec.layer)
    with scratch_folder(store.path, temp) as folder, store.transaction():
        if sign > 0:
            # slices are chosen among the documents that readers see
            finish()
        counter = _Counter(store, jobs, memory, folder, progress)
        everything = documents_selection(store, numbers)
        for spec in specs:
            chosen = everything
            if spec.where:
                chosen = documents_selection(store, np.intersect1d(numbers, select(store, spec.where)))
            if tallies.find(store, spec) is None:
                counter.count(store, spec, chosen, kept=True)
            elif len(chosen):
                counter.count(store, spec, chosen, kept=True, sign=sign, delta=True)
                tallies.compact(store, spec)
        change_word_counts(store, everything, sign)
        tallies.limit_cache(store, 0)
        if sign < 0:
            finish()


class _Counter:
    """Counts tallies of one store one after the other, with the same means."""

    def __init__(self, source: Store, jobs: int | None, memory: int, folder: Path, progress: Progress | None) -> None:
        self._source = source
        self._jobs = jobs if jobs is not None else os.cpu_count() or 1
        self._memory = memory
        self._folder = folder
        self._progress = progress
        self._done = 0

    def count(
        self, target: Store, spec: TallySpec, selection: Selection, *, kept: bool, sign: int = 1, delta: bool = False
    ) -> None:
        """Write one run of a tally into ``target``, which has a transaction open."""
        prefer_compiled(len(selection) * max(1, spec.left + spec.right) > WORTH_PAIRS)
        jobs = affordable_jobs(self._memory, max(1, min(self._jobs, len(selection) // _WORTH_A_PROCESS)))
        n_terms = term_count(self._source, spec.layer)
        budget = plan_memory(self._memory, jobs, n_terms)
        place = self._folder / f"tally-{self._done}"
        place.mkdir()
        self._done += 1
        writer = TallyWriter(target, spec, delta, kept=kept)
        with crew(self._source, jobs) as workers:
            counts = count_tally(
                workers,
                jobs,
                spec,
                selection,
                n_terms,
                budget,
                place,
                writer.add_page,
                sign=sign,
                progress=self._progress,
            )
        there = np.flatnonzero((counts.first != 0) | (counts.second != 0)).astype(np.uint32)
        writer.add_margins(there, counts.first[there], counts.second[there])
        writer.finish(counts.total)


def _count_aside(
    store: Store,
    spec: TallySpec,
    jobs: int | None,
    memory: int,
    temp: str | os.PathLike[str] | None,
    progress: Progress | None,
) -> Tally:
    for _ in range(_ATTEMPTS):
        store.refresh()  # processes that count see the last commit, and so must this one
        generation = facts.generation(store)
        with ExitStack() as stack:
            aside = stack.enter_context(store_aside(store, spec.layer, temp))
            with scratch_folder(aside.path) as folder, aside.transaction():
                counter = _Counter(store, jobs, memory, folder, progress)
                counter.count(aside, spec, slice_selection(store, spec.where), kept=False)
            store.refresh()
            if facts.generation(store) == generation:
                tally = _found(aside, spec)
                weakref.finalize(tally, stack.pop_all().close)
                return tally
    raise LockedError(f"{store.path}: documents were added or removed while it was counted; try again")


def _found(store: Store, spec: TallySpec) -> Tally:
    tally = tallies.find(store, spec)
    assert tally is not None  # it was written a moment ago
    return tally
