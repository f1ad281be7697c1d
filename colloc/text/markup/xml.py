"""XML without entities, DTD or network, as a stream of events, within bounds.

The parser is the standard library's expat. Nothing outside the file is ever
opened; a file that declares entities of its own is refused, as is nesting
deeper than `DEEPEST`, and a single tag or comment longer than `LARGEST_TAG`.
Names come without their namespaces, but for ``xml:id`` and its like.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from typing import NoReturn, Protocol
from xml.parsers import expat

from colloc.errors import DataError
from colloc.text.opening import Opened

DEEPEST = 256
"""Elements inside each other; libxml2 has the same limit."""
_MOST_KNOWN, _LONGEST_KNOWN = 512, 128
"""How many names are remembered, and of how many characters."""
_BUFFER = 2**16
_STEP = 2**16
LARGEST_TAG = 2**20
"""Characters of one tag, comment or declaration; a tag of more has hundreds of thousands of attributes."""
_XML = "http://www.w3.org/XML/1998/namespace "
_NO_ELEMENT = expat.errors.codes[expat.errors.XML_ERROR_NO_ELEMENTS]
_UNDEFINED = expat.errors.codes[expat.errors.XML_ERROR_UNDEFINED_ENTITY]


class Handler(Protocol):
    """Receives what an XML file holds, in order."""

    def start(self, name: str, attributes: Mapping[str, str]) -> None:
        """An element begins."""

    def end(self, name: str) -> None:
        """An element ends."""

    def text(self, data: str) -> None:
        """Text between tags, in pieces."""


class XmlParser:
    """Feeds one file's text to a handler.

    Parameters
    ----------
    opened : Opened
        For limits and messages.
    inside : str
        The member of an archive that is parsed, for messages.
    """

    def __init__(self, opened: Opened, handler: Handler, inside: str = "") -> None:
        self._opened = opened
        self._handler = handler
        self._inside = f"{inside}: " if inside else ""
        self._depth = 0
        self._since = 0
        """Characters fed since the last event."""
        self._names, self._attributes = _Known(_local), _Known(_attribute)
        # No shared dictionary of names: a file with endless different names must not fill it.
        parser = expat.ParserCreate(namespace_separator=" ", intern={})
        parser.buffer_text = True
        parser.buffer_size = _BUFFER
        parser.SetParamEntityParsing(expat.XML_PARAM_ENTITY_PARSING_NEVER)
        parser.StartElementHandler = self._start
        parser.EndElementHandler = self._end
        parser.CharacterDataHandler = self._text
        parser.EntityDeclHandler = self._entity
        parser.SkippedEntityHandler = self._skipped
        parser.ExternalEntityRefHandler = self._external
        self._parser = parser

    def feed(self, data: str) -> None:
        """Parse more of the file.

        Raises
        ------
        DataError
            ``file:line: ...`` for what is no XML, declares or uses entities, or passes a limit.
        """
        for start in range(0, len(data), _STEP):
            part = data[start : start + _STEP]
            self._since += len(part)
            self._parse(part, False)
            if self._since > LARGEST_TAG:
                self.fail(f"one tag, comment or declaration of more than {LARGEST_TAG:,} characters; check the file")

    def close(self) -> None:
        """Say that the file has ended; DataError where it may not end there."""
        self._parse("", True)

    def _parse(self, data: str, final: bool) -> None:
        try:
            self._parser.Parse(data, final)
        except expat.ExpatError as error:
            if error.code == _UNDEFINED:
                self._refuse_entity("uses an entity that XML does not know")
            if final and error.code == _NO_ELEMENT:
                raise self._error("not XML, or cut off: it ends before its elements do", error.lineno) from error
            raise self._error(f"not XML: {expat.ErrorString(error.code)}; correct the file", error.lineno) from error

    def fail(self, message: str) -> NoReturn:
        """Raise a DataError that names file and line."""
        raise self._error(message, self._parser.CurrentLineNumber)

    def _error(self, message: str, line: int) -> DataError:
        return self._opened.error(f"{self._inside}{message}", line)

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        self._since = 0
        self._depth += 1
        if self._depth > DEEPEST:
            self.fail(f"more than {DEEPEST} elements inside each other; no text needs that, check the file")
        names = self._attributes
        self._handler.start(self._names[name], {names[key]: value for key, value in attributes.items()})

    def _end(self, name: str) -> None:
        self._since = 0
        self._depth -= 1
        self._handler.end(self._names[name])

    def _text(self, data: str) -> None:
        self._since = 0
        self._handler.text(data)

    def _refuse_entity(self, does: str) -> NoReturn:
        self.fail(f"the file {does}; entities are not read: replace them by the characters they stand for")

    def _entity(self, name: str, *_: object) -> None:
        self._refuse_entity(f"declares the entity {name[:40]!r}")

    def _skipped(self, name: str, _: bool) -> None:
        self._refuse_entity(f"uses the entity {name[:40]!r}")

    def _external(self, *_: object) -> int:
        self._refuse_entity("uses an entity of another file")


class _Known(dict[str, str]):
    """What names are made into; some are remembered."""

    def __init__(self, make: Callable[[str], str]) -> None:
        self._make = make

    def __missing__(self, name: str) -> str:
        made = self._make(name)
        if len(self) < _MOST_KNOWN and len(name) < _LONGEST_KNOWN:
            self[name] = made
        return made


def _local(name: str) -> str:
    return name.rpartition(" ")[2]


def _attribute(name: str) -> str:
    return f"xml:{name.removeprefix(_XML)}" if name.startswith(_XML) else _local(name)


def parse(opened: Opened, pieces: Iterable[str], handler: Handler, inside: str) -> None:
    """Parse a whole small file."""
    parser = XmlParser(opened, handler, inside)
    for piece in pieces:
        parser.feed(piece)
    parser.close()
