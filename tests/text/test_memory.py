"""Memory does not grow with the file: measured on whole processes and on allocations."""

from __future__ import annotations

import gzip
import resource
import subprocess
import sys
from pathlib import Path

import pytest

from .samples import PACKERS

LINE = 60 * 2**20

PROGRAM = """
import sys, resource
from colloc.settings import ReadSettings
from colloc.text.sources import open_sources
from colloc.errors import CollocError

def peak():
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024

def read(path):
    total = 0
    for source in open_sources([path], ReadSettings(max_record=2**20)):
        for document in source.documents():
            for piece in document.pieces:
                total += len(piece)
    return total

read(sys.argv[1])
before = peak()
try:
    print(read(sys.argv[2]))
except CollocError as error:
    print(error)
print(peak() - before)
"""


def run(small: Path, large: Path) -> tuple[str, int]:
    """What reading ``large`` said, and by how much it raised the process's peak above that of reading ``small``."""
    found = subprocess.run(
        [sys.executable, "-c", PROGRAM, small, large],
        capture_output=True,
        check=True,
        text=True,
        # A process that grew with the file would end here: numpy's own needs are far below.
        preexec_fn=lambda: resource.setrlimit(resource.RLIMIT_AS, (2**32, 2**32)),
    )
    said, grown = found.stdout.splitlines()
    return said, int(grown)


@pytest.mark.parametrize("packer", ["", ".gz"])
def test_a_line_of_sixty_megabytes_is_streamed(tmp_path: Path, packer: str) -> None:
    text = ("großer Leuchtturm 灯台 " * 2**16).encode()
    repeats = LINE // len(text)
    small, large = tmp_path / f"small.txt{packer}", tmp_path / f"large.txt{packer}"
    small.write_bytes(PACKERS[packer](text))
    # Members of gzip may follow each other, which saves the test's time.
    large.write_bytes(PACKERS[packer](text) * repeats)
    said, grown = run(small, large)
    assert said == str(len(text.decode()) * repeats)
    assert grown < 8 * 2**20


@pytest.mark.parametrize(
    ("name", "start", "line"),
    [("large.jsonl", b'{"text": "', 1), ("large.csv", b'text\n"', 2), ("large.tsv", b"text\n", 2)],
)
def test_a_record_that_never_ends_is_refused_before_it_fills_memory(
    tmp_path: Path, name: str, start: bytes, line: int
) -> None:
    small, large = tmp_path / f"small.{name.partition('.')[2]}", tmp_path / name
    small.write_bytes(b'{"text": "a"}\n' if name.endswith("jsonl") else b"text\na\n")
    large.write_bytes(start + b"endless sea " * (LINE // 12))
    said, grown = run(small, large)
    assert said.startswith(f"{large}:{line}: a record of more than 1,048,576 bytes: allow larger records (max_record)")
    assert grown < 24 * 2**20


def test_a_packed_record_that_never_ends_is_refused(tmp_path: Path) -> None:
    small, large = tmp_path / "small.jsonl.gz", tmp_path / "large.jsonl.gz"
    small.write_bytes(gzip.compress(b'{"text": "a"}\n'))
    large.write_bytes(gzip.compress(b'{"text": "' + b"a" * LINE, compresslevel=1))
    said, grown = run(small, large)
    assert said.startswith(f"{large}:1: a record of more than 1,048,576 bytes")
    assert grown < 24 * 2**20
