"""Documents into batches: the unit of work of segmenting, and later one block of the token stream.

A batch is a stretch of text with the documents that lie in it, joined by a
hard break. Batches end where documents end, except inside a document longer
than ``BATCH_CHARACTERS``, which is cut by ``safe_cut``. Where batches end
depends on the input only, never on the number of processes, so that the store's
content does not either.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field
from typing import Protocol

from colloc.build.repeats import NOTHING_MET, Met, Repeats
from colloc.errors import UsageError
from colloc.records import Annotation, Document
from colloc.settings import SegmentSettings
from colloc.tokens.cutting import is_hard_break, safe_cut

BATCH_CHARACTERS = 2 * 2**20
SEPARATOR = "\n\n"
"""Stands between documents: a hard break in every setting."""


@dataclass(frozen=True, slots=True)
class Entry:
    """One document, or a part of one, inside a batch."""

    identifier: str
    metadata: str
    """JSON object."""
    source: int
    record: int
    start: int
    """Code point in the batch's text, byte of its lines."""
    length: int
    first: bool
    """Whether the document begins here."""
    last: bool
    """Whether the document ends here."""
    met: Met = NOTHING_MET
    """Content hashes to remember with the document, and repeats dropped before it or in it."""
    repeat: bool = False
    """A long document that turned out, at its end, to be an exact repeat: to be taken out again."""
    line: int = 1
    """Number of its first line in its source, where it is annotated."""


@dataclass(frozen=True, slots=True)
class Batch:
    """A stretch of text to segment.

    ``opening``: whether a sentence begins at its start for certain; where not,
    the stretch before says so. ``following``: the code point after its end.
    ``annotation``: what the columns of the lines hold where the text is
    annotated; such text is whole sentences of documents of one source, and
    stands, in UTF-8, in ``lines``.
    """

    text: str
    entries: tuple[Entry, ...]
    opening: bool = True
    following: str = ""
    annotation: Annotation | None = None
    lines: bytes = b""


@dataclass(slots=True)
class _Growing:
    """The batch being filled."""

    parts: list[str] = field(default_factory=list)
    lines: list[bytes] = field(default_factory=list)
    entries: list[Entry] = field(default_factory=list)
    length: int = 0
    opening: bool = True
    annotation: Annotation | None = None

    def append(self, text: str | bytes) -> tuple[int, int]:
        """Where the text, or lines of annotated text, begin in the batch, and their length."""
        start = self.length
        if isinstance(text, str):
            self.parts.append(text)
        else:
            self.lines.append(text)
        self.length += len(text)
        return start, len(text)

    def close(self, following: str = "") -> Batch:
        batch = Batch(
            "".join(self.parts),
            tuple(self.entries),
            self.opening,
            following,
            self.annotation,
            b"".join(self.lines),
        )
        self.parts, self.lines, self.entries, self.length, self.opening = [], [], [], 0, True
        return batch


class _Enter(Protocol):
    def __call__(self, text: str | bytes, *, first: bool, last: bool, repeat: bool = False, line: int = 1) -> None: ...


Numbered = tuple[int, Document]
"""Number of the source, document."""


class Batcher:
    """Fills batches from documents.

    Parameters
    ----------
    settings : SegmentSettings
    repeats : Repeats
        Finds exact repeats, where they are to be dropped.
    """

    def __init__(self, settings: SegmentSettings, repeats: Repeats) -> None:
        self._settings = settings
        self._repeats = repeats

    def batches(self, documents: Iterable[Numbered]) -> Iterator[Batch]:
        """Batches in the order of the documents."""
        growing = _Growing()
        for source, document in documents:
            if growing.entries and not _alike(growing.annotation, document.annotation):
                yield growing.close()
            growing.annotation = document.annotation
            fill = self._document if document.annotation is None else self._annotated
            yield from fill(growing, source, document)
            if growing.length >= BATCH_CHARACTERS:
                yield growing.close()
        if growing.entries:
            yield growing.close()

    def _annotated(self, growing: _Growing, source: int, document: Document) -> Iterator[Batch]:
        """Pieces of annotated text hold whole sentences: a batch ends behind one of them."""
        if self._repeats.mode == "paragraph":
            raise UsageError("--skip-duplicates paragraph is for plain text: annotated text has no paragraphs to drop")
        assert document.annotation is not None
        enter = self._entering(growing, source, document)
        line = document.annotation.line
        fingerprint = self._repeats.fingerprint()
        first, size = True, 0
        waiting: list[bytes] = []
        for piece in document.sentences:
            fingerprint.update(piece)
            if waiting and growing.length + size + len(piece) > BATCH_CHARACTERS:
                if first and growing.entries:
                    # A long document begins a batch of its own, so that what precedes it can be committed.
                    yield growing.close()
                if not first or size + len(piece) > BATCH_CHARACTERS:
                    whole = b"".join(waiting)
                    enter(whole, first=first, last=False, line=line)
                    yield growing.close()
                    line += whole.count(b"\n")
                    first, size = False, 0
                    waiting.clear()
            waiting.append(piece)
            size += len(piece)
        repeat = self._repeats.is_repeat(fingerprint)
        if not (repeat and first):
            enter(b"".join(waiting), first=first, last=True, repeat=repeat, line=line)

    def _document(self, growing: _Growing, source: int, document: Document) -> Iterator[Batch]:
        first = True
        waiting = ""
        fingerprint = self._repeats.fingerprint()

        enter = self._entering(growing, source, document)
        for piece in self._repeats.without_paragraphs(document.pieces):
            fingerprint.update(piece)
            waiting += piece
            done = 0
            while len(waiting) - done > BATCH_CHARACTERS:
                if first and growing.entries:
                    # A long document begins a batch of its own, so that what precedes it can be committed.
                    yield growing.close()
                # The rest of a long piece stays where it is: cutting it off would copy all of it for each batch.
                near = waiting[done : done + BATCH_CHARACTERS + 1]
                cut = safe_cut(near[:BATCH_CHARACTERS], self._settings, BATCH_CHARACTERS // 2) or BATCH_CHARACTERS
                enter(near[:cut], first=first, last=False)
                hard = is_hard_break(near[: cut + 1], cut, self._settings)
                yield growing.close(following=near[cut : cut + 1])
                growing.opening = hard
                done, first = done + cut, False
            if done:
                waiting = waiting[done:]
        repeat = self._repeats.is_repeat(fingerprint)
        if repeat and first:
            return
        enter(waiting, first=first, last=True, repeat=repeat)
        growing.append(SEPARATOR)

    def _entering(self, growing: _Growing, source: int, document: Document) -> _Enter:
        """What puts a part of the document into the growing batch."""
        metadata = json.dumps(dict(document.metadata), ensure_ascii=False)

        def enter(text: str | bytes, *, first: bool, last: bool, repeat: bool = False, line: int = 1) -> None:
            start, length = growing.append(text)
            growing.entries.append(
                Entry(
                    identifier=document.identifier,
                    metadata=metadata,
                    source=source,
                    record=document.record,
                    start=start,
                    length=length,
                    first=first,
                    last=last,
                    met=self._repeats.take_new(),
                    repeat=repeat,
                    line=line,
                )
            )

        return enter


def _alike(one: Annotation | None, other: Annotation | None) -> bool:
    """Whether documents can stand in one batch."""
    if one is None or other is None:
        return one is other
    return one.columns == other.columns and one.source == other.source
