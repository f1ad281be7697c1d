"""HTML: one document a page, as text.

The page is read as a stream of tags by libxml2's HTML tokenizer, which mends
what is broken as browsers do; no tree is built, so memory does not grow with
the page and nesting may be as deep as it likes. Block elements become
paragraphs, runs of white space one space. Left out is what is no running text:
scripts, styles, templates, pictures and films, form controls, elements marked
``hidden``, the readings above ruby text. ``br`` is a space, two of them end the
paragraph; ``pre`` keeps its lines. Title, author and language of the page are
metadata.

Block elements: HTML Living Standard, section 15.3 (Rendering, flow content).
The encoding is the one that the settings name; where they name none, the one
the page declares (section 13.2.3.2, prescan), else UTF-8.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from typing import Any

from colloc.errors import MissingExtraError
from colloc.records import Document, MetaValue
from colloc.text.markup.flow import Flow
from colloc.text.opening import Opened

_BLOCK_NAMES = (
    "address article aside blockquote body center dd details dialog dir div dl dt fieldset figcaption figure footer "
    "form frameset h1 h2 h3 h4 h5 h6 header hgroup hr html legend li listing main menu nav ol optgroup option p "
    "plaintext pre search section summary table caption colgroup col tbody thead tfoot tr td th ul xmp"
)
_LEFT_OUT_NAMES = (
    "applet audio button canvas datalist embed head iframe input map math noembed noframes noscript object picture rp "
    "rt rtc script select style svg template textarea video"
)
_VOID_NAMES = "area base br col embed hr img input link meta param source track wbr"
BLOCKS = frozenset(_BLOCK_NAMES.split())
LEFT_OUT = frozenset(_LEFT_OUT_NAMES.split())
VERBATIM = frozenset(("pre", "listing", "plaintext", "xmp"))
LONGEST_FIELD = 4096
"""Characters of a title or another piece of metadata that are kept."""

_CHARSET = re.compile(rb"""<meta[^>]{0,200}?charset\s*=\s*["']?\s*([A-Za-z0-9._:-]{1,40})""", re.IGNORECASE)
_XML_ENCODING = re.compile(rb"""^\s*<\?xml[^>]{0,100}?encoding\s*=\s*["']([A-Za-z0-9._:-]{1,40})["']""")
_PRESCAN = 1024
_LONGEST_TAG = 2**16
_SELF_CLOSED = re.compile(r"<([A-Za-z][A-Za-z0-9:._-]*)((?:[^<>\"']|\"[^\"<]*\"|'[^'<]*')*)/>")
_VOID = frozenset(
    ["area", "base", "br", "col", "embed", "hr", "img", "input", "link", "meta", "param", "source", "track", "wbr"]
)
_NAMED = ("author", "dc.title", "dc.creator", "dc.date", "dc.language", "date", "keywords")


def declared_encoding(head: bytes) -> str | None:
    """The encoding that a page or an XML file declares in its first bytes, or None."""
    found = _XML_ENCODING.match(head) or _CHARSET.search(head[:_PRESCAN])
    if found is None:
        return None
    name = found[1].decode("ascii").lower()
    # The standard's labels: a page that can be read so far is no UTF-16, and Latin-1 means Windows-1252.
    if name.startswith("utf-16"):
        return "utf-8"
    return "cp1252" if name in ("iso-8859-1", "latin1", "us-ascii", "ascii") else name


def close_tags(text: str) -> str:
    """XHTML's ``<a/>`` as ``<a></a>``, which HTML does not know."""
    return _SELF_CLOSED.sub(
        lambda found: found[0] if found[1].lower() in _VOID else f"<{found[1]}{found[2]}></{found[1]}>", text
    )


class _Target:
    """Receives tags and text; keeps the text that is read and the metadata of the head."""

    def __init__(self) -> None:
        self.flow = Flow()
        self.metadata: dict[str, MetaValue] = {}
        self.in_body = False
        self._left_out = 0
        """How deep inside an element that is left out; elements inside it count too."""
        self._verbatim = 0
        self._breaks = 0
        self._title: list[str] | None = None

    def start(self, tag: str, attributes: Mapping[str, str]) -> None:
        if not self.in_body:
            self._head(tag, attributes)
        if self._left_out:
            self._left_out += 1
        elif tag in LEFT_OUT or "hidden" in attributes:
            self._left_out = 1
            if tag not in ("rt", "rp", "rtc"):
                self.flow.space()
        elif tag == "br":
            self._break()
        elif tag in BLOCKS:
            self.in_body |= tag not in ("html", "body")
            self.flow.end_paragraph()
            self._verbatim += tag in VERBATIM

    def _head(self, tag: str, attributes: Mapping[str, str]) -> None:
        if tag == "html" and attributes.get("lang"):
            self.metadata["lang"] = attributes["lang"][:LONGEST_FIELD]
        elif tag == "title":
            self._title = []
        elif tag == "meta":
            name, content = attributes.get("name", "").lower(), attributes.get("content", "").strip()
            if name in _NAMED and content:
                self.metadata.setdefault(name, content[:LONGEST_FIELD])

    def _break(self) -> None:
        if self._verbatim:
            self.flow.verbatim("\n")
            return
        self._breaks += 1
        if self._breaks > 1:
            self.flow.end_paragraph()
        else:
            self.flow.space()

    def end(self, tag: str) -> None:
        if tag == "title" and self._title is not None:
            title = " ".join("".join(self._title).split())[:LONGEST_FIELD]
            if title:
                self.metadata.setdefault("title", title)
            self._title = None
        if self._left_out:
            self._left_out -= 1
        elif tag in BLOCKS:
            self.flow.end_paragraph()
            self._verbatim -= tag in VERBATIM and self._verbatim > 0

    def data(self, data: str) -> None:
        if self._title is not None:
            if sum(map(len, self._title)) < LONGEST_FIELD:
                self._title.append(data)
        elif not self._left_out:
            if self._verbatim:
                self.flow.verbatim(data)
            else:
                self.flow.text(data)
            if not data.isspace():
                self._breaks = 0
                self.in_body = True

    def close(self) -> None:
        """Nothing is left to do at the end."""


class Page:
    """A page being read: its metadata as far as its head says, then its text."""

    def __init__(self, pieces: Iterator[str]) -> None:
        self._target = _Target()
        self._pieces = pieces
        self._parser: Any = _parser(self._target)
        self._ended = False

    def metadata(self) -> Mapping[str, MetaValue]:
        """What the head says; reads until the text begins."""
        while not self._target.in_body and not self._ended:
            self._step()
        return self._target.metadata

    def text(self) -> Iterator[str]:
        """The text in pieces of bounded size."""
        while True:
            piece = self._target.flow.take()
            if piece:
                yield piece
            if self._ended:
                return
            self._step()

    def _step(self) -> None:
        from lxml import etree

        piece = next(self._pieces, None)
        try:
            if piece is not None:
                self._parser.feed(piece)
                return
            self._ended = True
            self._parser.close()
        except etree.XMLSyntaxError:
            # The only thing libxml2 does not mend is a page without any element: it has no text.
            self._ended = True


def _parser(target: _Target) -> Any:
    try:
        from lxml import etree
    except ImportError as error:
        raise MissingExtraError("reading HTML needs lxml: pip install 'colloc[markup]'") from error
    receiver: Any = target
    return etree.HTMLParser(target=receiver, no_network=True, huge_tree=True)


def _pieces(opened: Opened) -> Iterator[str]:
    size = 0
    for piece in opened.text(declared=declared_encoding):
        size += len(piece)
        if size > opened.settings.max_unpacked:
            raise opened.error(f"more than the {opened.settings.max_unpacked:,} characters allowed (max_unpacked)")
        yield piece


def as_html(pieces: Iterator[str]) -> Iterator[str]:
    """The same text; where it says at its beginning that it is XHTML, with closing tags that HTML knows."""
    xhtml = None
    held = ""
    for piece in pieces:
        if xhtml is None:
            xhtml = "<?xml" in piece[:_PRESCAN] or "xhtml" in piece[:_PRESCAN].lower()
        if not xhtml:
            yield piece
            continue
        piece = held + piece
        # A tag cut in two waits for its end, unless it is absurdly long.
        cut = piece.rfind("<")
        cut = cut if piece.rfind(">") < cut and len(piece) - cut < _LONGEST_TAG else len(piece)
        held = piece[cut:]
        yield close_tags(piece[:cut])
    if held:
        yield held


def read(opened: Opened, skip: int) -> Iterator[Document]:
    """The page as one document, unless it is to be skipped.

    Raises
    ------
    DataError
        For undecodable bytes and files that are no text.
    MissingExtraError
        Without lxml.
    """
    if skip:
        return
    page = Page(as_html(_pieces(opened)))
    metadata = {**page.metadata(), **opened.metadata}
    identifier = metadata.pop("id", None)
    yield Document(opened.identifier if identifier is None else str(identifier), metadata, page.text(), 0)
