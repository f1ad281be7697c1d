"""Bytes to text: encodings, byte order marks, undecodable bytes.

Text is kept exactly as decoded: line ends, control characters and
normalisation forms stay as they are. Only a byte order mark is taken off.
"""

from __future__ import annotations

import codecs
import threading
from collections.abc import Iterator
from typing import Literal

from colloc.errors import UsageError

SAMPLE = 2**16
"""Bytes at the beginning of a file that decide on its encoding and on whether it is text."""
PIECE = 2**20
"""Bytes decoded at once. No codec gives more code points than bytes, so pieces of text stay far below 4 Mi."""

_MARKS = (
    # Longest first: the mark of UTF-32-LE begins with that of UTF-16-LE (Unicode Standard, section 23.8, table 23-6).
    (codecs.BOM_UTF32_LE, "utf-32-le"),
    (codecs.BOM_UTF32_BE, "utf-32-be"),
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF16_LE, "utf-16-le"),
    (codecs.BOM_UTF16_BE, "utf-16-be"),
)
_WIDE = ("utf-16-le", "utf-16-be", "utf-32-le", "utf-32-be")
_NOT_FOR_TEXT = ("idna", "punycode", "undefined", "unicode-escape", "raw-unicode-escape", "utf-7", "mbcs", "oem")
"""Codecs of Python that are escapes, of this machine only, or (UTF-7) let halves of surrogate pairs through."""

_PREFERRED = ("utf_8", "cp1252", "latin_1")
"""What a detected encoding most often is, before the code pages of other regions."""
_CHAOS_MARGIN = 0.11
_COHERENCE_MARGIN = 0.03
"""How much less plausible than the best guess a preferred encoding may look: chosen on sentences in 15 languages."""

_COUNTING = "colloc-replace-and-count"
_tally = threading.local()


class UndecodableError(Exception):
    """Bytes that are not text in the encoding: turned into a `DataError` by who knows the file."""

    def __init__(self, codec: str, offset: int, found: bytes) -> None:
        super().__init__(codec, offset, found)
        self.codec = codec
        self.offset = offset
        self.found = found


class UnknownEncodingError(Exception):
    """No encoding could be found for a file; the text says why."""


def _replace_and_count(error: UnicodeError) -> tuple[str, int]:
    if not isinstance(error, UnicodeDecodeError):
        raise error
    _tally.replaced = getattr(_tally, "replaced", 0) + error.end - error.start
    return "\ufffd", error.end


codecs.register_error(_COUNTING, _replace_and_count)


def checked_encoding(name: str) -> str:
    """The codec's own name for an encoding that the user named (``detect`` stays).

    Raises
    ------
    UsageError
        For a name that is no encoding of text.
    """
    if name == "detect":
        return name
    try:
        codec = codecs.lookup(name).name.replace("_", "-")
        "a".encode(codec)
    except (LookupError, ValueError):
        codec = ""
    if not codec or codec in _NOT_FOR_TEXT:
        raise UsageError(f"{name!r} is not an encoding of text: give one such as utf-8, latin-1, cp1252, or 'detect'")
    return "utf-8" if codec == "utf-8-sig" else codec


def choose_encoding(head: bytes, encoding: str) -> tuple[str, int]:
    """The codec for a file that begins with ``head``, and the length of its byte order mark.

    A mark decides between the forms of Unicode: for ``detect``, for a named
    form without byte order, and for UTF-8 (no UTF-8 text begins with the mark
    of another form). A named 8-bit encoding is taken at its word.

    Raises
    ------
    UnknownEncodingError
        A named UTF-16 or UTF-32 without byte order or mark, or ``detect`` finding nothing.
    """
    for mark, codec in _MARKS:
        if head.startswith(mark) and (encoding in ("detect", "utf-8", codec) or codec.startswith(encoding + "-")):
            return codec, len(mark)
    if encoding in ("utf-16", "utf-32"):
        raise UnknownEncodingError(f"no byte order mark: name {encoding}-le or {encoding}-be as its encoding")
    return (_detect(head) if encoding == "detect" else encoding), 0


def _detect(head: bytes) -> str:
    """A guess: UTF-8 where the bytes are that, else what gives the most plausible letters."""
    try:
        codecs.getincrementaldecoder("utf-8")().decode(head)
    except UnicodeDecodeError:
        from charset_normalizer import from_bytes
    else:
        return "utf-8"
    # A sample cut in mid-character would speak against the right encoding.
    cut = head.rfind(b"\n") + 1 if len(head) >= SAMPLE else 0
    matches = from_bytes(head[: cut or None])
    best = matches.best()
    if best is None:
        raise UnknownEncodingError("its encoding could not be detected: name it")
    for preferred in _PREFERRED:
        # Those that decode to the same text are one match, under the name that comes first in the alphabet.
        if any(
            preferred in match.could_be_from_charset
            and match.chaos <= best.chaos + _CHAOS_MARGIN
            and match.coherence >= best.coherence - _COHERENCE_MARGIN
            for match in matches
        ):
            return checked_encoding(preferred)
    return checked_encoding(best.encoding)


def seems_binary(head: bytes, codec: str) -> bool:
    """Whether a file has zero bytes where no text in ``codec`` has them (looked for as git does, near the start)."""
    return codec not in _WIDE and b"\0" in head[:SAMPLE]


class Decoder:
    """Decodes a stream in pieces, keeping count of bytes.

    Attributes
    ----------
    replaced : int
        Undecodable bytes replaced by U+FFFD so far (``errors="replace"`` only).
    """

    def __init__(self, codec: str, errors: Literal["strict", "replace"], offset: int = 0) -> None:
        self.replaced = 0
        self._codec = codec
        self._errors = errors
        self._offset = offset
        self._decoder = codecs.getincrementaldecoder(codec)(_COUNTING if errors == "replace" else "strict")

    def decode(self, chunks: Iterator[bytes]) -> Iterator[str]:
        """Pieces of at most `PIECE` code points whose concatenation is the whole text.

        Raises
        ------
        UndecodableError
            With the offset of the first undecodable byte, counted from the start of the stream.
        """
        for chunk in chunks:
            for start in range(0, len(chunk), PIECE):
                text = self._step(chunk[start : start + PIECE], final=False)
                if text:
                    yield text
        text = self._step(b"", final=True)
        if text:
            yield text

    def recode(self, chunks: Iterator[bytes]) -> Iterator[bytes]:
        """The same in UTF-8; bytes that are that already are passed on, once they have been found to be right."""
        if (self._codec, self._errors) == ("utf-8", "strict"):
            for chunk in chunks:
                self._step(chunk, final=False)
                yield chunk
            self._step(b"", final=True)
        else:
            for text in self.decode(chunks):
                yield text.encode()

    def _step(self, data: bytes, *, final: bool) -> str:
        pending = len(self._decoder.getstate()[0])
        before: int = getattr(_tally, "replaced", 0)
        try:
            text = self._decoder.decode(data, final)
        except UnicodeDecodeError as error:
            found = bytes(error.object[error.start : error.end])
            raise UndecodableError(self._codec, self._offset - pending + error.start, found) from error
        self.replaced += getattr(_tally, "replaced", 0) - before
        self._offset += len(data)
        return text
