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

import atheris

with atheris.instrument_imports(include=["colloc"]):
    from colloc.errors import StoreDamagedError
    from colloc.store.database import packing
    from colloc.store.pages import ORDERS, decode_page, encode_page
    from colloc.store.paging.directory import unpack_directory


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


if __name__ == "__main__":
    atheris.Setup(sys.argv, one_input)
    atheris.Fuzz()
