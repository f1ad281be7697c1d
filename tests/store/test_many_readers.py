"""One store open in many processes at once, for reading only, and also while it is written."""

from __future__ import annotations

import json
import os
import stat
import subprocess
import sys
from pathlib import Path

import pytest

import colloc

READERS = 6
CODE = """
import json, sys
import colloc
path, = sys.argv[1:]
with colloc.open_store(path) as store:
    print("open", flush=True)
    sys.stdin.readline()
    best = colloc.pairs(store, limit=5, min_count=1)
    made = colloc.matrix(store)
    given = colloc.score(store, [("thick", "fog")], show=["npmi"])
    print(json.dumps([best.to_dicts(), made.values.nnz, float(made.values.data.sum()), given.to_dicts()]))
"""


@pytest.fixture
def store(tmp_path: Path) -> Path:
    text = "thick fog at dawn and thick fog at sea.\nheavy rain fell at dawn and heavy rain fell again.\n"
    (tmp_path / "a.txt").write_text(text * 5, encoding="utf-8")
    colloc.build(tmp_path / "s.colloc", str(tmp_path / "a.txt"), jobs=1)
    return tmp_path / "s.colloc"


def start(path: Path) -> subprocess.Popen[str]:
    process = subprocess.Popen(
        [sys.executable, "-c", CODE, str(path)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
    )
    assert process.stdout is not None
    assert process.stdout.readline() == "open\n"
    return process


def finish(process: subprocess.Popen[str]) -> object:
    """What a process answered, once it was told to go on."""
    output, _ = process.communicate("\n", timeout=60)
    assert process.returncode == 0
    return json.loads(output, parse_float=_twelve_digits)


def _twelve_digits(text: str) -> float:
    """Logarithms differ in the last place between processes that use other vectors of the processor."""
    return float(f"{float(text):.12g}")


def expected(path: Path) -> object:
    best, made = colloc.pairs(path, limit=5, min_count=1), colloc.matrix(path)
    given = colloc.score(path, [("thick", "fog")], show=["npmi"])
    answer = [best.to_dicts(), made.values.nnz, float(made.values.data.sum()), given.to_dicts()]
    return json.loads(json.dumps(answer), parse_float=_twelve_digits)


def test_all_answer_the_same_from_a_file_that_nobody_may_write(store: Path) -> None:
    answer = expected(store)
    before = store.read_bytes()
    os.chmod(store, stat.S_IREAD)
    processes = [start(store) for _ in range(READERS)]  # all hold it open before the first asks
    assert [finish(process) for process in processes] == [answer] * READERS
    os.chmod(store, stat.S_IREAD | stat.S_IWRITE)
    assert store.read_bytes() == before


def test_readers_keep_what_they_opened_while_documents_are_added(store: Path, tmp_path: Path) -> None:
    answer = expected(store)
    processes = [start(store) for _ in range(READERS)]
    (tmp_path / "b.txt").write_text("thick fog again and again.\n", encoding="utf-8")
    colloc.add(store, str(tmp_path / "b.txt"), jobs=1)
    assert [finish(process) for process in processes] == [answer] * READERS
    assert finish(start(store)) == expected(store) != answer
