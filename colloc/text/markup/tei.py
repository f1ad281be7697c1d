"""TEI P5: one document a ``TEI`` element, its body as text or as the words that it marks.

Where the body marks words (``w``), the document is annotated: ``lemma`` and
``pos`` of each word are kept (``pos`` as the word class), ``pc`` are words of
class PUNCT where they name none, ``s`` are the sentences (without any, each
paragraph is one), and text outside of words is divided at spaces. Else the body
is plain text. See :class:`colloc.text.markup.teibody.Body` for what is read.

Metadata come from the header by XPath 1.0 (``meta_xpath``, ``name=XPath``),
elements without namespace: ``year=//publicationStmt/date/@when``. Of several
results all are kept, joined by "; ". Source: TEI P5 Guidelines, chapters 2, 3
and 17; attributes of ``att.linguistic``.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Callable, Iterator, Mapping
from typing import Any, NoReturn

from colloc.errors import MissingExtraError, UsageError
from colloc.records import Annotation, Document, MetaValue
from colloc.text.markup.html import declared_encoding
from colloc.text.markup.teibody import COLUMNS, Body
from colloc.text.markup.xml import XmlParser
from colloc.text.metadata import typed
from colloc.text.opening import Opened

_ROOTS = ("TEI", "teiCorpus", "TEI.2")
_UNDECIDED = 2**18
"""Characters of a body without words after which it is taken for plain text."""


class MetaPaths:
    """What the user wants to know of a header.

    Raises
    ------
    UsageError
        For what is not ``name=XPath``, or no XPath.
    MissingExtraError
        Without lxml, where there is a path.
    """

    def __init__(self, paths: tuple[str, ...]) -> None:
        self._paths: dict[str, Any] = {}
        for given in paths:
            name, equals, path = given.partition("=")
            if not equals or not name.strip() or not path.strip():
                raise UsageError(f"{given!r} is not name=XPath, such as year=//publicationStmt/date/@when")
            self._paths[name.strip()] = _compiled(path)

    def __bool__(self) -> bool:
        return bool(self._paths)

    def find(self, header: Any) -> dict[str, MetaValue]:
        """Values found in a header; a name without any is left out."""
        from lxml import etree

        values: dict[str, MetaValue] = {}
        for name, path in self._paths.items():
            try:
                result = path(header)
            except etree.XPathError as error:
                raise UsageError(f"the XPath {path.path!r} cannot be followed: {error}") from error
            found = [" ".join(_string(item).split()) for item in (result if isinstance(result, list) else [result])]
            text = "; ".join(dict.fromkeys(filter(None, found)))
            if text:
                values[name] = typed(text)
        return values


def _compiled(path: str) -> Any:
    try:
        from lxml import etree
    except ImportError as error:
        raise MissingExtraError("metadata by XPath need lxml: pip install 'colloc[markup]'") from error
    try:
        return etree.XPath(path, regexp=False)
    except etree.XPathError as error:
        raise UsageError(f"{path!r} is not XPath 1.0: {error}") from error


def _string(item: Any) -> str:
    if hasattr(item, "itertext"):
        return "".join(item.itertext())
    if isinstance(item, float) and item.is_integer():
        return str(int(item))
    return str(item)


class _Header:
    """A ``teiHeader`` as a tree without namespaces."""

    def __init__(self) -> None:
        from lxml import etree

        self._builder = etree.TreeBuilder()

    def start(self, name: str, attributes: Mapping[str, str]) -> None:
        xml = "{http://www.w3.org/XML/1998/namespace}"
        self._builder.start(name, {key.replace("xml:", xml): value for key, value in attributes.items()})

    def text(self, data: str) -> None:
        self._builder.data(data)

    def end(self, name: str) -> None:
        self._builder.end(name)

    def close(self) -> Any:
        return self._builder.close()


class _Begin:
    """A document begins: what its header says, and whether its words are marked."""

    def __init__(self, identifier: str | None, metadata: dict[str, MetaValue], annotated: bool) -> None:
        self.identifier = identifier
        self.metadata = metadata
        self.annotated = annotated


class _Handler:
    """Turns elements into a queue of beginnings and pieces of text; a beginning ends the document before."""

    def __init__(self, paths: MetaPaths, largest: int) -> None:
        self.queue: deque[_Begin | str] = deque()
        self.fail: Callable[[str], NoReturn]
        """Says what makes the file unreadable, and where; set by who has the parser."""
        self._paths = paths
        self._largest = largest
        self._enough = min(_UNDECIDED, largest)
        """Characters that are handed on at once."""
        self._header: _Header | None = None
        self._header_depth = 0
        self._header_size = 0
        self._root = True
        self._identifier: str | None = None
        self._metadata: dict[str, MetaValue] = {}
        self._inherited: dict[str, MetaValue] = {}
        self._in_document = False
        self._body: Body | None = None
        self._announced = self._annotated = False

    def start(self, name: str, attributes: Mapping[str, str]) -> None:
        if self._root:
            self._root = False
            if name not in _ROOTS:
                self.fail(f"no TEI: its outermost element is {name[:40]!r}; leave the file out")
        if self._header_depth:
            self._in_header(name, attributes)
        elif self._body is not None:
            self._body.start(name, attributes)
            if self._body.size > self._enough or not self._announced:
                self._drain()
        elif name == "teiHeader":
            self._header = _Header() if self._paths else None
            self._header_size = 0
            self._in_header(name, attributes)
        elif name in ("TEI", "TEI.2"):
            self._begin_document(attributes)
        elif name == "body" and self._in_document:
            self._body = Body(self._announced and self._annotated)
            if self._announced:
                self._body.decide(self._annotated)

    def _begin_document(self, attributes: Mapping[str, str]) -> None:
        self._in_document = True
        self._announced = self._annotated = False
        self._identifier = attributes.get("xml:id")
        self._metadata = dict(self._inherited)

    def _in_header(self, name: str, attributes: Mapping[str, str]) -> None:
        self._header_depth += 1
        self._header_size += len(name) + sum(len(key) + len(value) for key, value in attributes.items())
        if self._header is not None:
            self._header.start(name, attributes)

    def text(self, data: str) -> None:
        if self._header_depth:
            self._header_size += len(data)
            if self._header_size > self._largest:
                self.fail(f"a header of more than {self._largest:,} characters (max_record)")
            if self._header is not None:
                self._header.text(data)
        elif self._body is not None:
            self._body.text(data)
            if self._body.size > self._enough or not self._announced:
                self._drain()

    def end(self, name: str) -> None:
        if self._header_depth:
            self._header_depth -= 1
            if self._header is not None:
                self._header.end(name)
            if not self._header_depth:
                self._end_header()
        elif self._body is not None:
            if self._body.at_end(name):
                self._body.close()
                self._drain(final=True)
                self._body = None
            else:
                self._body.end(name)
        elif name in ("TEI", "TEI.2") and self._in_document:
            self._announce(False)
            self._in_document = False

    def _end_header(self) -> None:
        found = self._paths.find(self._header.close()) if self._header is not None else {}
        self._header = None
        if self._in_document:
            self._metadata |= found
        else:
            # A corpus's own header speaks of all its texts.
            self._inherited = found

    def _announce(self, annotated: bool) -> None:
        if not self._announced:
            self.queue.append(_Begin(self._identifier, self._metadata, annotated))
            self._announced, self._annotated = True, annotated

    def _drain(self, final: bool = False) -> None:
        """Hand on what the body has, once it is clear whether it marks words."""
        body = self._body
        assert body is not None
        if not self._announced:
            if not body.marks_words and body.size < _UNDECIDED and not final:
                return
            self._announce(body.marks_words)
            body.decide(self._annotated)
        if final or body.size > self._enough:
            piece = body.take(self._annotated)
            if piece:
                self.queue.append(piece)
            if body.size > self._largest:
                self.fail(f"a sentence or note of more than {self._largest:,} characters (max_record)")


class _Documents:
    """Documents out of a file, parsed as they are asked for."""

    def __init__(self, opened: Opened) -> None:
        self._opened = opened
        paths = MetaPaths(opened.settings.meta_xpath)
        self._handler = _Handler(paths, opened.settings.max_record)
        self._parser = XmlParser(opened, self._handler)
        self._handler.fail = self._parser.fail
        self._pieces = opened.text(declared=declared_encoding)
        self._ended = False
        self._record = 0

    def read(self, skip: int) -> Iterator[Document]:
        while self._fill():
            begin = self._handler.queue.popleft()
            assert isinstance(begin, _Begin)
            pieces = self._document()
            if self._record >= skip:
                yield self._made(begin, pieces)
            for _ in pieces:
                pass
            self._record += 1

    def _made(self, begin: _Begin, pieces: Iterator[str]) -> Document:
        opened, record = self._opened, self._record
        metadata = {**opened.metadata, **begin.metadata}
        given = metadata.pop("id", None)
        name = begin.identifier or (f"{opened.identifier}:{record + 1}" if record else opened.identifier)
        identifier = str(given) if given is not None else name
        if not begin.annotated:
            return Document(identifier, metadata, pieces, record)
        sentences = map(str.encode, pieces)
        return Document(identifier, metadata, (), record, Annotation(COLUMNS, opened.name), sentences)

    def _document(self) -> Iterator[str]:
        while self._fill() and isinstance(self._handler.queue[0], str):
            piece = self._handler.queue.popleft()
            assert isinstance(piece, str)
            yield piece

    def _fill(self) -> bool:
        """Parse until something is in the queue; False at the end of the file."""
        while not self._handler.queue and not self._ended:
            piece = next(self._pieces, None)
            if piece is None:
                self._ended = True
                self._parser.close()
            else:
                self._parser.feed(piece)
        return bool(self._handler.queue)


def read(opened: Opened, skip: int) -> Iterator[Document]:
    """The documents of a file from record ``skip`` on.

    Raises
    ------
    DataError
        ``file:line: ...`` for what is not XML or not TEI, and for entities.
    UsageError
        For a wrong XPath.
    """
    return _Documents(opened).read(skip)
