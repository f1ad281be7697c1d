"""Unpacking gzip, bzip2, xz and zstd as a stream, within bounds.

A packed file is known by its first bytes. What it unpacks to is handed on in
steps of bounded size and measured as it goes, so a file that unpacks to an
absurd size is refused while little of it has been unpacked.
"""

from __future__ import annotations

import bz2
import lzma
import zlib
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import PurePosixPath
from typing import Protocol

STEP = 2**20
"""Most bytes that gzip, bzip2 and xz unpack at once."""
ZSTD_FEED = 128
"""Bytes given to zstd at once: its API has no limit on output, but a block takes at least 3 bytes and gives 128 KiB."""
LARGEST_DICTIONARY = 2**28
"""Most bytes an xz decoder may ask for; ``xz -9`` needs 65 MiB."""
LARGEST_WINDOW = 2**27
"""Largest zstd window in bytes; ``zstd --ultra -22`` needs this much."""
LARGEST_RATIO = 250
"""Unpacked to packed size; prose packs 3 to 6 times, logs of machines seldom more than 50 times."""
RATIO_APPLIES_FROM = 2**26
"""Unpacked bytes below which any ratio will do: a small bomb does no harm."""


class DamagedError(Exception):
    """Packed data that cannot be unpacked; the text says why. Turned into a `DataError` by who knows the file."""


class Engine(Protocol):
    """One packed member being unpacked."""

    @property
    def ended(self) -> bool: ...

    @property
    def rest(self) -> bytes: ...

    def feed(self, data: bytes) -> Iterator[bytes]: ...


class _Gzip:
    def __init__(self) -> None:
        self._engine = zlib.decompressobj(wbits=31)

    @property
    def ended(self) -> bool:
        return self._engine.eof

    @property
    def rest(self) -> bytes:
        return self._engine.unused_data

    def feed(self, data: bytes) -> Iterator[bytes]:
        # What zlib holds back when its output is full comes with the next input; the checksum at the end is input too.
        while data and not self._engine.eof:
            yield self._engine.decompress(data, STEP)
            data = self._engine.unconsumed_tail


class _Bounded:
    """bzip2 and xz, whose decompressors share one interface."""

    def __init__(self, engine: bz2.BZ2Decompressor | lzma.LZMADecompressor) -> None:
        self._engine = engine

    @property
    def ended(self) -> bool:
        return self._engine.eof

    @property
    def rest(self) -> bytes:
        return self._engine.unused_data

    def feed(self, data: bytes) -> Iterator[bytes]:
        yield self._engine.decompress(data, STEP)
        while not self._engine.needs_input and not self._engine.eof:
            yield self._engine.decompress(b"", STEP)


class _Zstd:
    def __init__(self) -> None:
        import zstandard

        self._engine = zstandard.ZstdDecompressor(max_window_size=LARGEST_WINDOW).decompressobj()
        self._error: type[Exception] = zstandard.ZstdError
        self.rest = b""

    @property
    def ended(self) -> bool:
        return self._engine.eof

    def feed(self, data: bytes) -> Iterator[bytes]:
        for start in range(0, len(data), ZSTD_FEED):
            stop = start + ZSTD_FEED
            try:
                unpacked = self._engine.decompress(data[start:stop])
            except self._error as error:
                raise ValueError(str(error)) from error
            yield unpacked
            if self._engine.eof:
                self.rest = self._engine.unused_data + data[stop:]
                return


@dataclass(frozen=True, slots=True)
class Packing:
    """One way of packing: how it is recognised and how it is undone."""

    name: str
    extensions: tuple[str, ...]
    magic: tuple[bytes, ...]
    start: Callable[[], Engine]


PACKINGS = (
    Packing("gzip", (".gz",), (b"\x1f\x8b\x08",), _Gzip),
    Packing(
        "bzip2",
        (".bz2",),
        # "BZh", the level, then the first block's mark; an empty file has the end mark (bzip2 has no written standard;
        # the two marks are the decimal digits of pi and of its square root).
        tuple(b"BZh%d%s" % (level, mark) for level in range(1, 10) for mark in (b"1AY&SY", b"\x17rE8P\x90")),
        lambda: _Bounded(bz2.BZ2Decompressor()),
    ),
    Packing(
        "xz",
        (".xz",),
        (b"\xfd7zXZ\x00",),
        lambda: _Bounded(lzma.LZMADecompressor(lzma.FORMAT_XZ, memlimit=LARGEST_DICTIONARY)),
    ),
    # RFC 8878, 3.1: a frame, or a skippable frame.
    Packing("zstd", (".zst",), (b"\x28\xb5\x2f\xfd", *(b"%c\x2a\x4d\x18" % n for n in range(0x50, 0x60))), _Zstd),
)


def packing_by_name(name: str) -> Packing | None:
    """The packing that a file's name promises, or None."""
    suffix = PurePosixPath(name).suffix.lower()
    return next((packing for packing in PACKINGS if suffix in packing.extensions), None)


def packing_by_content(head: bytes) -> Packing | None:
    """The packing that the first bytes (10 are enough) show, or None."""
    return next((packing for packing in PACKINGS if head.startswith(packing.magic)), None)


def without_packing(name: str) -> str:
    """``name`` without the ending of a packed file: ``a.txt`` for ``a.txt.gz``."""
    packing = packing_by_name(name)
    return name[: name.rindex(".")] if packing else name


def unpack(chunks: Iterator[bytes], packing: Packing, largest: int) -> Iterator[bytes]:
    """Unpack a stream of one or more members; zero bytes after a member are padding.

    Raises
    ------
    DamagedError
        The data are cut off, damaged, followed by something else, or unpack
        to more than ``largest`` bytes or `LARGEST_RATIO` times their size.
    """
    engine: Engine | None = None
    members = packed = unpacked = 0
    for chunk in chunks:
        packed += len(chunk)
        rest = chunk
        while rest:
            if engine is None:
                rest = rest.lstrip(b"\0") if members else rest
                if not rest:
                    break
                engine = packing.start()
                members += 1
            try:
                for piece in engine.feed(rest):
                    unpacked += len(piece)
                    _check_size(packed, unpacked, largest)
                    if piece:
                        yield piece
            except (zlib.error, lzma.LZMAError, OSError, EOFError, ValueError) as error:
                where = "damaged or followed by something else" if members > 1 else "damaged"
                raise DamagedError(f"{where} ({error})") from error
            rest = b""
            if engine.ended:
                rest, engine = engine.rest, None
    if engine is not None or not members:
        raise DamagedError("cut off before their end")


def _check_size(packed: int, unpacked: int, largest: int) -> None:
    if unpacked > largest:
        raise DamagedError(f"more than the {largest:,} bytes allowed for one unpacked file")
    if unpacked > RATIO_APPLIES_FROM and unpacked > packed * LARGEST_RATIO:
        raise DamagedError(f"unpacking to more than {LARGEST_RATIO} times their size, as a decompression bomb does")
