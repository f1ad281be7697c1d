"""No room left: a clear line and exit code, nothing stored is lost, and the same command goes on once there is room.

The limit of file size that the operating system offers stands for a full disk: SQLite and the temporary files
meet it as they would meet the end of a disk. ``test_on_a_small_file_system`` fills a real one.
"""

from __future__ import annotations

import os
import resource
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from colloc.build.building import build
from colloc.store.checking import check
from colloc.store.opening import open_for_reading
from tests.build.texts import content, write_corpus

PROGRAM = [sys.executable, "-m", "colloc"]


def run(arguments: list[str], folder: Path, limit: int | None = None) -> subprocess.CompletedProcess[str]:
    def limited() -> None:
        if limit is not None:
            resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit))

    return subprocess.run(
        [*PROGRAM, *arguments], cwd=folder, capture_output=True, text=True, preexec_fn=limited, check=False
    )


@pytest.fixture(scope="module")
def corpus(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("full")
    write_corpus(folder / "a.jsonl", 1, 120, sentences=60)
    write_corpus(folder / "b.jsonl", 2, 120, sentences=60, prefix="e")
    build(folder / "whole", [str(folder / "a.jsonl")], jobs=1)
    return folder


@pytest.mark.parametrize("limit", [300_000, 500_000, 700_000])
def test_build_without_room(corpus: Path, tmp_path: Path, limit: int) -> None:
    shutil.copy(corpus / "a.jsonl", tmp_path)
    done = run(["build", "store", "a.jsonl", "--jobs", "2"], tmp_path, limit)
    assert done.returncode == 74, done.stderr
    assert done.stderr.count("\n") == 1
    assert "Traceback" not in done.stderr
    assert [path for path in tmp_path.iterdir() if ".tmp-" in path.name] == []
    again = run(["build", "store", "a.jsonl"], tmp_path)
    assert again.returncode == 0, again.stderr
    assert content(tmp_path / "store", by_text=True) == content(corpus / "whole", by_text=True)


def test_add_without_room_leaves_what_was_there(corpus: Path, tmp_path: Path) -> None:
    shutil.copy(corpus / "whole", tmp_path / "store")
    shutil.copy(corpus / "b.jsonl", tmp_path)
    before = content(tmp_path / "store", by_text=True)
    size = (tmp_path / "store").stat().st_size
    # Less than the write-ahead log of the change needs, so that nothing of it can be committed.
    done = run(["add", "store", "b.jsonl"], tmp_path, size // 2)
    assert done.returncode == 74, done.stderr
    with open_for_reading(tmp_path / "store") as store:
        assert check(store) == []
    assert content(tmp_path / "store", by_text=True) == before
    assert run(["add", "store", "b.jsonl"], tmp_path).returncode == 0
    assert len(content(tmp_path / "store")["documents"]) == 240


def test_room_for_the_change_but_not_to_move_it(corpus: Path, tmp_path: Path) -> None:
    """The documents are in the write-ahead log when the store itself cannot grow: they are there, and that is said."""
    shutil.copy(corpus / "whole", tmp_path / "store")
    few = (corpus / "b.jsonl").read_text(encoding="utf-8").splitlines(keepends=True)[:12]
    (tmp_path / "few.jsonl").write_text("".join(few), encoding="utf-8")
    size = (tmp_path / "store").stat().st_size
    done = run(["add", "store", "few.jsonl"], tmp_path, size)
    assert done.returncode == 74, done.stderr
    assert "all is done and kept, but in store-wal" in done.stderr
    assert "do not run the command again" in done.stderr
    assert done.stderr.count("\n") == 1
    with open_for_reading(tmp_path / "store") as store:
        assert check(store) == []
    assert len(content(tmp_path / "store")["documents"]) == 132
    # the next command that writes joins the two
    assert run(["tally", "store", "--window", "2", "-q"], tmp_path).returncode == 0
    assert not (tmp_path / "store-wal").exists()
    assert (tmp_path / "store").stat().st_size > size
    assert len(content(tmp_path / "store")["documents"]) == 132


@pytest.mark.long
def test_on_a_small_file_system(corpus: Path, tmp_path: Path) -> None:
    """Needs the right to mount a file system in memory."""
    disk = tmp_path / "disk"
    disk.mkdir()
    subprocess.run(["mount", "-t", "tmpfs", "-o", "size=1300k", "tmpfs", str(disk)], check=True)
    try:
        shutil.copy(corpus / "a.jsonl", disk)
        os.environ.pop("TMPDIR", None)
        done = run(["build", "store", "a.jsonl", "--jobs", "2"], disk)
        assert done.returncode == 74, done.stderr
        assert "disk" in done.stderr
        subprocess.run(["mount", "-o", "remount,size=60m", str(disk)], check=True)
        assert run(["build", "store", "a.jsonl"], disk).returncode == 0
        assert content(disk / "store", by_text=True) == content(corpus / "whole", by_text=True)
    finally:
        subprocess.run(["umount", str(disk)], check=True)
