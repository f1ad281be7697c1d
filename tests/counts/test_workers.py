"""Worker processes: what they cannot do is said, what they leave is cleared away."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from contextlib import closing
from pathlib import Path

import numpy as np
import pytest

from colloc.counts import processes, tallying
from colloc.counts.processes import Workers
from colloc.counts.tallying import obtain_tally
from colloc.errors import InputOutputError, StoreDamagedError
from colloc.settings import TallySpec
from colloc.store import tallies
from colloc.store.opening import open_for_writing
from tests.counts import stores
from tests.counts.test_tallying import check, temporary


@pytest.fixture
def store_path(tmp_path: Path) -> Path:
    text = stores.random_text(seed=3, tokens=4000, types=120, n_documents=6)
    stores.make_store(tmp_path / "s", text, [1000, 2000, 3000]).close()
    return tmp_path / "s"


@pytest.mark.parametrize("after", [0, 1, 3])
def test_a_killed_worker_is_reported_and_leaves_nothing(
    store_path: Path, monkeypatch: pytest.MonkeyPatch, after: int
) -> None:
    """SIGKILL after some results: while counting, between the steps, while merging."""
    monkeypatch.setattr(tallying, "_WORTH_A_PROCESS", 1)
    answers = Workers._answers
    seen = []

    def killing(self: Workers, number: int) -> list[object]:
        found = list(answers(self, number))
        seen.extend(found)
        if len(seen) >= after:
            for process in self.process_ids:
                os.kill(process, signal.SIGKILL)
        return found

    if after == 0:
        started = processes.Workers.__init__

        def dead(self: Workers, path: Path, jobs: int) -> None:
            started(self, path, jobs)
            os.kill(self.process_ids[0], signal.SIGKILL)

        monkeypatch.setattr(Workers, "__init__", dead)
    else:
        monkeypatch.setattr(Workers, "_answers", killing)
    with open_for_writing(store_path, "test") as store:
        with pytest.raises(InputOutputError, match=r"counting process was ended by signal 9 .*out of memory"):
            obtain_tally(store, TallySpec(), jobs=2)
        assert tallies.tally_list(store) == []
    assert temporary(store_path.parent) == []


def test_errors_of_workers_keep_their_kind_and_message(store_path: Path) -> None:
    with open_for_writing(store_path, "test") as store:
        with store.transaction():
            store.execute("UPDATE blocks SET tokens = zeroblob(100) WHERE id = 1")
        arguments = {"begin": 0, "stop": 4000, "pending": 10, "cells": 0, "folder": str(store_path.parent), "name": "x"}
        nowhere = {"begins": {"path": "", "kind": "<i8", "n": 0}, "stops": {"path": "", "kind": "<i8", "n": 0}}
        np.array([0], np.int64).tofile(store_path.parent / "b")
        np.array([4000], np.int64).tofile(store_path.parent / "e")
        nowhere["begins"] |= {"path": str(store_path.parent / "b"), "n": 1}
        nowhere["stops"] |= {"path": str(store_path.parent / "e"), "n": 1}
        task = ("count", {"spec": TallySpec().to_json(), "selection": nowhere, **arguments})
        with (
            closing(Workers(store.path, 1)) as workers,
            pytest.raises(StoreDamagedError, match="block 1 of the token stream"),
        ):
            list(workers.results([task]))


def test_results_come_in_the_order_of_the_tasks(store_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(tallying, "_WORTH_A_PROCESS", 1)
    with open_for_writing(store_path, "test") as store:
        text = stores.random_text(seed=3, tokens=4000, types=120, n_documents=6)
        check(obtain_tally(store, TallySpec(right=3), jobs=3), text)


def test_an_interrupt_ends_everything(store_path: Path) -> None:
    """Ctrl-C in a terminal reaches the whole process group; the program raises KeyboardInterrupt and clears up."""
    program = """
import os, signal, sys
from pathlib import Path
from colloc.counts import tallying
from colloc.counts.processes import Workers
from colloc.settings import TallySpec
from colloc.store.opening import open_for_writing
tallying._WORTH_A_PROCESS = 1
answers = Workers._answers
def interrupting(self, number):
    print(*self.process_ids, flush=True)
    os.killpg(0, signal.SIGINT)
    return answers(self, number)
Workers._answers = interrupting
with open_for_writing(Path(sys.argv[1]), "test") as store:
    tallying.obtain_tally(store, TallySpec(), jobs=2)
"""
    done = subprocess.run(
        [sys.executable, "-c", program, str(store_path)],
        capture_output=True,
        text=True,
        start_new_session=True,
        timeout=60,
        check=False,
    )
    assert "KeyboardInterrupt" in done.stderr
    assert temporary(store_path.parent) == []
    for number in done.stdout.split():
        deadline = time.monotonic() + 5
        while Path(f"/proc/{number}").exists() and time.monotonic() < deadline:
            time.sleep(0.01)
        with pytest.raises(ProcessLookupError):
            os.kill(int(number), 0)


def test_the_environment_leaves_the_users_choice_alone(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("NPY_DISABLE_CPU_FEATURES", "AVX2")
    monkeypatch.setenv("PYTHONPATH", "somewhere")
    environment = processes.worker_environment()
    assert environment["NPY_DISABLE_CPU_FEATURES"] == "AVX2"
    assert environment["PYTHONPATH"].split(os.pathsep)[-1] == "somewhere"
    assert (Path(environment["PYTHONPATH"].split(os.pathsep)[0]) / "colloc" / "counts").is_dir()
