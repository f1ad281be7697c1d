"""Packed arrays: any array survives, damage and lies are refused before memory is taken for them."""

from __future__ import annotations

import random
import struct
import tracemalloc
import zlib

import numpy as np
import pytest
import zstandard
from hypothesis import given
from hypothesis import strategies as st

from colloc.errors import StoreDamagedError
from colloc.store.database import packing

KINDS = st.sampled_from([np.uint8, np.uint16, np.uint32, np.int32, np.int64])


@given(KINDS, st.data(), st.booleans(), st.booleans())
def test_any_array_survives(kind: type, data: st.DataObject, ascending: bool, compress: bool) -> None:
    limits = np.iinfo(kind)
    values = data.draw(st.lists(st.integers(int(limits.min), int(limits.max)), max_size=40))
    array = np.array(sorted(values) if ascending else values, dtype=kind)
    packed = packing.pack(array, ascending=ascending, compress=compress)
    again = packing.unpack(packed, "test")
    assert again.dtype == array.dtype
    assert np.array_equal(again, array)
    assert np.array_equal(packing.unpack_as(packed, kind, "test"), array)
    other = np.int64 if kind != np.int64 else np.uint8
    with pytest.raises(StoreDamagedError, match=r"test: holds u?int\d+ instead of u?int\d+"):
        packing.unpack_as(packed, other, "test")


@given(st.binary(max_size=200))
def test_any_bytes_survive(data: bytes) -> None:
    assert packing.unpack_bytes(packing.pack_bytes(data), "test") == data


@pytest.mark.parametrize("compress", [False, True])
def test_damage_at_every_position_is_noticed(compress: bool) -> None:
    packed = packing.pack(np.arange(50, dtype=np.uint32), compress=compress)
    generator = random.Random(2)
    for position in range(len(packed)):
        damaged = bytearray(packed)
        damaged[position] ^= generator.randrange(1, 256)
        with pytest.raises(StoreDamagedError, match="test: "):
            packing.unpack(bytes(damaged), "test")
    for length in range(len(packed)):
        with pytest.raises(StoreDamagedError, match="test: "):
            packing.unpack(packed[:length], "test")


def _sealed(kind: bytes, flags: int, count: int, payload: bytes) -> bytes:
    head = struct.pack("<4sIQ", kind, flags, count)
    return head + struct.pack("<I", zlib.crc32(payload, zlib.crc32(head))) + payload


@pytest.mark.parametrize(
    ("crafted", "message"),
    [
        (_sealed(b"<f8 ", 0, 1, bytes(8)), "unknown kind of packing"),
        (_sealed(b"<u4 ", 4, 1, bytes(4)), "unknown kind of packing"),
        (_sealed(b"<u4 ", 0, 2, bytes(4)), "holds 4 bytes instead of 8"),
        (_sealed(b"<u4 ", 0, 2**62, bytes(4)), "more than is ever packed"),
        (_sealed(b"<u4 ", 2, 2, b"no frame"), "cannot be unpacked"),
        (_sealed(b"<u1 ", 2, 9, zstandard.compress(bytes(10))), "unpacks to 10 bytes instead of 9"),
        (_sealed(b"<u1 ", 2, 9, zstandard.compress(bytes(2**26))), "unpacks to 67108864 bytes instead of 9"),
    ],
)
def test_lies_with_a_right_checksum(crafted: bytes, message: str) -> None:
    tracemalloc.start()
    with pytest.raises(StoreDamagedError, match=message):
        packing.unpack(crafted, "test")
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < 2**20


@pytest.mark.parametrize("wrong", [None, 5, "text", b""])
def test_what_is_no_blob(wrong: object) -> None:
    with pytest.raises(StoreDamagedError, match="cut short"):
        packing.unpack(wrong, "test")


def test_floats_are_not_packed() -> None:
    with pytest.raises(TypeError, match="float64"):
        packing.pack(np.zeros(3))
