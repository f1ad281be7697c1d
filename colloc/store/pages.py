"""Pages of a tally: up to 65,536 pairs as bytes, and back. Pure; knows no store.

A page holds its pairs sorted by (major, minor): major is ``low`` in the order
``low``, ``high`` in the order ``high``. Layout, little-endian::

    magic      4 bytes   "CPG1"
    checksum   uint32    CRC-32 of everything after it
    n          uint32    pairs
    rows       uint32    distinct major terms
    exceptions uint32    counts that do not fit a byte
    width      uint32    bytes of a minor term: 2, 3 or 4
    majors     uint32 x rows, ascending
    lengths    uint32 x rows: pairs of each major term
    minors     uint16 x n: lower half of the minor terms
    upper      (width - 2) bytes x n: upper part of the minor terms (uint8 or uint16)
    forward    uint8 x n: table cell [low, high]
    backward   uint8 x n: table cell [high, low]
    places     uint32 x exceptions: i for forward[i], n + i for backward[i]
    values     int64 x exceptions: the count itself (the byte is 0)
"""

from __future__ import annotations

import struct
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from colloc.errors import StoreDamagedError
from colloc.records import Int64Array, PairBlock, UInt32Array, UInt64Array
from colloc.store.database.packing import checksum

PAGE_PAIRS = 65_536
Order = Literal["low", "high"]
ORDERS: tuple[Order, ...] = ("low", "high")

_MAGIC = b"CPG1"
_CHECKSUM = struct.Struct("<I")
_SIZES = struct.Struct("<4I")
_START = len(_MAGIC) + _CHECKSUM.size
_BYTE = 255


@dataclass(frozen=True, slots=True)
class PageHead:
    """What a directory says of a page.

    ``first`` and ``last`` are keys, major << 32 | minor, of the page's first and last pair;
    ``checksum`` is the page's own, so that a page cannot stand in for another.
    """

    n: int
    first: int
    last: int
    checksum: int


def keys_of(block: PairBlock, order: Order) -> UInt64Array:
    """Sort keys of the pairs: major << 32 | minor."""
    major, minor = (block.low, block.high) if order == "low" else (block.high, block.low)
    keys: UInt64Array = major.astype(np.uint64)
    keys <<= np.uint64(32)
    keys |= minor
    return keys


def head_of(data: bytes, block: PairBlock, order: Order) -> PageHead:
    """The head of a page that :func:`encode_page` made of ``block``."""
    major, minor = (block.low, block.high) if order == "low" else (block.high, block.low)
    first, last = (int(major[i]) << 32 | int(minor[i]) for i in (0, -1))
    return PageHead(len(block), first, last, _CHECKSUM.unpack_from(data, len(_MAGIC))[0])


def encode_page(block: PairBlock, order: Order = "low") -> bytes:
    """Bytes of 1 to PAGE_PAIRS pairs, sorted by ``order`` without repeats; counts may be negative (changes)."""
    n = len(block)
    if not 1 <= n <= PAGE_PAIRS:
        raise ValueError(f"a page holds 1 to {PAGE_PAIRS} pairs, not {n}")
    major, minor = (block.low, block.high) if order == "low" else (block.high, block.low)
    starts = np.flatnonzero(np.concatenate(([True], major[1:] != major[:-1])))
    lengths = np.diff(starts, append=n).astype("<u4")
    largest = int(minor.max())
    width = 2 if largest < 1 << 16 else 3 if largest < 1 << 24 else 4
    parts: list[Any] = [major[starts].astype("<u4", copy=False), lengths, minor.astype("<u2")]
    if width > 2:
        parts.append((minor >> np.uint32(16)).astype("<u1" if width == 3 else "<u2"))
    places, values = [], []
    for offset, counts in ((0, block.forward), (n, block.backward)):
        # Seen as unsigned, negative counts are large too.
        large = np.flatnonzero(counts.view(np.uint64) > _BYTE)
        small = counts.astype(np.uint8)
        if len(large):
            small[large] = 0
            places.append(large + offset)
            values.append(counts[large])
        parts.append(small)
    exceptions = sum(map(len, places))
    if exceptions:
        parts += [np.concatenate(places).astype("<u4"), np.concatenate(values).astype("<i8")]
    body = b"".join([_SIZES.pack(n, len(starts), exceptions, width), *(part.tobytes() for part in parts)])
    return b"".join((_MAGIC, _CHECKSUM.pack(checksum(body)), body))


def decode_page(data: Any, order: Order = "low", *, head: PageHead | None = None, what: str = "page") -> PairBlock:
    """The pairs of a page.

    Parameters
    ----------
    data : bytes
    head : PageHead, optional
        What the directory says of the page: must agree.
    what : str
        The place, for the message.

    Raises
    ------
    StoreDamagedError
        Wrong checksum, or sizes that do not fit; checked before anything is allocated.
    """
    if not isinstance(data, bytes) or len(data) < _START + _SIZES.size or data[: len(_MAGIC)] != _MAGIC:
        raise _damaged(what, "not a page of a tally")
    (expected,) = _CHECKSUM.unpack_from(data, len(_MAGIC))
    if checksum(memoryview(data)[_START:]) != expected:
        raise _damaged(what, "the checksum does not fit")
    n, rows, exceptions, width = _SIZES.unpack_from(data, _START)
    size = _START + _SIZES.size + 8 * rows + (width + 2) * n + 12 * exceptions
    if not (1 <= rows <= n <= PAGE_PAIRS and exceptions <= 2 * n and 2 <= width <= 4 and size == len(data)):
        raise _damaged(what, f"its sizes do not fit ({n} pairs, {rows} rows, {exceptions} exceptions)")
    position = _START + _SIZES.size

    def take(dtype: str, count: int) -> NDArray[Any]:
        nonlocal position
        array = np.frombuffer(data, dtype=dtype, count=count, offset=position)
        position += array.nbytes
        return array

    majors, lengths = take("<u4", rows), take("<u4", rows)
    if int(lengths.sum(dtype=np.uint64)) != n:
        raise _damaged(what, "its row lengths do not add up")
    minor: UInt32Array = take("<u2", n).astype(np.uint32)
    if width > 2:
        minor |= take("<u1" if width == 3 else "<u2", n).astype(np.uint32) << np.uint32(16)
    major: UInt32Array = np.repeat(majors, lengths)
    # Both directions in one array, so that exceptions are put back at once.
    counts: Int64Array = take("<u1", 2 * n).astype(np.int64)
    if exceptions:
        places, values = take("<u4", exceptions), take("<i8", exceptions)
        if int(places.max()) >= 2 * n:
            raise _damaged(what, "an exception lies outside the page")
        counts[places] = values
    block = PairBlock(*((major, minor) if order == "low" else (minor, major)), counts[:n], counts[n:])
    if head is not None and head_of(data, block, order) != head:
        raise _damaged(what, "the directory describes another page")
    return block


def _damaged(what: str, why: str) -> StoreDamagedError:
    return StoreDamagedError(f"{what}: {why}; restore the store from a copy or build it again")
