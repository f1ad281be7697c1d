"""Members of a ZIP archive, read within bounds; nothing of an archive is ever written under a name that it gives."""

from __future__ import annotations

import lzma
import tempfile
import zipfile
import zlib
from collections.abc import Iterator
from contextlib import contextmanager

from colloc.errors import DataError
from colloc.text.compression import LARGEST_RATIO, RATIO_APPLIES_FROM
from colloc.text.decoding import SAMPLE, Decoder, UndecodableError, choose_encoding
from colloc.text.markup.html import declared_encoding
from colloc.text.opening import Opened

MOST_MEMBERS = 2**16
_CHUNK = 2**16
_IN_MEMORY = 2**25
_DAMAGE = (
    zipfile.BadZipFile,
    zlib.error,
    lzma.LZMAError,
    EOFError,
    OSError,
    OverflowError,
    RuntimeError,
    ValueError,
)
"""What the standard library raises for archives that are damaged, encrypted, or packed in ways it does not know."""


class Archive:
    """An archive opened for reading; each member is measured while it is unpacked."""

    def __init__(self, opened: Opened, file: zipfile.ZipFile) -> None:
        self._opened = opened
        self._file = file
        self._unpacked = 0
        members = file.infolist()
        if len(members) > MOST_MEMBERS:
            raise opened.error(f"an archive of more than {MOST_MEMBERS:,} files, which no book has")
        self._members = {member.filename: member for member in members}
        if len(self._members) < len(members):
            raise opened.error("an archive with two files of the same name; pack it again")

    def __contains__(self, name: str) -> bool:
        return name in self._members

    def text(self, name: str) -> Iterator[str]:
        """The decoded text of a member, in pieces.

        Raises
        ------
        DataError
            A member that is missing, damaged, encrypted, too large, or no text.
        """
        chunks = self._chunks(name)
        head = next(chunks, b"")
        codec, mark = choose_encoding(head, declared_encoding(head[:SAMPLE]) or "utf-8")

        def whole() -> Iterator[bytes]:
            yield head[mark:]
            yield from chunks

        try:
            yield from Decoder(codec, self._opened.settings.errors, mark).decode(whole())
        except (UndecodableError, LookupError) as error:
            raise self._opened.error(f"{name}: not {codec}; correct the encoding it declares") from error

    def _chunks(self, name: str) -> Iterator[bytes]:
        opened = self._opened
        if name not in self._members:
            raise opened.error(f"{name}: not in the archive; get the file again")
        member = self._members[name]
        size = 0
        with _damage(opened, name), self._file.open(member) as file:
            while chunk := file.read(_CHUNK):
                size += len(chunk)
                self._unpacked += len(chunk)
                if self._unpacked > opened.settings.max_unpacked:
                    raise opened.error(f"more than the {opened.settings.max_unpacked:,} bytes allowed (max_unpacked)")
                if size > RATIO_APPLIES_FROM and size > member.compress_size * LARGEST_RATIO:
                    raise opened.error(
                        f"{name}: unpacks to more than {LARGEST_RATIO} times its size, as a decompression bomb does"
                    )
                yield chunk


@contextmanager
def _damage(opened: Opened, name: str) -> Iterator[None]:
    try:
        yield
    except DataError:
        raise
    except _DAMAGE as error:
        kind = "encrypted" if "password" in str(error) or "encrypted" in str(error) else "damaged"
        raise opened.error(f"{name}: {kind}, cannot be unpacked; get the file again without protection") from error


@contextmanager
def open_archive(opened: Opened) -> Iterator[Archive]:
    """The input as an archive.

    It is copied to an unnamed temporary file first (in memory where it is
    small), since an archive is read from its end.

    Raises
    ------
    DataError
        Where it is no archive.
    """
    with tempfile.SpooledTemporaryFile(_IN_MEMORY) as copy:
        for chunk in opened.chunks():
            copy.write(chunk)
        try:
            file = zipfile.ZipFile(copy)
        except _DAMAGE as error:
            raise opened.error("not a ZIP archive, or a damaged one: get the file again") from error
        with file:
            yield Archive(opened, file)
