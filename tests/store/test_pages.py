"""Pages: any pairs survive, any damage is noticed. The oracle is the round trip itself and a plain dictionary."""

from __future__ import annotations

import random
import struct
import zlib

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.errors import StoreDamagedError
from colloc.store.pages import ORDERS, PAGE_PAIRS, Order, PageHead, decode_page, encode_page, head_of, keys_of

from .making import Cells, block_of, cells_of

TERMS = st.one_of(st.integers(0, 20), st.integers(0, 2**31 - 1), st.sampled_from([65535, 65536, 2**24 - 1, 2**24]))
COUNTS = st.one_of(st.integers(-3, 3), st.integers(-(2**40), 2**40), st.sampled_from([255, 256, -1, 2**62]))
TABLES = st.dictionaries(st.tuples(TERMS, TERMS), COUNTS.filter(bool), min_size=1, max_size=60)


@given(TABLES, st.sampled_from(ORDERS))
def test_any_pairs_survive(cells: Cells, order: Order) -> None:
    block = block_of(cells, order)
    data = encode_page(block, order)
    decoded = decode_page(data, order, head=head_of(data, block, order))
    assert cells_of(decoded) == cells
    assert (np.diff(keys_of(decoded, order).astype(object)) > 0).all()
    assert [getattr(decoded, name).dtype for name in decoded.__slots__] == [np.uint32, np.uint32, np.int64, np.int64]


def test_full_page_and_its_size() -> None:
    low = np.repeat(np.arange(256, dtype=np.uint32), 256)
    high = np.tile(np.arange(1000, 1256, dtype=np.uint32), 256)
    ones = np.ones(PAGE_PAIRS, dtype=np.int64)
    block = type(block_of({(0, 1): 1}))(low, high, ones, ones - 1)
    data = encode_page(block)
    # 24 bytes of head, 8 for each of 256 rows, 4 for each pair: docs/file-format.md.
    assert len(data) == 24 + 8 * 256 + 4 * PAGE_PAIRS
    assert cells_of(decode_page(data)) == cells_of(block)


@pytest.mark.parametrize(("largest", "width"), [(2**16 - 1, 2), (2**16, 3), (2**24 - 1, 3), (2**24, 4), (2**31 - 1, 4)])
def test_minor_terms_take_as_many_bytes_as_they_need(largest: int, width: int) -> None:
    data = encode_page(block_of({(5, largest): 1, (5, 9): 2}))
    assert len(data) == 24 + 8 + 2 * (width + 2)


def test_no_pairs_and_too_many_are_refused() -> None:
    block = block_of({(0, 1): 1})
    for wrong in (slice(0, 0), np.zeros(PAGE_PAIRS + 1, dtype=np.int64)):
        with pytest.raises(ValueError, match="65536 pairs"):
            encode_page(type(block)(*(getattr(block, name)[wrong] for name in block.__slots__)))


def _page() -> bytes:
    generator = random.Random(7)
    cells = {(generator.randrange(40), generator.randrange(70_000)): generator.choice([1, 2, 300]) for _ in range(50)}
    return encode_page(block_of(cells))


def test_damage_at_every_position_is_noticed() -> None:
    page = _page()
    generator = random.Random(1)
    for position in range(len(page)):
        damaged = bytearray(page)
        damaged[position] ^= generator.randrange(1, 256)
        with pytest.raises(StoreDamagedError, match=r"page 3: .*; restore"):
            decode_page(bytes(damaged), what="page 3")


def test_every_shorter_and_a_longer_page_is_refused() -> None:
    page = _page()
    for length in range(len(page)):
        with pytest.raises(StoreDamagedError):
            decode_page(page[:length])
    with pytest.raises(StoreDamagedError):
        decode_page(page + b"\0")


@pytest.mark.parametrize("wrong", [None, 7, "CPG1", memoryview(b"CPG1")])
def test_what_is_no_blob_is_refused(wrong: object) -> None:
    with pytest.raises(StoreDamagedError, match="not a page"):
        decode_page(wrong)


def _sealed(body: bytes) -> bytes:
    return b"CPG1" + struct.pack("<I", zlib.crc32(body)) + body


@pytest.mark.parametrize(
    ("sizes", "message"),
    [
        ((2**32 - 1, 1, 0, 2), "sizes do not fit"),
        ((1, 2**32 - 1, 0, 2), "sizes do not fit"),
        ((1, 1, 2**32 - 1, 2), "sizes do not fit"),
        ((1, 1, 0, 2**32 - 1), "sizes do not fit"),
        ((0, 0, 0, 2), "sizes do not fit"),
        ((1, 1, 0, 1), "sizes do not fit"),
    ],
)
def test_lying_sizes_with_a_right_checksum(sizes: tuple[int, int, int, int], message: str) -> None:
    body = encode_page(block_of({(1, 2): 3}))[8:]
    with pytest.raises(StoreDamagedError, match=message):
        decode_page(_sealed(struct.pack("<4I", *sizes) + body[16:]))


def test_lying_row_lengths_and_exceptions_with_a_right_checksum() -> None:
    body = bytearray(encode_page(block_of({(1, 2): 300}))[8:])
    lengths = bytearray(body)
    struct.pack_into("<I", lengths, 16 + 4, 2**32 - 1)
    with pytest.raises(StoreDamagedError, match="row lengths"):
        decode_page(_sealed(bytes(lengths)))
    struct.pack_into("<I", body, len(body) - 12, 2)
    with pytest.raises(StoreDamagedError, match="outside the page"):
        decode_page(_sealed(bytes(body)))


def test_a_page_cannot_stand_in_for_another() -> None:
    one, other = block_of({(1, 2): 3}), block_of({(1, 2): 4})
    head: PageHead = head_of(encode_page(one), one, "low")
    with pytest.raises(StoreDamagedError, match="another page"):
        decode_page(encode_page(other), head=head)
