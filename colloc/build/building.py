"""The main use case: text in, counts in one store."""

from __future__ import annotations

import importlib.metadata
import json
import os
import platform
import shutil
import time
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path

from colloc.build.counting import count_new_documents
from colloc.build.differing import differences
from colloc.build.reading import Progress, Read, Resources, read_into
from colloc.errors import CannotCreateError, CollocError, DataError, InputOutputError, UsageError
from colloc.settings import DEFAULT_MEMORY, SMALLEST_MEMORY, Margins, ReadSettings, SegmentSettings, TallySpec
from colloc.store import documents, facts
from colloc.store.connection import sqlite_version
from colloc.store.opening import Store, create, open_for_writing
from colloc.store.scratch import scratch_folder
from colloc.store.stream import token_count
from colloc.store.vocabulary import ensure_layer, require_terms
from colloc.text.iterables import PythonDocuments, cannot_be_resumed
from colloc.text.sources import open_sources
from colloc.tokens.folding import folder
from colloc.tokens.folding.lemmas import lemmatizer
from colloc.tokens.segmenter import Segmenter

_WRITER_BYTES = 128 * 2**20
_WORKER_BYTES = 128 * 2**20
"""What the writing process and each segmenting one take at most with batches of the usual size, measured."""

__all__ = ["BuildReport", "PythonDocuments", "build", "check_space", "fill", "report", "resources", "versions"]

NOTHING_READ = Read(0, 0, 0, 0, 0, 0)


@dataclass(frozen=True, slots=True)
class BuildReport:
    """What a build, add or merge did.

    Attributes
    ----------
    documents, tokens : int
        Read in this run.
    total_documents : int
        In the store now.
    pairs : int
        Distinct pairs in the default tally.
    seconds : float
    already_complete : bool
        Nothing was left to do.
    """

    path: Path
    read: Read
    total_documents: int
    pairs: int
    seconds: float
    already_complete: bool = False


def resources(jobs: int | None, memory: int, temp: str | None) -> Resources:
    """Checked resources: all cores unless told otherwise, and no more processes than the memory can hold."""
    memory = max(memory, SMALLEST_MEMORY)
    cores = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    affordable = (memory - _WRITER_BYTES) // _WORKER_BYTES
    return Resources(
        jobs=max(min(jobs or cores, affordable), 1),
        memory=memory,
        temp=Path(temp) if temp else None,
    )


def build(
    path: str | Path,
    inputs: Sequence[str],
    *,
    read: ReadSettings | None = None,
    segment: SegmentSettings | None = None,
    tally: TallySpec | None = None,
    margins: Margins = "pairs",
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    keep_text: bool = True,
    progress: Progress | None = None,
) -> BuildReport:
    """Read, segment, keep and count ``inputs`` into the store at ``path``.

    A build that was stopped goes on with the same call: documents that are in
    the store are not read again. On a complete store the same call does nothing.

    Raises
    ------
    CannotCreateError
        When the path holds a store built from other inputs or with other settings.
    UsageError
        When the words read carry nothing for the layer to be counted; no store is left.
    NoInputError, DataError, InputOutputError, LockedError
    """
    began = time.perf_counter()
    wanted = _description(
        inputs, read or ReadSettings(), segment or SegmentSettings(), tally or TallySpec(), margins, keep_text
    )
    check_segmenting(segment or SegmentSettings())
    limits = resources(jobs, memory, temp)
    path = Path(path)
    new, useless = _is_new(path), False
    once = cannot_be_resumed(inputs)
    if once and not new:
        raise CannotCreateError(f"{path} exists already: use `add` for more documents, or another name")
    if new:
        check_space(
            path, [(source.info.name, source.info.size) for source in open_sources(inputs, read or ReadSettings())]
        )
    try:
        with _open_or_create(path, wanted) as store:
            if facts.get(store, "state") == "complete":
                return _report(store, NOTHING_READ, began, already_complete=True)
            try:
                done = fill(store, inputs, limits, progress, read or ReadSettings())
            except BaseException as error:
                # A store that got nothing is no use to anyone, nor is one whose settings do not fit its text;
                # any other that got something is gone on with, if it can be.
                unfit = isinstance(error, UsageError)
                useless = new and (once or unfit or (isinstance(error, CollocError) and not token_count(store)))
                raise
            with store.transaction():
                facts.put(store, "state", "complete")
            store.make_durable()
            return _report(store, done, began)
    except BaseException:
        if useless:
            path.unlink(missing_ok=True)
        raise


def check_segmenting(settings: SegmentSettings) -> None:
    """Raise UsageError or MissingExtraError, before anything is read, for what cannot be done with words."""
    Segmenter(settings)
    folder(settings.folding)
    if settings.lemma is not None:
        lemmatizer(settings.lemma)


def fill(store: Store, inputs: Sequence[str], limits: Resources, progress: Progress | None, read: ReadSettings) -> Read:
    """Read what is missing and count what is not counted; the caller makes it durable."""
    layer = TallySpec.from_json(facts.get(store, "default_tally")).layer
    segment = SegmentSettings.from_json(facts.get(store, "segment_settings"))
    for name in [layer] if segment.lemma is None else [layer, "lemma"]:
        ensure_layer(store, name)
    with scratch_folder(store.path, limits.temp) as folder:
        done = read_into(
            store,
            inputs,
            read,
            segment,
            keep_text=facts.get(store, "keep_text") == "1",
            resources=limits,
            folder=folder,
            progress=progress,
        )
        require_terms(store, layer)
        count_new_documents(store, limits, progress)
    return done


def report(store: Store, read: Read, began: float) -> BuildReport:
    """The report of a run that has just ended."""
    return _report(store, read, began)


def _report(store: Store, read: Read, began: float, already_complete: bool = False) -> BuildReport:
    from colloc.store import tallies

    spec = TallySpec.from_json(facts.get(store, "default_tally"))
    tally = tallies.find(store, spec)
    return BuildReport(
        path=store.path,
        read=read,
        total_documents=documents.document_count(store),
        pairs=tally.n_pairs if tally is not None else 0,
        seconds=time.perf_counter() - began,
        already_complete=already_complete,
    )


def _description(
    inputs: Sequence[str],
    read: ReadSettings,
    segment: SegmentSettings,
    tally: TallySpec,
    margins: Margins,
    keep_text: bool,
) -> dict[str, str]:
    """What decides a store's content, as facts."""
    return {
        "inputs": json.dumps([str(name) for name in inputs]),
        "read_settings": read.to_json(),
        "segment_settings": segment.to_json(),
        "default_tally": tally.to_json(),
        "default_margins": margins,
        "keep_text": "1" if keep_text else "0",
    }


def versions() -> dict[str, str]:
    """Versions of what made the numbers."""
    packages = {name: importlib.metadata.version(name) for name in ("colloc", "numpy", "regex")}
    return {**packages, "python": platform.python_version(), "sqlite": sqlite_version()}


DISK_FOR_TEXT = 3.5
"""Bytes of store and temporary files for each byte of plain text, window 5, from above."""

COMPRESSION = 4.0
"""Bytes of text for each byte of a compressed input, where nothing better is known."""


def check_space(path: Path, sizes: Iterable[tuple[str, int]]) -> None:
    """Refuse a build for which the disk is plainly too small, before it starts.

    Raises
    ------
    InputOutputError
        Naming what is needed and what is free.
    """
    folder = path.absolute().parent
    if not folder.is_dir():
        raise CannotCreateError(f"{path}: the folder {folder} does not exist; create it first")
    needed = 0.0
    for name, size in sizes:
        packed = name.lower().endswith((".gz", ".bz2", ".xz", ".zst"))
        needed += max(size, 0) * DISK_FOR_TEXT * (COMPRESSION if packed else 1.0)
    free = shutil.disk_usage(folder).free
    if needed > free:
        raise InputOutputError(
            f"{path}: the disk has {free / 1e9:.1f} GB free, and this build may need {needed / 1e9:.1f} GB: "
            "choose another place for the store, or --temp for the temporary files"
        )


def _is_new(path: Path) -> bool:
    return not path.exists() or path.stat().st_size == 0


def _open_or_create(path: Path, wanted: dict[str, str]) -> Store:
    if _is_new(path):
        more = {"state": "building", "versions": json.dumps(versions())}
        return create(path, {**wanted, **more})
    store = open_for_writing(path, "build")
    try:
        differs = differences({key: facts.get(store, key) for key in wanted}, wanted)
        if differs:
            raise CannotCreateError(
                f"{path} was built otherwise: {'; '.join(differs)}. Use `colloc add` for more documents, "
                "`colloc tally` for another table, or another name"
            )
        if facts.get(store, "state") not in ("building", "complete"):
            raise DataError(f"{path}: a change was interrupted; run that command again to finish it")
    except BaseException:
        store.close()
        raise
    return store
