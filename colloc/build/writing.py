"""Segmented batches into the store: one transaction for what ends with a document.

What a transaction holds (documents, tokens, text, new types, how far each
source was read) commits together, so a build that is killed goes on behind the
last committed document and counts nothing twice.
"""

from __future__ import annotations

import json
from dataclasses import dataclass, field, replace

import numpy as np

from colloc.build.annotating import Annotations, narrow
from colloc.build.batches import Entry
from colloc.build.repeats import Met
from colloc.build.segmenting import SegmentedBatch
from colloc.errors import DataError
from colloc.records import Anchors, DocumentRow, UInt32Array
from colloc.store import annotation, documents, facts, stream, texts
from colloc.store.inputs import sources
from colloc.store.inputs.repeats import remember
from colloc.store.opening import Store
from colloc.store.stream import Block
from colloc.store.vocabulary import TypeRegistry


@dataclass(slots=True)
class WriterTotals:
    """What went into the store so far in this run."""

    documents: int = 0
    tokens: int = 0
    sentences: int = 0
    dropped: int = 0
    repeated_documents: int = 0
    repeated_paragraphs: int = 0


@dataclass(slots=True)
class _OpenDocument:
    """A document of which parts are in the store, but not yet its end."""

    first_token: int
    first_character: int
    n_tokens: int = 0
    n_characters: int = 0


@dataclass(slots=True)
class StreamWriter:
    """Appends batches, in order, to a store open for writing.

    Type numbers are given in order of first appearance in the text, whichever
    worker met a type first, so the same input gives the same numbers.
    """

    store: Store
    registry: TypeRegistry
    totals: WriterTotals = field(default_factory=WriterTotals)
    _saved: WriterTotals = field(default_factory=WriterTotals)
    last_source: int = -1
    """Source of the last document that was finished."""
    _maps: dict[tuple[int, bool], list[UInt32Array]] = field(default_factory=dict)
    _open: _OpenDocument | None = None
    _closed: bool = True
    _next_token: int = -1
    _next_character: int = -1
    _next_document: int = -1
    _next_block: int = -1

    def __post_init__(self) -> None:
        self._next_token = stream.token_count(self.store)
        self._next_block = stream.block_count(self.store)
        self._next_character = texts.next_character(self.store)
        self._next_document = documents.next_document(self.store)

    def append(self, segmented: SegmentedBatch) -> None:
        """Write one batch inside the caller's transaction."""
        batch = segmented.batch
        mapping = self._mapping(segmented)
        tokens = mapping[segmented.tokens]
        present = np.sort(mapping[segmented.present])
        sentences = segmented.sentences
        if not batch.opening and self._closed and len(tokens):
            # The cut fell on a sentence end, which only the stretch before could see.
            sentences = np.union1d(np.zeros(1, dtype=np.int64), sentences)
        rows = self._rows(segmented, len(tokens))
        begins = np.array([entry.first for entry in batch.entries], dtype=bool)
        numbers = np.array([row.number for row in rows], dtype=np.int64)
        block = Block(
            number=self._next_block,
            first_token=self._next_token,
            tokens=tokens,
            sentences=sentences,
            paragraphs=segmented.paragraphs,
            document_starts=segmented.entry_tokens[begins],
            document_numbers=numbers[begins],
            continues=bool(len(tokens) and not begins[0] and (not len(sentences) or sentences[0] > 0)),
            anchors=Anchors(segmented.anchors.tokens, segmented.anchors.characters + self._next_character),
        )
        stream.append_block(self.store, block, present)
        texts.append_packed(self.store, self._next_character, segmented.texts)
        self._annotate(segmented.annotations, [row.number for row in rows])
        self._finish(batch.entries, rows)
        self._next_token += len(tokens)
        self._next_character += segmented.n_characters
        self._next_block += 1
        self._closed = segmented.closed
        self.totals.tokens += len(tokens)
        self.totals.sentences += len(sentences)
        self.totals.dropped += segmented.dropped

    @property
    def at_document_end(self) -> bool:
        """Whether all that was appended belongs to finished documents: where a commit may be."""
        return self._open is None

    def note_met(self, met: Met, document: int) -> None:
        """Remember hashes with a document, and count the repeats dropped before it or in it."""
        remember(self.store, document, met.digests)
        self.totals.repeated_documents += met.documents
        self.totals.repeated_paragraphs += met.paragraphs

    def save_totals(self) -> None:
        """Add what this run counted to the store's own totals, inside the caller's transaction."""
        for key, name in (
            ("sentences", "sentences"),
            ("dropped_tokens", "dropped"),
            ("repeated_documents", "repeated_documents"),
            ("repeated_paragraphs", "repeated_paragraphs"),
        ):
            unsaved = getattr(self.totals, name) - getattr(self._saved, name)
            facts.put(self.store, key, str(int(facts.get(self.store, key, "0")) + unsaved))
        self._saved = replace(self.totals)

    def _mapping(self, segmented: SegmentedBatch) -> UInt32Array:
        # A worker numbers annotated types apart from plain ones, and forgets both at once.
        annotated = segmented.batch.annotation is not None
        if segmented.restarted:
            self._maps.pop((segmented.worker, not annotated), None)
            self._maps.pop((segmented.worker, annotated), None)
        known = self._maps.setdefault((segmented.worker, annotated), [])
        if segmented.new_types:
            known.append(self.registry.number(segmented.new_types))
        if len(known) > 1:
            known[:] = [np.concatenate(known)]
        return known[0] if known else np.zeros(0, dtype=np.uint32)

    def _rows(self, segmented: SegmentedBatch, n_tokens: int) -> list[DocumentRow]:
        """One row an entry, with its place in the whole stream; parts of a document share a number."""
        bounds = np.append(segmented.entry_tokens, n_tokens)
        rows = []
        places = zip(
            segmented.batch.entries,
            bounds[:-1].tolist(),
            bounds[1:].tolist(),
            segmented.entry_characters.tolist(),
            segmented.entry_lengths.tolist(),
            strict=True,
        )
        for entry, start, end, character, length in places:
            if entry.first:
                self._open = _OpenDocument(self._next_token + start, self._next_character + character)
            if self._open is None:
                raise DataError(f"document {entry.identifier!r}: a part came without its beginning")
            opened = self._open
            opened.n_tokens += end - start
            opened.n_characters += length
            rows.append(
                DocumentRow(
                    number=self._next_document,
                    identifier=entry.identifier,
                    source=entry.source,
                    record=entry.record,
                    first_token=opened.first_token,
                    n_tokens=opened.n_tokens,
                    first_character=opened.first_character,
                    n_characters=opened.n_characters,
                    metadata=json.loads(entry.metadata),
                )
            )
            if entry.last:
                self._open = None
                self._next_document += 1
        return rows

    def _annotate(self, found: Annotations, documents: list[int]) -> None:
        """Columns of annotation and rests of the block that is being written; ``documents``: one an entry."""
        for name, column in found.columns.items():
            numbers = column
            if name in found.values:
                known = annotation.number_values(self.store, name, found.values[name])
                numbers = narrow(known[column])
            stream.append_column(self.store, self._next_block, name, numbers)
        if found.rests:
            rows = [(number, self._next_block, rest) for number, rest in zip(documents, found.rests, strict=True)]
            annotation.append_rests(self.store, rows)

    def _finish(self, entries: tuple[Entry, ...], rows: list[DocumentRow]) -> None:
        finished = [row for entry, row in zip(entries, rows, strict=True) if entry.last]
        documents.append_documents(self.store, finished)
        for source, records in {row.source: row.record + 1 for row in finished}.items():
            sources.note_records(self.store, source, records)
        for entry, row in zip(entries, rows, strict=True):
            self.note_met(entry.met, row.number)
            if entry.last and entry.repeat:
                documents.remove_document(self.store, row.number)
                self.totals.documents -= 1
        self.totals.documents += len(finished)
        if finished:
            self.last_source = finished[-1].source
