"""What a build will take, from a sample: time, memory, temporary and final disk."""

from __future__ import annotations

import json
import shutil
import tempfile
import time
from collections.abc import Iterable, Iterator, Sequence
from contextlib import ExitStack
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO, TypeVar

from colloc.build.batches import BATCH_CHARACTERS
from colloc.build.building import build, resources
from colloc.records import Document
from colloc.settings import DEFAULT_MEMORY, ReadSettings, SegmentSettings, TallySpec
from colloc.text.sources import open_sources

Text = TypeVar("Text", str, bytes)

SAMPLE_CHARACTERS = 2 * BATCH_CHARACTERS

SECOND_CORE = 1.8
"""How much faster two processes are than one, measured."""

PAIR_GROWTH = 0.8
"""Exponent by which distinct pairs grow with text, measured on English prose of 1 to 12 million tokens."""


@dataclass(frozen=True, slots=True)
class Estimate:
    """What a build of these inputs is expected to need.

    Attributes
    ----------
    sampled_tokens, tokens : int
        Tokens in the sample and expected in all.
    seconds : float
    memory, temporary_bytes, store_bytes : int
        Bytes: peak of all processes, temporary files, finished store.
    free_bytes : int
        Free where the store will be.
    """

    sampled_tokens: int
    tokens: int
    seconds: float
    memory: int
    temporary_bytes: int
    store_bytes: int
    free_bytes: int

    @property
    def fits(self) -> bool:
        """Whether the disk has room for the store and the temporary files."""
        return self.temporary_bytes + self.store_bytes <= self.free_bytes


def estimate(
    path: str | Path,
    inputs: Sequence[str],
    *,
    read: ReadSettings | None = None,
    segment: SegmentSettings | None = None,
    tally: TallySpec | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    keep_text: bool = True,
) -> Estimate:
    """Build a store of a sample, measure it, and extrapolate; nothing is left behind.

    Raises
    ------
    NoInputError, DataError
        As the build itself would.
    """
    limits = resources(jobs, memory, temp)
    folder = Path(path).absolute().parent
    with tempfile.TemporaryDirectory(dir=limits.temp or folder, prefix=f"{Path(path).name}.tmp-") as scratch:
        samples, share = _write_sample(Path(scratch), inputs, read or ReadSettings())
        store = Path(scratch) / "sample"
        began = time.perf_counter()
        done = build(
            store,
            [str(sample) for sample in samples],
            read=ReadSettings(),
            segment=segment,
            tally=tally,
            jobs=1,
            memory=memory,
            keep_text=keep_text,
        )
        seconds = time.perf_counter() - began
        size = store.stat().st_size
    tokens = round(done.read.tokens / share)
    growth = 1 / share
    # Text and stream grow with the text, pairs more slowly; about half a small store is pairs.
    store_bytes = size // 2 * growth + size // 2 * growth**PAIR_GROWTH
    run_bytes = min(tokens * 5 * 12, round(done.pairs * 16 * growth))
    return Estimate(
        sampled_tokens=done.read.tokens,
        tokens=tokens,
        seconds=seconds * growth / (1 if limits.jobs == 1 else SECOND_CORE * limits.jobs / 2),
        memory=min(limits.memory, round(300e6 * limits.jobs)),
        temporary_bytes=run_bytes,
        store_bytes=round(store_bytes),
        free_bytes=shutil.disk_usage(folder).free,
    )


def _write_sample(folder: Path, inputs: Sequence[str], read: ReadSettings) -> tuple[list[Path], float]:
    """Files of the first documents (annotated ones apart, by their columns), and the share of all input they are."""
    sources = list(open_sources(inputs, read))
    sizes = [max(source.info.size, 1) for source in sources]
    samples: dict[tuple[str, ...], Path] = {}
    written, done = 0, 0.0
    with ExitStack() as stack:
        files: dict[tuple[str, ...], BinaryIO] = {}
        for number, source in enumerate(sources):
            for document in source.documents():
                columns = document.annotation.columns if document.annotation is not None else ()
                if columns not in files:
                    name = f"sample-{len(files)}{'.conllup' if columns else '.jsonl'}"
                    samples[columns] = folder / name
                    files[columns] = stack.enter_context(samples[columns].open("wb"))
                    if columns:
                        files[columns].write(f"# global.columns = {' '.join(columns).upper()}\n".encode())
                size, sample = _sample(document, SAMPLE_CHARACTERS - written)
                files[columns].write(sample)
                written += size
                done = (sum(sizes[:number]) + sizes[number] * source.position) / sum(sizes)
                if written >= SAMPLE_CHARACTERS:
                    return [*samples.values()], max(done, 1e-9)
    return [*samples.values()], 1.0


def _sample(document: Document, characters: int) -> tuple[int, bytes]:
    """The document's text up to about so many characters (of annotated text whole pieces), and as a file has it."""
    if document.annotation is not None:
        lines = b"".join(_first(document.sentences, characters))
        return len(lines), lines
    text = "".join(_first(document.pieces, characters))[:characters]
    return len(text), json.dumps({"text": text}).encode() + b"\n"


def _first(pieces: Iterable[Text], characters: int) -> Iterator[Text]:
    """The first pieces, as many as it takes."""
    for piece in pieces:
        yield piece
        characters -= len(piece)
        if characters <= 0:
            return
