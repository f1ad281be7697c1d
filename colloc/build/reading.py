"""The reading half of build and add: sources to documents in the store, resumable."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from colloc.build.batches import Batcher, Numbered
from colloc.build.repeats import Repeats
from colloc.build.segmenting import segment_batches
from colloc.build.writing import StreamWriter
from colloc.errors import DataError, NoInputError
from colloc.kernels.switch import WORTH_BYTES, prefer_compiled
from colloc.settings import ReadSettings, SegmentSettings
from colloc.store import documents, facts, stream
from colloc.store.connection import Store
from colloc.store.inputs.repeats import SeenHashes
from colloc.store.inputs.sources import SourceRow, add_source, find_source, finish, note_encoding
from colloc.store.vocabulary import TypeRegistry
from colloc.text.iterables import IterableSource
from colloc.text.sources import Source, open_sources

Progress = Callable[[float, int, str], None]
"""Called with the share done (0..1), tokens so far, and the phase."""


@dataclass(frozen=True, slots=True)
class Resources:
    """What a run may use.

    Parameters
    ----------
    jobs : int
        Processes.
    memory : int
        Bytes for all of them together.
    temp : Path or None
        Where temporary files go; beside the store when None.
    """

    jobs: int
    memory: int
    temp: Path | None = None


@dataclass(frozen=True, slots=True)
class Read:
    """What one reading run stored."""

    documents: int
    tokens: int
    dropped_tokens: int
    replaced_bytes: int
    repeated_documents: int
    repeated_paragraphs: int
    detected: Mapping[str, int] = field(default_factory=dict)
    """Files by the encoding that was detected for them; empty where the encoding was named."""


def read_into(
    store: Store,
    inputs: Sequence[str],
    read: ReadSettings,
    segment: SegmentSettings,
    *,
    keep_text: bool,
    resources: Resources,
    folder: Path,
    progress: Progress | None = None,
) -> Read:
    """Read what is not yet in the store and commit it document by document.

    Raises
    ------
    NoInputError
        When there is nothing to read, or an input holds no text.
    DataError
        For input that cannot be read, naming file and line; what was committed stays.
    """
    sources = _Sources(store, list(open_sources(inputs, read)))
    if progress is not None:
        # The first time on a machine loops are compiled, which takes some seconds.
        progress(0.0, 0, "preparing")
    # Before processes are made: they inherit what is loaded.
    prefer_compiled(sources.bytes_left > WORTH_BYTES)
    with SeenHashes(store, folder) as seen:
        repeats = Repeats(read.skip_duplicates, seen if read.skip_duplicates != "none" else None)
        writer = StreamWriter(store, TypeRegistry(store, limit=registry_limit(resources.memory)))
        batches = Batcher(segment, repeats).batches(sources.documents())
        segmented = segment_batches(
            batches, segment, jobs=resources.jobs, keep_text=keep_text, folder=folder, memory=resources.memory // 4
        )
        ended = False
        while not ended:
            with store.transaction():
                ended = _until_document_end(writer, segmented)
                sources.save_finished(writer.last_source)
                if ended:
                    # repeats behind the last document that was kept
                    writer.note_met(repeats.take_new(), documents.next_document(store))
                    sources.save_all()
                    _count(store, "replaced_bytes", sources.replaced)
                writer.save_totals()
            if progress is not None:
                progress(sources.share, writer.totals.tokens, "reading")
    totals = writer.totals
    if totals.tokens == 0 and (totals.documents or not stream.token_count(store)):
        raise NoInputError(f"{', '.join(inputs[:3])}: no words were found; give text, or another --text-column")
    return Read(
        totals.documents,
        totals.tokens,
        totals.dropped,
        sources.replaced,
        totals.repeated_documents,
        totals.repeated_paragraphs,
        sources.detected,
    )


def registry_limit(memory: int) -> int:
    """Types the registry keeps in memory, 200 to 300 bytes each: an eighth of the memory, and more of what passes 1 GB.

    Whatever goes beyond it is looked up in the store, whose indexes then grow at random places: three times as slow.
    """
    return max(memory // 8 // 200 + max(memory - 2**30, 0) * 3 // 8 // 300, 10_000)


def _until_document_end(writer: StreamWriter, segmented: Iterator[object]) -> bool:
    """Append batches until one ends with a document; True when there are no more."""
    for batch in segmented:
        writer.append(batch)  # type: ignore[arg-type]
        if writer.at_document_end:
            return False
    return True


def _count(store: Store, key: str, value: int) -> None:
    facts.put(store, key, str(int(facts.get(store, key, "0")) + value))


class _Sources:
    """The sources of a run beside what the store knows of them."""

    def __init__(self, store: Store, sources: list[Source | IterableSource]) -> None:
        self._store = store
        self._sources = sources
        self._rows: list[SourceRow] = []
        self._exhausted: list[int] = []
        with store.transaction():
            for source in sources:
                known = find_source(store, source.info.name)
                if known is not None and known.records and known.info != source.info:
                    raise DataError(
                        f"{source.info.name} has changed since it was read into {store.path}: "
                        "build the store anew, or give the new text another name"
                    )
                number = add_source(store, source.info)
                self._rows.append(known or SourceRow(number, source.info, None, 0, False))
        self._positions = {row.number: position for position, row in enumerate(self._rows)}
        self._weight = [max(source.info.size, 1) for source in sources]
        self._current = 0

    def documents(self) -> Iterator[Numbered]:
        """Documents that are not yet in the store, with the numbers of their sources."""
        for position, (source, row) in enumerate(zip(self._sources, self._rows, strict=True)):
            self._current = position
            if row.finished:
                continue
            for document in source.documents(skip=row.records):
                yield row.number, document
            self._exhausted.append(position)
        self._current = len(self._sources)

    def save_finished(self, last_source: int) -> None:
        """Mark the sources before ``last_source``, whose documents are committed up to its own."""
        position = self._positions.get(last_source, 0)
        self._finish([number for number in self._exhausted if number < position])

    def save_all(self) -> None:
        """Mark every source read to its end."""
        self._finish(list(self._exhausted))

    def _finish(self, positions: list[int]) -> None:
        for position in positions:
            source = self._sources[position]
            finish(self._store, self._rows[position].number, source.digest())
            note_encoding(self._store, source.info.name, source.detected)
            self._exhausted.remove(position)

    @property
    def bytes_left(self) -> int:
        """Size of the sources that are not finished, as they lie on the disk; pipes and iterables count nothing."""
        rows = zip(self._sources, self._rows, strict=True)
        return sum(max(source.info.size, 0) for source, row in rows if not row.finished)

    @property
    def share(self) -> float:
        done: float = sum(self._weight[: self._current])
        if self._current < len(self._sources):
            done += self._weight[self._current] * self._sources[self._current].position
        return done / sum(self._weight) if self._weight else 1.0

    @property
    def detected(self) -> dict[str, int]:
        return dict(Counter(source.detected for source in self._sources if source.detected is not None))

    @property
    def replaced(self) -> int:
        return sum(source.replaced for source in self._sources)
