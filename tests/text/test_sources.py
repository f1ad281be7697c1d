"""Sources as the pipeline uses them: digest, position, standard input, resuming, errors while reading."""

from __future__ import annotations

import gzip
import hashlib
import io
import os
import subprocess
import sys
from collections import deque
from itertools import chain
from pathlib import Path

import pytest

from colloc.errors import DataError, InputOutputError, NoInputError
from colloc.settings import ReadSettings
from colloc.text.sources import open_sources

from .samples import json_line, prose, read_documents


@pytest.mark.parametrize("name", ["a.txt", "a.txt.gz", "a.jsonl", "a.csv"])
@pytest.mark.parametrize("skip", [0, 1, 5])
def test_the_digest_is_that_of_the_raw_bytes(tmp_path: Path, name: str, skip: int) -> None:
    text = json_line(text=prose(1, 100_000)) * 3
    data = {"a.txt.gz": gzip.compress(text.encode()), "a.csv": b"text\none\ntwo\n"}.get(name, text.encode())
    path = tmp_path / name
    path.write_bytes(data)
    (source,) = open_sources([str(path)], ReadSettings())
    assert (source.info.name, source.info.size, source.info.modified) == (str(path), len(data), path.stat().st_mtime)
    with pytest.raises(RuntimeError, match="has not been read"):
        source.digest()
    for document in source.documents(skip):
        if document.record % 2:
            list(document.pieces)  # those of the others are left unread
    # RFC 7693 as hashlib has it, 128 bits.
    assert source.digest() == hashlib.blake2b(data, digest_size=16).hexdigest()


def test_position_grows_to_one(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_text("sea " * 1_000_000)
    (source,) = open_sources([str(path)], ReadSettings())
    assert source.position == 0
    positions = []
    for document in source.documents():
        for _ in document.pieces:
            positions.append(source.position)
            if source.position < 1:
                with pytest.raises(RuntimeError, match="has not been read to its end"):
                    source.digest()
    assert positions == sorted(positions)
    assert 0 < positions[0] < 0.5 < positions[-2] < 1
    assert source.position == 1


def test_a_source_can_be_read_again(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("text\none\ntwo\n")
    (source,) = open_sources([str(path)], ReadSettings())
    first = [document.pieces for document in source.documents()]
    digest = source.digest()
    assert [document.pieces for document in source.documents()] == first == [("one",), ("two",)]
    assert source.digest() == digest


@pytest.mark.parametrize("name", ["a.jsonl", "a.csv", "a.txt"])
def test_skipping_gives_the_rest_of_a_full_reading(tmp_path: Path, name: str) -> None:
    path = tmp_path / name
    lines = "".join(f'{{"text": "t{number}"}}\n' for number in range(9))
    path.write_text("text\n" + "".join(f"t{number}\n" for number in range(9)) if name == "a.csv" else lines)
    whole = read_documents(path)
    for skip in range(len(whole) + 2):
        assert read_documents(path, skip=skip) == whole[skip:]


def test_files_are_opened_one_at_a_time(tmp_path: Path) -> None:
    for number in range(50):
        (tmp_path / f"{number:02}.txt").write_text("text")
    before = len(os.listdir("/proc/self/fd"))
    for source in open_sources([str(tmp_path)], ReadSettings()):
        for document in source.documents():
            list(document.pieces)
            assert len(os.listdir("/proc/self/fd")) <= before + 1
    abandoned = next(open_sources([str(tmp_path)], ReadSettings())).documents()
    next(abandoned)
    abandoned.close()  # type: ignore[attr-defined]
    assert len(os.listdir("/proc/self/fd")) == before


def test_all_is_checked_before_anything_is_read(tmp_path: Path) -> None:
    (tmp_path / "a.txt").write_text("text")
    with pytest.raises(NoInputError, match=r"b\.txt: no such file"):
        open_sources([str(tmp_path / "a.txt"), str(tmp_path / "b.txt")], ReadSettings())


def test_a_file_that_goes_away(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_text("text")
    (source,) = open_sources([str(path)], ReadSettings())
    path.unlink()
    with pytest.raises(NoInputError, match=r"a\.txt: no such file or folder"):
        deque(chain.from_iterable(document.pieces for document in source.documents()), maxlen=0)


def test_a_read_that_fails(tmp_path: Path) -> None:
    # Reading a process's memory at offset 0 fails with an input/output error on Linux.
    folder = tmp_path / "texts"
    folder.mkdir()
    (folder / "a.txt").symlink_to("/proc/self/mem")
    (folder / "b.txt").write_text("text")
    with pytest.raises(InputOutputError, match=r"texts/a\.txt: cannot be read: Input/output error"):
        read_documents(folder)


def test_devices_are_no_text() -> None:
    with pytest.raises(DataError, match=r"/dev/zero: a binary file, not text"):
        read_documents("/dev/zero")


def test_standard_input(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO("größe".encode())))
    (source,) = open_sources(["-"], ReadSettings())
    assert (source.info.name, source.info.size, source.info.modified) == ("-", -1, 0.0)
    assert [(document.identifier, "".join(document.pieces)) for document in source.documents()] == [("-", "größe")]


def test_standard_input_in_a_pipe() -> None:
    program = (
        "from colloc.text.sources import open_sources; from colloc.settings import ReadSettings\n"
        "for source in open_sources(['-'], ReadSettings(format='jsonl')):\n"
        "    print([(d.identifier, *d.pieces) for d in source.documents()], source.position, source.digest())"
    )
    data = gzip.compress(json_line(text="a").encode() + json_line(text="b", id="x").encode())
    run = subprocess.run([sys.executable, "-c", program], input=data, capture_output=True, check=True)
    digest = hashlib.blake2b(data, digest_size=16).hexdigest()
    assert run.stdout.decode().strip() == f"[('-:1', 'a'), ('x', 'b')] 1.0 {digest}"


def test_a_named_pipe(tmp_path: Path) -> None:
    path = tmp_path / "pipe"
    os.mkfifo(path)
    with subprocess.Popen(["sh", "-c", f"printf 'one two' > '{path}'"]):
        (document,) = read_documents(path)
    assert document.pieces == ("one two",)


def test_messages_stay_on_one_line(tmp_path: Path) -> None:
    path = tmp_path / "a\nb\x1b[31m.txt"
    path.write_bytes(b"\xff")
    with pytest.raises(DataError) as raised:
        read_documents(path)
    assert str(raised.value).isprintable()
    assert r"a\nb\x1b[31m.txt: byte 0 (0xff)" in str(raised.value)


@pytest.mark.parametrize("size", [10, 10_000_000])
def test_pieces_asked_for_too_late_are_refused(tmp_path: Path, size: int) -> None:
    """Never an empty or shortened text instead."""
    path = tmp_path / "a.txt"
    path.write_text("a" * size)
    (source,) = open_sources([str(path)], ReadSettings())
    (document,) = source.documents()
    with pytest.raises(RuntimeError, match=r"a\.txt: a document is to be read before the next is asked for"):
        list(document.pieces)
    documents = source.documents()
    pieces = iter(next(documents).pieces)
    start = next(pieces)
    assert list(documents) == []
    if len(start) < size:
        with pytest.raises(RuntimeError, match=r"a document is to be read before the next"):
            list(pieces)
