"""Killed at any moment: the store stays sound, and the same command ends where an undisturbed one does."""

from __future__ import annotations

import random
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

from colloc.store.checking import check
from colloc.store.opening import open_for_reading, open_for_writing
from tests.build.killed import change
from tests.build.texts import content, make_text, write_corpus

CHANGES = ("build", "add", "remove", "merge", "tally")
ROOT = Path(__file__).parents[2]


@pytest.fixture(scope="module")
def prepared(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    """For each change: a folder from which it starts, what it ends with, and how long it takes."""
    base = tmp_path_factory.mktemp("kills")
    texts = base / "texts"
    texts.mkdir()
    write_corpus(texts / "a.jsonl", 1, 60)
    write_corpus(texts / "b.jsonl", 2, 50, prefix="e")
    (texts / "long.txt").write_text(make_text(random.Random(3), 700), encoding="utf-8")
    other = base / "other"
    shutil.copytree(texts, other)
    write_corpus(other / "a.jsonl", 4, 40, prefix="o")
    (other / "long.txt").write_text("A short one.", encoding="utf-8")
    (other / "long.txt").rename(other / "short.txt")
    (other / "long.txt").write_text("Sea and fog.", encoding="utf-8")
    change("build", other)
    built = base / "built"
    shutil.copytree(texts, built)
    change("build", built)
    shutil.copy(other / "store", built / "other")
    # The same identifier of the long text in both stores would be refused.
    from colloc.build.changing import remove

    remove(built / "other", identifiers=[name for name, *_ in content(built / "other")["documents"] if "long" in name])
    prepared: dict[str, Any] = {}
    for what in CHANGES:
        start = texts if what == "build" else built
        whole = base / f"whole-{what}"
        shutil.copytree(start, whole)
        began = time.perf_counter()
        subprocess.run([sys.executable, "-m", "tests.build.killed", what, str(whole)], cwd=ROOT, check=True)
        prepared[what] = (start, content(whole / "store", by_text=True), time.perf_counter() - began)
    return prepared


def kill_once(prepared: dict[str, Any], what: str, folder: Path, moment: float) -> bool:
    """Kill a change after a share of its time; True when it was still running."""
    start, expected, seconds = prepared[what]
    shutil.copytree(start, folder)
    process = subprocess.Popen(
        [sys.executable, "-m", "tests.build.killed", what, str(folder)], cwd=ROOT, stderr=subprocess.DEVNULL
    )
    time.sleep(moment * seconds)
    running = process.poll() is None
    process.send_signal(signal.SIGKILL)
    process.wait()
    store = folder / "store"
    if store.exists():
        with open_for_reading(store) as opened:
            assert check(opened) == [], what
    # A change that was done just before the kill is done; asked for again it would rightly find nothing to do.
    if what == "build" or content(store, by_text=True) != expected:
        change(what, folder)
    assert content(store, by_text=True) == expected, what
    with open_for_reading(store) as opened:
        assert check(opened) == [], what
    # Killed behind the last commit, a change needs no second run: what it left is tidied by the next writer.
    open_for_writing(store, "tidy").close()
    leftovers = [path.name for path in folder.iterdir() if path.name.startswith("store.tmp")]
    assert leftovers == [], what
    shutil.rmtree(folder)
    return running


@pytest.mark.parametrize("what", CHANGES)
def test_a_few_kills(prepared: dict[str, Any], tmp_path: Path, what: str) -> None:
    moments = random.Random(f"kills {what}")
    assert any([kill_once(prepared, what, tmp_path / str(number), moments.uniform(0.3, 0.95)) for number in range(3)])


def test_a_merge_killed_before_the_text_is_copied(prepared: dict[str, Any], tmp_path: Path) -> None:
    """Documents must never stand in the store without their words and text."""
    start, expected, _ = prepared["merge"]
    shutil.copytree(start, tmp_path / "m")
    script = (
        "import os, sys\n"
        "from pathlib import Path\n"
        "from colloc.store import texts\n"
        "texts.append_packed = lambda *_: os._exit(9)\n"
        "from tests.build.killed import change\n"
        "change('merge', Path(sys.argv[1]))\n"
    )
    assert subprocess.run([sys.executable, "-c", script, str(tmp_path / "m")], cwd=ROOT).returncode == 9
    with open_for_reading(tmp_path / "m" / "store") as opened:
        assert check(opened) == []
    change("merge", tmp_path / "m")
    assert content(tmp_path / "m" / "store", by_text=True) == expected


@pytest.mark.long
@pytest.mark.parametrize("what", CHANGES)
def test_many_kills(prepared: dict[str, Any], tmp_path: Path, what: str) -> None:
    """Two hundred and fifty in all; most must hit a running process."""
    moments = random.Random(f"many kills {what}")
    hits = [kill_once(prepared, what, tmp_path / str(number), moments.uniform(0.1, 1.0)) for number in range(50)]
    print(f"{what}: {sum(hits)} of {len(hits)} kills hit a running process")
    assert sum(hits) >= 25
