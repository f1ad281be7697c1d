"""Verbs that make and change stores: build, add, remove, merge."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from colloc.errors import UsageError
from colloc.settings import DEFAULT_MEMORY, Margins, ReadSettings, SegmentSettings, TallySpec
from colloc.verbs.opening import ProgressCall, StorePath, as_list, reading, store_path

if TYPE_CHECKING:
    from colloc.build.building import BuildReport
    from colloc.store.opening import Store


def build(
    store: StorePath | Store,
    inputs: Sequence[str] | str = (),
    *,
    documents: Iterable[Any] | None = None,
    read: ReadSettings | None = None,
    segment: SegmentSettings | None = None,
    tally: TallySpec | None = None,
    margins: Margins = "pairs",
    keep_text: bool = True,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: ProgressCall | None = None,
) -> BuildReport:
    """Read, segment, keep and count files, folders or globs into a new store.

    A build that was stopped goes on with the same call; on a complete store it does nothing.

    Parameters
    ----------
    documents : iterable, instead of inputs
        Each document is a text; ``(identifier, text)`` or ``(identifier, text, metadata)``; or a mapping with the
        key ``text`` (``read.text_column``), perhaps ``id`` (``read.id_column``), and metadata. It is read once, as
        it comes; a build that is stopped leaves nothing.

    Raises
    ------
    UsageError
        Both inputs and documents, or neither.
    NoInputError, DataError
        Input that is missing, holds no text, or is not what it claims to be.
    CannotCreateError
        The path holds something else, or cannot be written.
    """
    from colloc.build import building

    return building.build(
        store_path(store),
        _inputs(inputs, documents),
        read=read,
        segment=segment,
        tally=tally,
        margins=margins,
        keep_text=keep_text,
        jobs=jobs,
        memory=memory,
        temp=temp,
        progress=progress,
    )


def add(
    store: StorePath | Store,
    inputs: Sequence[str] | str = (),
    *,
    documents: Iterable[Any] | None = None,
    read: ReadSettings | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: ProgressCall | None = None,
) -> BuildReport:
    """Read more documents into a store and count only them; ``documents`` as for `build`."""
    from colloc.build import changing

    return changing.add(
        store_path(store),
        _inputs(inputs, documents),
        read=read,
        jobs=jobs,
        memory=memory,
        temp=temp,
        progress=progress,
    )


def _inputs(inputs: Sequence[str] | str, documents: Iterable[Any] | None) -> Sequence[str]:
    """What is to be read: names of files, or documents from Python."""
    if documents is None:
        return as_list(inputs)
    if inputs:
        raise UsageError("give inputs or documents, not both")
    from colloc.build.building import PythonDocuments

    return PythonDocuments(documents)


def remove(
    store: StorePath | Store,
    *,
    identifiers: Sequence[str] | str = (),
    where: Sequence[str] | str = (),
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: ProgressCall | None = None,
) -> BuildReport:
    """Take documents out of a store, chosen by identifier or by metadata, and count them out of its tables."""
    from colloc.build import changing

    return changing.remove(
        store_path(store),
        identifiers=as_list(identifiers),
        where=as_list(where),
        jobs=jobs,
        memory=memory,
        temp=temp,
        progress=progress,
    )


def merge(
    store: StorePath | Store,
    others: Sequence[StorePath],
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: ProgressCall | None = None,
) -> BuildReport:
    """Join the documents and counts of other stores into this one; the others stay as they are."""
    from colloc.build import merging

    return merging.merge(
        store_path(store), [Path(other) for other in others], jobs=jobs, memory=memory, temp=temp, progress=progress
    )


def reading_settings(store: StorePath | Store) -> ReadSettings:
    """How the input of a store was read when it was built."""
    from colloc.store import facts

    with reading(store) as opened:
        return ReadSettings.from_json(facts.get(opened, "read_settings"))
