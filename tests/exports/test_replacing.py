"""Output files are whole or not there."""

from __future__ import annotations

import os
import threading
from pathlib import Path

import pytest

from colloc.errors import CannotCreateError
from colloc.exports.replacing import replacing


def test_the_old_file_stays_until_the_new_one_is_complete(tmp_path: Path) -> None:
    goal = tmp_path / "out.csv"
    goal.write_bytes(b"old")
    with replacing(goal) as stream:
        stream.write(b"new")
        stream.flush()
        assert goal.read_bytes() == b"old"
    assert goal.read_bytes() == b"new"
    assert list(tmp_path.iterdir()) == [goal]


def test_an_error_leaves_the_old_file_and_nothing_else(tmp_path: Path) -> None:
    goal = tmp_path / "out.csv"
    goal.write_bytes(b"old")

    def fail_half_way() -> None:
        with replacing(goal) as stream:
            stream.write(b"half")
            raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        fail_half_way()
    assert goal.read_bytes() == b"old"
    assert list(tmp_path.iterdir()) == [goal]


def test_permissions_are_as_if_written_in_place(tmp_path: Path) -> None:
    fresh, kept = tmp_path / "fresh", tmp_path / "kept"
    kept.write_bytes(b"")
    kept.chmod(0o640)
    mask = os.umask(0o027)
    try:
        for goal in (fresh, kept):
            with replacing(goal) as stream:
                stream.write(b"x")
    finally:
        os.umask(mask)
    assert fresh.stat().st_mode & 0o777 == 0o640
    assert kept.stat().st_mode & 0o777 == 0o640


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    goal, link = tmp_path / "goal", tmp_path / "link"
    goal.write_bytes(b"old")
    link.symlink_to(goal)
    with replacing(link) as stream:
        stream.write(b"new")
    assert link.is_symlink()
    assert goal.read_bytes() == b"new"


def test_a_pipe_is_written_to_directly(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    read: list[bytes] = []
    reader = threading.Thread(target=lambda: read.append(pipe.read_bytes()))
    reader.start()
    with replacing(pipe) as stream:
        stream.write(b"through")
    reader.join()
    assert read == [b"through"]
    assert pipe.is_fifo()


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("missing/out.csv", "No such file or directory"),
        (".", "is a folder; name a file"),
        ("file/out.csv", "Not a directory"),
    ],
)
def test_places_that_cannot_be_written(tmp_path: Path, name: str, message: str) -> None:
    (tmp_path / "file").write_bytes(b"")
    with pytest.raises(CannotCreateError, match=message), replacing(tmp_path / name):
        pass
