"""More documents, or fewer: only what changed is counted."""

from __future__ import annotations

import json
import time
from collections.abc import Sequence
from pathlib import Path

import numpy as np

from colloc.build.building import BuildReport, fill, report, resources
from colloc.build.counting import count_removed_documents
from colloc.build.reading import Progress, Read
from colloc.errors import CollocError, DataError, NotSeenError, UsageError
from colloc.settings import DEFAULT_MEMORY, ReadSettings
from colloc.store import documents, facts, slices, visibility
from colloc.store.connection import Store
from colloc.store.inputs.sources import source_list
from colloc.store.opening import open_for_writing
from colloc.text.iterables import PythonDocuments, cannot_be_resumed


def add(
    path: str | Path,
    inputs: Sequence[str],
    *,
    read: ReadSettings | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: Progress | None = None,
) -> BuildReport:
    """Read more documents into a store and count only them.

    They are segmented and counted as the store was built. Readers see the old
    state until all of it is counted. An ``add`` that was killed goes on with the
    same call; one that meets bad input leaves the store as it was.

    Raises
    ------
    DataError
        For input that cannot be read, an identifier that the store has already,
        or another change that was interrupted.
    """
    began = time.perf_counter()
    limits = resources(jobs, memory, temp)
    with open_for_writing(Path(path), "add") as store:
        _drop_unresumable(store)
        if isinstance(inputs, PythonDocuments):
            inputs = inputs.named_apart(source.info.name for source in source_list(store))
        wanted = (read or ReadSettings.from_json(facts.get(store, "read_settings"))).to_json()
        _begin(store, {"state": "adding", "pending_inputs": json.dumps(list(inputs)), "pending_read": wanted})
        try:
            done = fill(store, inputs, limits, progress, ReadSettings.from_json(wanted))
        except BaseException as error:
            if isinstance(error, CollocError | UnicodeError) or cannot_be_resumed(inputs):
                with store.transaction():
                    visibility.drop_uncounted(store)
                    _end(store)
            raise
        with store.transaction():
            _end(store)
        store.make_durable()
        return report(store, done, began)


def remove(
    path: str | Path,
    *,
    identifiers: Sequence[str] = (),
    where: Sequence[str] = (),
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: Progress | None = None,
) -> BuildReport:
    """Take documents out of a store, with their text, and count them out of its tables.

    Raises
    ------
    UsageError
        When neither identifiers nor a slice is given.
    NotSeenError
        When no document fits.
    """
    began = time.perf_counter()
    limits = resources(jobs, memory, temp)
    if not identifiers and not where:
        raise UsageError("say which documents to remove: identifiers, or where KEY=VALUE")
    with open_for_writing(Path(path), "remove") as store:
        require_complete(store)
        numbers = _chosen(store, identifiers, where)
        count_removed_documents(store, numbers, limits, progress)
        store.make_durable()
        return report(store, Read(-len(numbers), 0, 0, 0, 0, 0), began)


def require_complete(store: Store) -> None:
    """Raise DataError where an earlier change was interrupted and waits to be finished."""
    state = facts.get(store, "state")
    if state == "complete":
        return
    if state == "building":
        raise DataError(f"{store.path}: its build is not finished; run the same `colloc build` again first")
    inputs = ", ".join(json.loads(facts.get(store, "pending_inputs", "[]")))
    command = {"adding": "add", "merging": "merge"}[state]
    raise DataError(
        f"{store.path}: `colloc {command}` of {inputs} was interrupted; run it again to finish it before another change"
    )


def _drop_unresumable(store: Store) -> None:
    """Take back what an ``add`` from an iterable left that was killed: nobody can go on with it."""
    if facts.get(store, "state") == "adding" and cannot_be_resumed(json.loads(facts.get(store, "pending_inputs"))):
        with store.transaction():
            visibility.drop_uncounted(store)
            _end(store)


def _begin(store: Store, pending: dict[str, str]) -> None:
    if facts.get(store, "state") == "adding":
        if all(facts.get(store, key) == value for key, value in pending.items()):
            return
        require_complete(store)
    require_complete(store)
    with store.transaction():
        for key, value in pending.items():
            facts.put(store, key, value)


def _end(store: Store) -> None:
    facts.put(store, "state", "complete")
    facts.put(store, "pending_inputs", "[]")


def _chosen(store: Store, identifiers: Sequence[str], where: Sequence[str]) -> np.ndarray:
    numbers: list[int] = []
    for identifier in identifiers:
        number = documents.find_document(store, identifier)
        if number is None:
            raise NotSeenError(f"{store.path} has no document {identifier!r}; `colloc info --documents` lists them")
        numbers.append(number)
    chosen = np.array(sorted(set(numbers)), dtype=np.int64)
    if where:
        fitting = slices.select(store, slices.canonical(where))
        chosen = np.union1d(chosen, fitting) if identifiers else fitting
    if not len(chosen):
        raise NotSeenError(f"{store.path}: no document fits {' & '.join(where)}")
    return chosen
