"""Arrays and bytes packed with their kind, length and checksum.

Layout, little-endian: ``kind`` (4 bytes, such as ``<u4`` padded with a space),
``flags`` (uint32: bit 0 differences, bit 1 zstd), ``count`` (uint64 elements),
``checksum`` (uint32, CRC-32 of the 16 bytes before it and the payload), payload.
"""

from __future__ import annotations

import struct
import threading
import zlib
from typing import Any

import numpy as np
import zstandard
from numpy.typing import NDArray

from colloc.errors import StoreDamagedError

_HEAD = struct.Struct("<4sIQ")
_CHECKSUM = struct.Struct("<I")
_DIFFERENCES, _COMPRESSED = 1, 2
_KINDS = {b"<u1 ": np.uint8, b"<u2 ": np.uint16, b"<u4 ": np.uint32, b"<i4 ": np.int32, b"<i8 ": np.int64}
_own = threading.local()
_LARGEST = 2**31
"""Bytes of one array: far above what is ever packed, far below what a lying count could ask for."""


def checksum(*parts: bytes | memoryview) -> int:
    """CRC-32 over the parts in turn: finds every burst of damage up to 32 bits, misses one in 2^32 others."""
    value = 0
    for part in parts:
        value = zlib.crc32(part, value)
    return value


def _sealed(kind: bytes, flags: int, count: int, payload: bytes) -> bytes:
    head = _HEAD.pack(kind, flags, count)
    return b"".join((head, _CHECKSUM.pack(checksum(head, payload)), payload))


def pack(array: NDArray[Any], *, ascending: bool = False, compress: bool = False) -> bytes:
    """Pack a one-dimensional integer array.

    Parameters
    ----------
    ascending : bool
        Keep differences (the array must not descend), which zstd then packs well.
    compress : bool
        Use zstd at level 1; ``ascending`` implies it.
    """
    kind = f"<{array.dtype.kind}{array.dtype.itemsize}".ljust(4).encode()
    if kind not in _KINDS:
        raise TypeError(f"arrays of {array.dtype} are not packed")
    flags = (_DIFFERENCES if ascending else 0) | (_COMPRESSED if compress or ascending else 0)
    values = np.diff(array, prepend=array.dtype.type(0)) if ascending else array
    payload = np.ascontiguousarray(values, dtype=_KINDS[kind]).tobytes()
    if flags & _COMPRESSED:
        payload = _compressed(payload)
    return _sealed(kind, flags, len(array), payload)


def pack_bytes(data: bytes) -> bytes:
    """Pack bytes with zstd at level 1."""
    return _sealed(b"<u1 ", _COMPRESSED, len(data), _compressed(data))


def _compressed(data: bytes) -> bytes:
    """At level 1; a thread keeps its compressor, which takes a third of the time of packing a page of text."""
    if not hasattr(_own, "compressor"):
        _own.compressor = zstandard.ZstdCompressor(level=1)
    packed: bytes = _own.compressor.compress(data)
    return packed


def unpack(data: Any, what: str) -> NDArray[Any]:
    """The array that :func:`pack` was given; read-only where nothing had to be computed.

    Raises
    ------
    StoreDamagedError
        The checksum, the kind or a size does not fit; ``what`` names the place.
    """
    if not isinstance(data, bytes) or len(data) < _HEAD.size + _CHECKSUM.size:
        raise StoreDamagedError(f"{what}: cut short; restore the store from a copy or build it again")
    view = memoryview(data)
    payload = view[_HEAD.size + _CHECKSUM.size :]
    (expected,) = _CHECKSUM.unpack_from(data, _HEAD.size)
    if checksum(view[: _HEAD.size], payload) != expected:
        raise StoreDamagedError(f"{what}: the checksum does not fit; restore the store from a copy or build it again")
    kind, flags, count = _HEAD.unpack_from(data)
    dtype = _KINDS.get(kind)
    if dtype is None or flags & ~3:
        raise StoreDamagedError(f"{what}: unknown kind of packing {kind!r}, flags {flags}")
    size = count * np.dtype(dtype).itemsize
    if size > _LARGEST:
        raise StoreDamagedError(f"{what}: claims {count} elements, more than is ever packed")
    raw = _decompressed(payload, size, what) if flags & _COMPRESSED else payload
    if len(raw) != size:
        raise StoreDamagedError(f"{what}: holds {len(raw)} bytes instead of {size}")
    values: NDArray[Any] = np.frombuffer(raw, dtype=dtype)
    return np.cumsum(values, dtype=dtype) if flags & _DIFFERENCES else values


def unpack_bytes(data: Any, what: str) -> bytes:
    """The bytes that :func:`pack_bytes` was given."""
    return unpack_as(data, np.uint8, what).tobytes()


def unpack_as(data: Any, dtype: type, what: str) -> NDArray[Any]:
    """As :func:`unpack`, insisting on a dtype."""
    array = unpack(data, what)
    if array.dtype != dtype:
        raise StoreDamagedError(f"{what}: holds {array.dtype} instead of {np.dtype(dtype)}")
    return array


def _decompressed(payload: memoryview, size: int, what: str) -> bytes:
    try:
        # The frame's own claim is compared first: nothing is allocated on the word of damaged data.
        claimed = zstandard.frame_content_size(payload)
        if claimed != size:
            raise StoreDamagedError(f"{what}: unpacks to {claimed} bytes instead of {size}")
        return zstandard.ZstdDecompressor().decompress(payload, max_output_size=size)
    except zstandard.ZstdError as error:
        raise StoreDamagedError(f"{what}: cannot be unpacked ({error})") from error
