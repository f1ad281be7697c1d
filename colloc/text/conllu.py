"""CoNLL-U, CoNLL-U Plus and tables of words: documents of annotated sentences.

CoNLL-U has ten columns; in CoNLL-U Plus a first line ``# global.columns = ID
FORM ...`` names them; a table of words (format ``tokens``) names them in a
header line, as tab-separated values do. Sentences end with a blank line. A
document begins at the sentence whose comments hold ``# newdoc``; what comes
before the first is a document too, and so is a file without any. Comments
``# meta::KEY = VALUE`` of a document's first sentence become metadata.

Only whole sentences are handed on, as bytes: what their lines say is read by
:mod:`colloc.tokens.annotated`, in the processes that segment.
Source: universaldependencies.org, "CoNLL-U Format" and "CoNLL-U Plus Format".
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import chain, pairwise

from colloc.records import CONLLU_COLUMNS, Annotation, Document, MetaValue
from colloc.text.lines import too_long
from colloc.text.metadata import typed
from colloc.text.opening import Opened

TABLE = "tokens"
"""The format whose first line is a header."""
MOST_COLUMNS = 64
LONGEST_HEADER = 4096

_GLOBAL_COLUMNS = re.compile(r"#[ \t]*global\.columns[ \t]*=[ \t]*(.*)")
_NEWDOC = b"newdoc"
_NEW_DOCUMENT = re.compile(r"^#[ \t]*newdoc\b(?:[ \t]+id[ \t]*=[ \t]*(.*))?", re.MULTILINE)
_META = re.compile(r"^#[ \t]*meta::([^\s=]+)[ \t]*=[ \t]*(.*)$", re.MULTILINE)


@dataclass(frozen=True, slots=True)
class _Stretch:
    """Whole sentences of one document."""

    text: bytes
    line: int
    opens: bool
    """Whether the document begins here."""


def read(opened: Opened, skip: int) -> Iterator[Document]:
    """The documents of a file from record ``skip`` on.

    Raises
    ------
    DataError
        ``file:line: ...`` for a wrong header, or a sentence larger than ``max_record``.
    """
    pieces = _line_feeds(opened.utf8())
    first, pieces = _first_line(pieces)
    columns, header = _columns(opened, first)
    place = _Place()
    documents = _Documents(_by_document(_whole_sentences(opened, pieces, place), place, header))
    yield from documents.read(opened, columns, skip)


@dataclass(slots=True)
class _Place:
    """Number of the line where what has not been handed on begins."""

    line: int = 1


class _Documents:
    """Stretches grouped into documents, one stretch read ahead."""

    def __init__(self, stretches: Iterator[_Stretch]) -> None:
        self._stretches = stretches
        self._next = next(stretches, None)

    def read(self, opened: Opened, columns: tuple[str, ...], skip: int) -> Iterator[Document]:
        record = 0
        while (first := self._next) is not None:
            pieces = self._pieces()
            if record >= skip:
                yield _document(opened, columns, record, first, pieces)
            for _ in pieces:
                pass
            record += 1

    def _pieces(self) -> Iterator[bytes]:
        opening = True
        while (stretch := self._next) is not None and (opening or not stretch.opens):
            opening = False
            yield stretch.text
            self._next = next(self._stretches, None)


def _document(
    opened: Opened, columns: tuple[str, ...], record: int, first: _Stretch, sentences: Iterator[bytes]
) -> Document:
    comments = _decoded(first.text[: _end_of_comments(first.text)])
    found = _NEW_DOCUMENT.search(comments)
    metadata: dict[str, MetaValue] = dict(opened.metadata)
    metadata.update((key, typed(value.strip())) for key, value in _META.findall(comments))
    given = metadata.pop("id", None)
    if found is not None:
        name = (found[1] or "").strip() or f"{opened.identifier}:{record + 1}"
    elif record == 0 and given is not None:
        name = str(given)
    else:
        name = opened.identifier if record == 0 else f"{opened.identifier}:{record + 1}"
    return Document(name, metadata, (), record, Annotation(columns, opened.name, first.line), sentences)


def _decoded(text: bytes) -> str:
    """Text that has been found to be UTF-8; the first line may be cut in the middle of a character."""
    return text.decode(errors="ignore")


def _end_of_comments(text: bytes) -> int:
    """Where the first line stands that is neither a comment nor blank."""
    end = 0
    while end < len(text) and text[end] in b"#\n":
        stop = text.find(b"\n", end)
        end = len(text) if stop < 0 else stop + 1
    return end


def _line_feeds(pieces: Iterator[bytes]) -> Iterator[bytes]:
    """The text with CR LF as LF."""
    held = b""
    for piece in pieces:
        text = held + piece
        if b"\r" not in text:
            held = b""
            yield text
            continue
        held = b"\r" if text.endswith(b"\r") else b""
        yield text.removesuffix(b"\r").replace(b"\r\n", b"\n")
    if held:
        yield held


def _first_line(pieces: Iterator[bytes]) -> tuple[str, Iterator[bytes]]:
    """The beginning of the first line, and the whole text again."""
    taken: list[bytes] = []
    size = 0
    for piece in pieces:
        taken.append(piece)
        size += len(piece)
        if b"\n" in piece or size > LONGEST_HEADER:
            break
    text = b"".join(taken)
    return _decoded(text.partition(b"\n")[0]), chain([text], pieces)


def _columns(opened: Opened, first: str) -> tuple[tuple[str, ...], int]:
    """Names of the columns, and how many lines at the beginning say so."""
    if opened.format == TABLE:
        given = first.split("\t", MOST_COLUMNS)
    elif match := _GLOBAL_COLUMNS.fullmatch(first.rstrip()):
        given = match[1].split()
    else:
        return CONLLU_COLUMNS, 0
    names = tuple(name.strip().lower() for name in given)
    if len(names) > MOST_COLUMNS or len(first) > LONGEST_HEADER:
        raise opened.error(f"more than {MOST_COLUMNS} columns, or their names too long: leave some out", 1)
    for name in names:
        if not name:
            raise opened.error("a column has no name in the first line; name it", 1)
        if names.count(name) > 1:
            raise opened.error(f"column {name!r} occurs {names.count(name)} times in the first line; rename one", 1)
    if "form" not in names:
        raise opened.error(
            f"no column 'form' (columns: {', '.join(names[:10])}): the first line names the columns, "
            "such as form, lemma, upos",
            1,
        )
    return names, 1


def _whole_sentences(opened: Opened, pieces: Iterator[bytes], place: _Place) -> Iterator[bytes]:
    """The text in stretches that end with a sentence."""
    held: list[bytes] = []
    size = 0
    for piece in pieces:
        split = b"\n\n" in piece or (piece.startswith(b"\n") and bool(held) and held[-1].endswith(b"\n"))
        held.append(piece)
        size += len(piece)
        if split:
            text = b"".join(held)
            end = text.rindex(b"\n\n") + 2
            held = [text[end:]] if end < len(text) else []
            size = len(text) - end
            yield text[:end]
        if size > opened.settings.max_record:
            raise too_long(opened, place.line)
    if held:
        yield b"".join(held).rstrip(b"\n") + b"\n\n"


def _by_document(stretches: Iterator[bytes], place: _Place, header: int) -> Iterator[_Stretch]:
    """The same stretches without the header, cut where documents begin."""
    opens = True
    for text in stretches:
        if header and place.line == 1:
            text, place.line = text.partition(b"\n")[2], 2
        begins = _document_starts(text)
        if opens and begins and _end_of_comments(text) >= begins[0]:
            # comments above the first document belong to it
            del begins[0]
        edges = [0, *begins, len(text)]
        for begin, stop in pairwise(edges):
            if begin < stop:
                yield _Stretch(text[begin:stop], place.line, opens or begin in begins)
                place.line += text.count(b"\n", begin, stop)
                opens = False


def _document_starts(text: bytes) -> list[int]:
    """Where the sentences begin whose comments say that a document does, ascending."""
    found: dict[int, None] = {}
    place = text.find(_NEWDOC)
    while place >= 0:
        stop = text.find(b"\n", place)
        stop = len(text) if stop < 0 else stop
        start = text.rfind(b"\n", 0, place) + 1
        if text.startswith(b"#", start) and _NEW_DOCUMENT.match(_decoded(text[start:stop])):
            found[_sentence_start(text, start)] = None
        # a line is looked at once, whatever it holds
        place = text.find(_NEWDOC, stop)
    return [*found]


def _sentence_start(text: bytes, place: int) -> int:
    """Where the sentence, or the block of comments, begins that holds a place."""
    reach = 256
    while reach < place:
        end = text.rfind(b"\n\n", place - reach, place)
        if end >= 0:
            return end + 2
        reach *= 4
    end = text.rfind(b"\n\n", 0, place)
    return 0 if end < 0 else end + 2
