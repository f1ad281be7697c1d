"""Batches into token arrays, in this process or in several.

A worker keeps its own growing vocabulary and answers with numbers of its own
and the types that are new to it; arrays go through a temporary file, never
through a pipe. Results come back in the order of the batches.
"""

from __future__ import annotations

import json
import multiprocessing
from collections import deque
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from multiprocessing.connection import Connection, wait
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.build.annotating import Annotations, annotations_of, sentence_anchors
from colloc.build.batches import Batch
from colloc.errors import CollocError, InputOutputError
from colloc.kernels.characters import mark
from colloc.kernels.switch import compiled
from colloc.records import Anchors, Annotation, Int64Array, UInt32Array
from colloc.settings import SegmentSettings
from colloc.store.texts import PackedText, pack_text
from colloc.store.vocabulary import TypeKey
from colloc.tokens.annotated.lines import Part
from colloc.tokens.annotated.reading import read_words
from colloc.tokens.annotated.values import FieldNumberer
from colloc.tokens.numbering import TypeNumberer
from colloc.tokens.segmenter import Segmenter

ANCHOR_EVERY = 1024
"""Tokens between places where segmenting can begin again: what showing one line costs at most."""

IN_FLIGHT = 2
"""Batches given to a worker at once, so that it never waits for the next."""


@dataclass(frozen=True, slots=True)
class SegmentedBatch:
    """What segmenting made of a batch; token numbers are offsets in the batch.

    Attributes
    ----------
    tokens : uint32 array
        Local type numbers of the worker that segmented it.
    present : uint32 array
        Local type numbers that occur, ascending.
    new_types : list of str
        Types the worker had not met before, in order; they go on with its numbering.
    restarted : bool
        Whether the worker's numbering begins again at 0 with this batch.
    entry_tokens : int64 array
        First token of each entry.
    texts : PackedText
        The text, where it is kept.
    entry_characters, entry_lengths : int64 arrays
        Where the text of each entry stands in the text that is kept.
    n_characters : int
        Length of the text that is kept.
    annotations : Annotations
        Columns of annotation and the like; nothing for plain text.
    """

    batch: Batch
    worker: int
    tokens: UInt32Array
    present: UInt32Array
    sentences: Int64Array
    paragraphs: Int64Array
    entry_tokens: Int64Array
    anchors: Anchors
    new_types: Sequence[TypeKey]
    restarted: bool
    closed: bool
    dropped: int
    texts: PackedText
    entry_characters: Int64Array
    entry_lengths: Int64Array
    n_characters: int
    annotations: Annotations


Arrays = dict[str, NDArray[Any]]
_ARRAYS = ("tokens", "present", "sentences", "paragraphs", "entry_tokens", "entry_characters", "entry_lengths")
_COLUMN = "column "
"""Before the names of columns of annotation among the arrays."""


class _Worker:
    """Segments and numbers batches one after the other."""

    def __init__(self, settings: SegmentSettings, keep_text: bool, memory: int) -> None:
        self._segmenter = Segmenter(settings)
        self._numberer = TypeNumberer()
        self._fields = FieldNumberer()
        self._keep_text = keep_text
        self._memory = memory

    def segment(self, batch: Batch) -> tuple[Arrays, dict[str, Any]]:
        """Arrays and small facts of one batch."""
        restarted = self._numberer.nbytes + self._fields.nbytes > self._memory
        if restarted:
            self._numberer.reset()
            self._fields.reset()
        if batch.annotation is not None:
            arrays, facts = self._read(batch, batch.annotation)
        else:
            arrays, facts = self._segment(batch)
        return arrays, {**facts, "restarted": restarted}

    def _segment(self, batch: Batch) -> tuple[Arrays, dict[str, Any]]:
        segments = self._segmenter.segment(batch.text, batch.following, batch.opening)
        tokens = self._numberer.number(segments)
        new_types = self._numberer.take_new()
        starts = np.fromiter((entry.start for entry in batch.entries), dtype=np.int64, count=len(batch.entries))
        lengths = np.fromiter((entry.length for entry in batch.entries), dtype=np.int64, count=len(batch.entries))
        anchor_tokens = _spaced(segments.sentences, ANCHOR_EVERY)
        arrays: Arrays = {
            "tokens": tokens,
            "present": _present(tokens),
            "sentences": segments.sentences,
            "paragraphs": segments.paragraphs,
            "entry_tokens": np.searchsorted(segments.starts, starts).astype(np.int64),
            "entry_characters": starts,
            "entry_lengths": lengths,
            "anchor_tokens": anchor_tokens,
            "anchor_characters": segments.starts[anchor_tokens],
        }
        facts: dict[str, Any] = {
            "new_types": new_types,
            "closed": segments.closed,
            "dropped": segments.dropped,
            "texts": pack_text(batch.text) if self._keep_text else [],
            "n_characters": len(batch.text),
            "annotations": Annotations(),
        }
        return arrays, facts

    def _read(self, batch: Batch, annotation: Annotation) -> tuple[Arrays, dict[str, Any]]:
        """Annotated text: it is words already."""
        parts = [Part(entry.start, entry.line, entry.last) for entry in batch.entries]
        words = read_words(batch.lines, parts, annotation, self._fields)
        annotations = annotations_of(words, annotation, self._keep_text)
        anchor_tokens = sentence_anchors(words, ANCHOR_EVERY)
        arrays: Arrays = {
            "tokens": words.tokens,
            "present": _present(words.tokens),
            "sentences": words.sentences,
            "paragraphs": words.paragraphs,
            "entry_tokens": words.part_words,
            "entry_characters": words.part_characters,
            "entry_lengths": words.part_lengths,
            "anchor_tokens": anchor_tokens,
            "anchor_characters": words.starts[anchor_tokens],
        }
        facts: dict[str, Any] = {
            "new_types": self._fields.take_new(),
            "closed": True,
            "dropped": 0,
            "texts": pack_text(words.text) if self._keep_text else [],
            "n_characters": len(words.text),
            "annotations": annotations,
        }
        return arrays, facts


def _spaced(positions: Int64Array, step: int) -> Int64Array:
    """Positions at least about ``step`` apart: the first in each stretch of ``step`` tokens."""
    if not len(positions):
        return positions
    stretch = positions // step
    return positions[np.r_[True, stretch[1:] != stretch[:-1]]]


def _present(tokens: UInt32Array) -> UInt32Array:
    if not len(tokens):
        return tokens
    seen = np.zeros(int(tokens.max()) + 1, dtype=bool)
    if compiled():
        mark(tokens, seen)
    else:
        seen[tokens] = True
    return np.flatnonzero(seen).astype(np.uint32)


def _segmented(batch: Batch, worker: int, arrays: Arrays, facts: dict[str, Any]) -> SegmentedBatch:
    anchors = Anchors(arrays["anchor_tokens"], arrays["anchor_characters"])
    values: dict[str, Any] = {name: arrays[name] for name in _ARRAYS} | facts
    return SegmentedBatch(batch=batch, worker=worker, anchors=anchors, **values)


def segment_batches(
    batches: Iterable[Batch], settings: SegmentSettings, *, jobs: int, keep_text: bool, folder: Path, memory: int
) -> Iterator[SegmentedBatch]:
    """Segment batches with ``jobs`` processes (1: in this one), in order.

    Parameters
    ----------
    folder : Path
        For the arrays that workers hand back.
    memory : int
        Bytes that the vocabularies of all workers together may take.

    Raises
    ------
    InputOutputError
        When a worker dies (killed, or out of memory).
    """
    if jobs <= 1:
        worker = _Worker(settings, keep_text, memory)
        for batch in batches:
            arrays, facts = worker.segment(batch)
            yield _segmented(batch, 0, arrays, facts)
        return
    pool = _Pool(settings, keep_text, folder, jobs, memory // jobs)
    try:
        yield from pool.run(batches)
    finally:
        pool.stop()


class _Pool:
    """Worker processes and what each has been given."""

    def __init__(self, settings: SegmentSettings, keep_text: bool, folder: Path, jobs: int, memory: int) -> None:
        forks = "fork" in multiprocessing.get_all_start_methods()
        context: Any = multiprocessing.get_context("fork" if forks else "spawn")
        self._pipes: list[Connection] = []
        self._processes: list[Any] = []
        self._given: list[deque[int]] = [deque() for _ in range(jobs)]
        self._folder = folder
        for number in range(jobs):
            ours, theirs = context.Pipe()
            inherited = [*self._pipes, ours] if forks else []
            process = context.Process(
                target=_serve, args=(theirs, inherited, settings, keep_text, folder, number, memory), daemon=True
            )
            process.start()
            theirs.close()
            self._pipes.append(ours)
            self._processes.append(process)

    def run(self, batches: Iterable[Batch]) -> Iterator[SegmentedBatch]:
        waiting: dict[int, Batch] = {}
        done: dict[int, SegmentedBatch] = {}
        numbered = enumerate(batches)
        next_out = 0
        exhausted = False
        while True:
            while not exhausted and (worker := self._free_worker()) is not None and len(done) < 4 * len(self._pipes):
                item = next(numbered, None)
                if item is None:
                    exhausted = True
                    break
                number, batch = item
                waiting[number] = batch
                self._send(worker, number, batch)
            while next_out in done:
                yield done.pop(next_out)
                next_out += 1
            if not waiting:
                if exhausted:
                    return
                continue
            self._receive(waiting, done)

    def _free_worker(self) -> int | None:
        worker = min(range(len(self._given)), key=lambda number: len(self._given[number]))
        return worker if len(self._given[worker]) < IN_FLIGHT else None

    def _send(self, worker: int, number: int, batch: Batch) -> None:
        try:
            self._pipes[worker].send((number, batch))
        except (BrokenPipeError, OSError) as error:
            raise self._died(worker) from error
        self._given[worker].append(number)

    def _receive(self, waiting: dict[int, Batch], done: dict[int, SegmentedBatch]) -> None:
        for pipe in wait(self._pipes):
            worker = self._pipes.index(pipe)  # type: ignore[arg-type]
            try:
                answer = self._pipes[worker].recv()
            except (EOFError, OSError) as error:
                raise self._died(worker) from error
            if isinstance(answer, CollocError):
                raise answer
            number, path, lengths, facts = answer
            arrays = _read_arrays(path, lengths)
            new_types, values = json.loads(arrays.pop("types").tobytes())
            facts["new_types"] = [key if isinstance(key, str) else tuple(key) for key in new_types]
            facts["texts"] = _divided(arrays.pop("texts"), facts.pop("text_sizes"))
            facts["annotations"] = _annotations(arrays, values)
            self._given[worker].remove(number)
            done[number] = _segmented(waiting.pop(number), worker, arrays, facts)

    def _died(self, worker: int) -> InputOutputError:
        self._processes[worker].join(1)
        code = self._processes[worker].exitcode
        return InputOutputError(
            f"a segmenting process ended unexpectedly (exit code {code}), perhaps out of memory: "
            "run the same command again to go on, with a smaller --jobs or a larger --memory"
        )

    def stop(self) -> None:
        for pipe in self._pipes:
            pipe.close()
        for process in self._processes:
            process.terminate()
        for process in self._processes:
            process.join()


def _serve(
    pipe: Connection,
    inherited: list[Connection],
    settings: SegmentSettings,
    keep_text: bool,
    folder: Path,
    number: int,
    memory: int,
) -> None:
    """A worker's life: one batch after another until the pipe closes."""
    for other in inherited:
        # Copies of the parent's ends would keep pipes open after the parent is killed, and this process alive.
        other.close()
    worker = _Worker(settings, keep_text, memory)
    try:
        while True:
            ordinal, batch = pipe.recv()
            try:
                arrays, facts = worker.segment(batch)
            except CollocError as error:
                pipe.send(error)
                return
            path = folder / f"segments-{number}-{ordinal}"
            annotations = facts.pop("annotations")
            arrays["types"] = _as_bytes(json.dumps([facts.pop("new_types"), annotations.values]).encode())
            arrays |= {f"{_COLUMN}{name}": column for name, column in annotations.columns.items()}
            arrays["rests"] = _as_bytes(b"".join(annotations.rests))
            arrays["rest_ends"] = np.cumsum([len(rest) for rest in annotations.rests], dtype=np.int64)
            texts = facts.pop("texts")
            arrays["texts"] = _as_bytes(b"".join(data for _, _, data in texts))
            facts["text_sizes"] = [(start, length, len(data)) for start, length, data in texts]
            # What goes through the pipe stays small: were both ends to wait for room in it, neither would go on.
            pipe.send((ordinal, path, _write_arrays(path, arrays), facts))
    except (EOFError, KeyboardInterrupt, BrokenPipeError):
        return


def _as_bytes(data: bytes) -> NDArray[Any]:
    return np.frombuffer(data, dtype=np.uint8)


def _divided(data: NDArray[Any], sizes: list[tuple[int, int, int]]) -> PackedText:
    """The packed blocks of text out of one array."""
    blocks = []
    end = 0
    for start, length, size in sizes:
        blocks.append((start, length, data[end : end + size].tobytes()))
        end += size
    return blocks


def _annotations(arrays: Arrays, values: dict[str, list[str]]) -> Annotations:
    """What was handed back of an annotated batch."""
    rests, ends = arrays.pop("rests"), arrays.pop("rest_ends").tolist()
    columns = {name.removeprefix(_COLUMN): array for name, array in arrays.items() if name.startswith(_COLUMN)}
    return Annotations(columns, values, [rests[start:end].tobytes() for start, end in pairwise([0, *ends])])


def _write_arrays(path: Path, arrays: Arrays) -> list[tuple[str, str, int]]:
    with path.open("wb") as file:
        for array in arrays.values():
            array.tofile(file)
    return [(name, array.dtype.str, len(array)) for name, array in arrays.items()]


def _read_arrays(path: Path, lengths: list[tuple[str, str, int]]) -> Arrays:
    with path.open("rb") as file:
        arrays = {name: np.fromfile(file, dtype=dtype, count=count) for name, dtype, count in lengths}
    path.unlink()
    return arrays
