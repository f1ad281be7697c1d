"""EPUB: one document a book, its pages in the order of reading.

``META-INF/container.xml`` names the package document, whose spine lists the
pages; these are read as HTML. Pages that the package calls its table of
contents (``nav``) are left out. Title, author, language and date of the
package are metadata. Source: EPUB 3.3 (W3C), sections 4.2.6.3.1 and 5.
"""

from __future__ import annotations

import posixpath
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from urllib.parse import unquote

from colloc.records import Document, MetaValue
from colloc.text.markup.archive import Archive, open_archive
from colloc.text.markup.flow import PARAGRAPH_END
from colloc.text.markup.html import LONGEST_FIELD, Page, as_html
from colloc.text.markup.xml import parse
from colloc.text.opening import Opened

_CONTAINER = "META-INF/container.xml"
_ENCRYPTION = "META-INF/encryption.xml"
_PAGES = ("application/xhtml+xml", "text/html", "application/xml", "text/xml")
_METADATA = {"title": "title", "creator": "author", "language": "lang", "date": "date"}


@dataclass
class _Container:
    """Where the package document lies, or which members are encrypted."""

    paths: list[str] = field(default_factory=list)

    def start(self, name: str, attributes: Mapping[str, str]) -> None:
        if name == "rootfile" and "full-path" in attributes:
            self.paths.append(attributes["full-path"])
        elif name == "CipherReference" and "URI" in attributes:
            self.paths.append(unquote(attributes["URI"]))

    def end(self, name: str) -> None: ...

    def text(self, data: str) -> None: ...


@dataclass
class _Package:
    """Metadata, manifest and spine."""

    metadata: dict[str, MetaValue] = field(default_factory=dict)
    pages: dict[str, str] = field(default_factory=dict)
    spine: list[str] = field(default_factory=list)
    _name: str = ""
    _text: str = ""

    def start(self, name: str, attributes: Mapping[str, str]) -> None:
        self._name, self._text = name, ""
        if name == "item" and attributes.get("media-type", "").lower() in _PAGES:
            if "nav" not in attributes.get("properties", "").split():
                self.pages[attributes.get("id", "")] = attributes.get("href", "")
        elif name == "itemref":
            self.spine.append(attributes.get("idref", ""))

    def end(self, name: str) -> None:
        value = " ".join(self._text.split())
        if name in _METADATA and name == self._name and value:
            self.metadata.setdefault(_METADATA[name], value)

    def text(self, data: str) -> None:
        if self._name in _METADATA and len(self._text) < LONGEST_FIELD:
            self._text += data


def read(opened: Opened, skip: int) -> Iterator[Document]:
    """The book as one document, unless it is to be skipped.

    Raises
    ------
    DataError
        An archive that is damaged, encrypted, too large, or no EPUB.
    MissingExtraError
        Without lxml.
    """
    if skip:
        return
    with open_archive(opened) as archive:
        container = _Container()
        if _CONTAINER not in archive:
            raise opened.error(f"no EPUB: it has no {_CONTAINER}")
        parse(opened, archive.text(_CONTAINER), container, _CONTAINER)
        if not container.paths:
            raise opened.error(f"{_CONTAINER}: names no package document")
        root = container.paths[0]
        package = _Package()
        parse(opened, archive.text(root), package, root)
        pages = _reading_order(opened, archive, root, package)
        metadata = {**package.metadata, **opened.metadata}
        identifier = metadata.pop("id", None)
        name = opened.identifier if identifier is None else str(identifier)
        yield Document(name, metadata, _text(archive, pages), 0)


def _reading_order(opened: Opened, archive: Archive, root: str, package: _Package) -> list[str]:
    """Names of the pages in the archive; a name that leads out of it is none of its members."""
    encrypted = _Container()
    if _ENCRYPTION in archive:
        parse(opened, archive.text(_ENCRYPTION), encrypted, _ENCRYPTION)
    folder = posixpath.dirname(root)
    pages = []
    for reference in package.spine:
        if reference not in package.pages:
            continue
        href = package.pages[reference]
        # Names with a percent sign in them stand there quoted or not.
        named = [posixpath.normpath(posixpath.join(folder, name)) for name in (unquote(href), href)]
        page = next((name for name in named if name in archive), named[0])
        if page in encrypted.paths:
            raise opened.error(f"{page}: encrypted (copy protection); only books without it can be read")
        pages.append(page)
    if not pages:
        raise opened.error(f"{root}: lists no pages to read")
    return list(dict.fromkeys(pages))


def _text(archive: Archive, pages: list[str]) -> Iterator[str]:
    for page in pages:
        yield from Page(as_html(archive.text(page))).text()
        yield PARAGRAPH_END
