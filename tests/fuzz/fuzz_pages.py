"""Coverage-guided fuzzing of what reads stored bytes: pages of a tally, packed arrays, directories.

``python tests/fuzz/fuzz_pages.py [CORPUS_FOLDER] [-max_total_time=60]`` needs ``atheris``, which is no requirement of
the package. Every input must be decoded or refused with StoreDamagedError; the input is tried as it is, and once more
with its checksum put right, so that the checks behind the checksum are reached. What is decoded must survive the round
trip.
"""

from __future__ import annotations

import struct
import sys
import zlib
from pathlib import Path

import atheris
import numpy as np

with atheris.instrument_imports(include=["colloc"]):
    from colloc.errors import StoreDamagedError
    from colloc.records import PairBlock
    from colloc.store.database import packing
    from colloc.store.pages import ORDERS, PageHead, decode_page, encode_page
    from colloc.store.paging.directory import pack_directory, unpack_directory


def _page(data: bytes) -> None:
    for order in ORDERS:
        try:
            block = decode_page(data, order)
        except StoreDamagedError:
            continue
        again = decode_page(encode_page(block, order), order)
        for name in block.__slots__:
            assert getattr(block, name).tolist() == getattr(again, name).tolist(), name


def _packed(data: bytes) -> None:
    for read in (packing.unpack, packing.unpack_bytes, unpack_directory):
        try:
            read(data, "fuzz")
        except StoreDamagedError:
            continue


def one_input(data: bytes) -> None:
    """Try one input on every reader, as it is and with a right checksum."""
    _page(data)
    _page(b"CPG1" + struct.pack("<I", zlib.crc32(data)) + data)
    _packed(data)
    if len(data) >= 16:
        _packed(data[:16] + struct.pack("<I", zlib.crc32(data[16:], zlib.crc32(data[:16]))) + data[16:])


def write_seeds(folder: Path) -> None:
    """Sound pages and packed arrays without their checksums: where the fuzzer begins."""
    generator = np.random.default_rng(1)
    for n, largest, counts in ((1, 9, 2), (40, 2**15, 300), (40, 2**20, 2**40), (9, 2**30, 2)):
        low = np.sort(generator.choice(largest, n, replace=False)).astype(np.uint32)
        forward, backward = generator.integers(0, counts, (2, n))
        (folder / f"page-{largest}").write_bytes(encode_page(PairBlock(low, low + np.uint32(7), forward, backward))[8:])
    numbers = np.arange(30, dtype=np.uint32)
    for name, packed in (
        ("plain", packing.pack(numbers)),
        ("ascending", packing.pack(numbers, ascending=True)),
        ("bytes", packing.pack_bytes(b"the lamp burns " * 9)),
        ("directory", pack_directory([PageHead(7, 1, 2, 3), PageHead(8, 4, 5, 6)])),
    ):
        (folder / name).write_bytes(packed[:16] + packed[20:])


if __name__ == "__main__":
    if len(sys.argv) > 1 and Path(sys.argv[1]).is_dir():
        write_seeds(Path(sys.argv[1]))
    atheris.Setup(sys.argv, one_input)
    atheris.Fuzz()
