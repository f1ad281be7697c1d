"""One input being read: raw bytes hashed and counted, unpacked, decoded."""

from __future__ import annotations

import hashlib
import io
import itertools
import os
import stat
import sys
from collections.abc import Callable, Generator, Iterator, Mapping
from contextlib import contextmanager
from typing import BinaryIO, TypeVar

from colloc.errors import DataError, InputOutputError, NoInputError, UsageError
from colloc.records import MetaValue
from colloc.settings import ReadSettings
from colloc.text.compression import DamagedError, packing_by_content, packing_by_name, unpack
from colloc.text.decoding import (
    SAMPLE,
    Decoder,
    UndecodableError,
    UnknownEncodingError,
    checked_encoding,
    choose_encoding,
    seems_binary,
)

Text = TypeVar("Text", str, bytes)

CHUNK = 2**16
"""Bytes asked of the operating system at once."""
STANDARD_INPUT = "-"

_BINARY = (
    (b"%PDF-", "a PDF file"),
    (b"\x89PNG\r\n", "a PNG picture"),
    (b"\xff\xd8\xff", "a JPEG picture"),
    (b"GIF87a", "a GIF picture"),
    (b"GIF89a", "a GIF picture"),
    (b"PK\x03\x04", "a ZIP archive or office document"),
    (b"7z\xbc\xaf\x27\x1c", "a 7-Zip archive"),
    (b"Rar!\x1a\x07", "a RAR archive"),
    (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "an office document"),
    (b"SQLite format 3\0", "an SQLite database"),
    (b"\x7fELF", "a program"),
    (b"PAR1", "a Parquet table"),
)
"""First bytes of files often taken for text, as the `file` utility knows them."""


def shown(name: str) -> str:
    """A file name as it may stand in a one-line message."""
    return (name if name.isprintable() else name.encode("unicode_escape").decode("ascii")) or "''"


@contextmanager
def reading(name: str) -> Iterator[None]:
    """Turn what the operating system refuses into this program's errors."""
    try:
        yield
    except FileNotFoundError as error:
        raise NoInputError(f"{shown(name)}: no such file or folder") from error
    except PermissionError as error:
        raise NoInputError(f"{shown(name)}: no permission to read it") from error
    except OSError as error:
        raise InputOutputError(f"{shown(name)}: cannot be read: {error.strerror or error}") from error
    except ValueError as error:
        raise NoInputError(f"{shown(name)}: no file can have this name") from error


class Opened:
    """One reading of one input, as a format's reader gets it.

        Parameters
        ----------
        path : str
    , identifier : str
            The input in messages, and its documents' identifier (or the stem of theirs).
        metadata : mapping
            What path and side table say of every document of this input.
    """

    def __init__(
        self,
        path: str,
        settings: ReadSettings,
        *,
        name: str,
        identifier: str,
        format: str,
        metadata: Mapping[str, MetaValue],
    ) -> None:
        self.path = path
        self.name = name
        self.identifier = identifier
        self.format = format
        self.metadata = metadata
        self.settings = settings
        self.packed = False
        self.detected: str | None = None
        self._hash = hashlib.blake2b(digest_size=16)
        self._consumed = 0
        self._size = -1
        self._share = 0.0
        self._exhausted = False
        self._drained = False
        self._decoder: Decoder | None = None
        self._raw = self._read_raw()

    @property
    def replaced(self) -> int:
        """Undecodable bytes replaced so far."""
        return self._decoder.replaced if self._decoder else 0

    @property
    def position(self) -> float:
        """Share of the raw bytes read so far; 0 until the end where the size is unknown."""
        if self._exhausted:
            return 1.0
        return max(min(self._consumed / self._size, 1.0) if self._size > 0 else 0.0, self._share)

    def say_share(self, share: float) -> None:
        """Note how much has been read (0..1), where a reader opens the file itself."""
        self._share = share

    @property
    def is_packed_by_name(self) -> bool:
        """Whether the file's name promises packed data."""
        return packing_by_name(self.name) is not None

    def digest(self) -> str:
        """BLAKE2b-128 of the raw bytes, in hexadecimal; only once all have been read."""
        if not self._exhausted:
            raise RuntimeError(f"{self.name} has not been read to its end")
        return self._hash.hexdigest()

    def error(self, message: str, line: int | None = None) -> DataError:
        """A `DataError` that says where: ``file: message`` or ``file:line: message``."""
        return DataError(f"{shown(self.name)}{'' if line is None else f':{line}'}: {message}")

    def drain(self) -> None:
        """Read the raw bytes that are left, for the digest; what was to be read of the text is gone then."""
        self._drained = True
        for _ in self._raw:
            pass

    def close(self) -> None:
        """Close the file; what has not been read stays unread."""
        self._raw.close()

    def _read_raw(self) -> Generator[bytes, None, None]:
        with reading(self.name), _open(self.path) as file:
            self._size = _regular_size(file)
            while chunk := file.read(CHUNK):
                self._hash.update(chunk)
                self._consumed += len(chunk)
                yield chunk
        self._exhausted = True

    def chunks(self) -> Iterator[bytes]:
        """The bytes, unpacked where they are packed. Can be gone through once.

        Raises
        ------
        DataError
            For damaged or absurd packed data, and for a name that promises packed data that are not there.
        """
        head, chunks = _peek(self._raw, 16)
        packing, promised = packing_by_content(head), packing_by_name(self.name)
        if packing is None:
            if promised is not None:
                found = "holds something else" if head else "is empty"
                raise self.error(f"the name says {promised.name}, but the file {found}: pack it again or rename it")
            yield from chunks
            return
        self.packed = True
        try:
            yield from unpack(chunks, packing, self.settings.max_unpacked)
        except DamagedError as error:
            raise self.error(
                f"{packing.name} data {error}: get the file again, or unpack it yourself and read the result"
            ) from error

    def _undrained(self, chunks: Iterator[bytes]) -> Iterator[bytes]:
        """The same chunks; whoever asks too late gets an error, and not a shortened text."""
        while True:
            if self._drained:
                raise RuntimeError(f"{shown(self.name)}: a document is to be read before the next is asked for")
            chunk = next(chunks, None)
            if chunk is None:
                return
            yield chunk

    def text(self, declared: Callable[[bytes], str | None] | None = None) -> Iterator[str]:
        """The text in pieces of at most 1 Mi code points, cut anywhere. Can be gone through once; it, or `utf8`.

        Parameters
        ----------
        declared : function or None
            Tells from the first bytes which encoding the file itself declares, if it does. It counts where the
            settings name none (``utf-8`` is what they say by themselves), but not against a byte order mark.

        Raises
        ------
        DataError
            For binary files and undecodable bytes, with the byte offset.
        """
        return self._decoded(Decoder.decode, declared)

    def utf8(self) -> Iterator[bytes]:
        """The text in UTF-8, in pieces that are cut anywhere; errors as those of `text`."""
        return self._decoded(Decoder.recode, None)

    def _decoded(
        self,
        decode: Callable[[Decoder, Iterator[bytes]], Iterator[Text]],
        declared: Callable[[bytes], str | None] | None,
    ) -> Iterator[Text]:
        head, chunks = _peek(self._undrained(self.chunks()), SAMPLE)
        if packing_by_content(head):
            raise self.error("packed twice: unpack it once")
        kind = next((kind for magic, kind in _BINARY if head.startswith(magic)), None)
        if kind:
            raise self.error(f"{kind}, not text: convert it to text first")
        try:
            wanted = self._encoding(head, declared)
            codec, mark = choose_encoding(head, wanted)
        except UnknownEncodingError as error:
            raise self.error(str(error)) from error
        if seems_binary(head, codec):
            raise self.error(
                f"a binary file, not text (zero byte at {head.index(0)}): leave it out, "
                "or name its encoding if it is UTF-16 or UTF-32"
            )
        self.detected = codec if wanted == "detect" else None
        self._decoder = Decoder(codec, self.settings.errors, mark)
        try:
            yield from decode(self._decoder, _without(chunks, mark))
        except UndecodableError as error:
            unpacked = " of the unpacked data" if self.packed else ""
            raise self.error(
                f"byte {error.offset}{unpacked} (0x{error.found[:4].hex()}) is not {error.codec}: "
                "name the file's encoding (or 'detect'), or choose errors 'replace'"
            ) from error

    def _encoding(self, head: bytes, declared: Callable[[bytes], str | None] | None) -> str:
        """The encoding that the settings name, or else the file itself."""
        named = checked_encoding(self.settings.encoding)
        own = declared(head) if declared is not None and named in ("utf-8", "detect") else None
        if own is None or choose_encoding(head, "utf-8")[1]:
            return named
        try:
            return checked_encoding(own)
        except UsageError as error:
            raise self.error(f"it declares the encoding {own!r}, which is unknown: name its encoding") from error


@contextmanager
def _open(path: str) -> Iterator[BinaryIO]:
    if path == STANDARD_INPUT:
        yield sys.stdin.buffer
        return
    with open(path, "rb", buffering=0) as file:
        yield file


def _regular_size(file: BinaryIO) -> int:
    """Size of a regular file; -1 for pipes, devices and streams in memory."""
    try:
        status = os.fstat(file.fileno())
    except io.UnsupportedOperation:
        return -1
    return status.st_size if stat.S_ISREG(status.st_mode) else -1


def _peek(chunks: Iterator[bytes], wanted: int) -> tuple[bytes, Iterator[bytes]]:
    """The first ``wanted`` bytes (or as many as there are), and the whole stream again."""
    taken: list[bytes] = []
    have = 0
    while have < wanted and (chunk := next(chunks, b"")):
        taken.append(chunk)
        have += len(chunk)
    return b"".join(taken)[:wanted], itertools.chain(taken, chunks)


def _without(chunks: Iterator[bytes], mark: int) -> Iterator[bytes]:
    """The stream without its first ``mark`` bytes."""
    for chunk in chunks:
        yield chunk[mark:]
        mark = max(mark - len(chunk), 0)
