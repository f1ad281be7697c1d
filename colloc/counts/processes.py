"""Workers: separate Python processes that get tasks over pipes, or threads.

The processes are started afresh, not forked: nothing of the caller's (threads, open databases, its main module)
comes along, and it works alike on every system. Only paths and small facts pass between them.
"""

from __future__ import annotations

import json
import os
import selectors
import subprocess
import sys
import threading
from collections import deque
from collections.abc import Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from contextlib import closing, contextmanager
from pathlib import Path
from typing import Any, Protocol

from colloc import errors
from colloc.counts.tasks import Facts, perform
from colloc.errors import InputOutputError
from colloc.kernels.switch import compiled
from colloc.processor import prefer_fast_sorting
from colloc.store.connection import Store
from colloc.store.opening import open_for_reading

_AHEAD = 2
"""Tasks that a worker has in hand, so that it need not wait while this process writes."""
_READ = 2**16

Task = tuple[str, Facts]
"""The name of a task and its arguments."""


class Crew(Protocol):
    """Whoever does tasks."""

    def results(self, tasks: Sequence[Task]) -> Iterator[Facts]:
        """The results in the order of the tasks, each as soon as it and all before it are there."""


class Alone:
    """Does every task in this process, with the store as it stands, uncommitted changes included."""

    def __init__(self, store: Store) -> None:
        self._store = store

    def results(self, tasks: Sequence[Task]) -> Iterator[Facts]:
        """Do one task after the other."""
        for name, arguments in tasks:
            yield perform(self._store, name, arguments)


class Workers:
    """Several processes that share the tasks out among themselves.

    Raises
    ------
    InputOutputError
        A process ended before its work was done: killed, or out of memory.
    """

    def __init__(self, path: Path, jobs: int) -> None:
        environment = worker_environment()
        command = [sys.executable, "-m", "colloc.counts.worker", str(path)]
        self._processes: list[subprocess.Popen[bytes]] = []
        self._heard: list[bytes] = [b""] * jobs
        try:
            for _ in range(jobs):
                self._processes.append(
                    subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, env=environment, bufsize=0)
                )
        except OSError as error:
            self.close()
            raise InputOutputError(
                f"a counting process cannot be started ({error.strerror}); use fewer jobs"
            ) from error

    @property
    def process_ids(self) -> list[int]:
        """The system's numbers of the processes."""
        return [process.pid for process in self._processes]

    def results(self, tasks: Sequence[Task]) -> Iterator[Facts]:
        """Hand tasks out as processes become free."""
        waiting = deque(enumerate(tasks))
        in_hand: dict[int, deque[int]] = {number: deque() for number in range(len(self._processes))}
        done: dict[int, Facts] = {}
        for _ in range(_AHEAD):
            for number in in_hand:
                self._hand_out(number, waiting, in_hand[number])
        with selectors.DefaultSelector() as selector:
            for number, process in enumerate(self._processes):
                selector.register(_pipe(process.stdout), selectors.EVENT_READ, number)
            for wanted in range(len(tasks)):
                while wanted not in done:
                    for key, _events in selector.select():
                        number = key.data
                        for answer in self._answers(number):
                            done[in_hand[number].popleft()] = answer
                            self._hand_out(number, waiting, in_hand[number])
                yield done.pop(wanted)

    def _hand_out(self, number: int, waiting: deque[tuple[int, Task]], in_hand: deque[int]) -> None:
        if waiting:
            index, (name, arguments) = waiting.popleft()
            in_hand.append(index)
            message = json.dumps({"task": name, "arguments": arguments}).encode() + b"\n"
            try:
                # far shorter than what a pipe holds, so this never waits for a worker that waits for us
                _pipe(self._processes[number].stdin).write(message)
            except BrokenPipeError as error:
                raise self._ended(number) from error

    def _answers(self, number: int) -> Iterator[Facts]:
        """The answers that have come; one read may bring part of one, or two."""
        data = _pipe(self._processes[number].stdout).read(_READ)
        if not data:
            raise self._ended(number)
        *lines, self._heard[number] = (self._heard[number] + data).split(b"\n")
        for line in lines:
            answer: dict[str, Any] = json.loads(line)
            if "error" in answer:
                raise getattr(errors, answer["error"])(answer["message"])
            yield answer["result"]

    def _ended(self, number: int) -> InputOutputError:
        code = self._processes[number].wait()
        how = f"was ended by signal {-code}" if code < 0 else f"ended with code {code}"
        return InputOutputError(
            f"a counting process {how} before its work was done (out of memory?); nothing was changed: "
            "run the same command again, with less memory or fewer jobs"
        )

    def close(self) -> None:
        """End the processes, in the middle of their work where there is some."""
        for process in self._processes:
            process.kill()
        for process in self._processes:
            # the pipes are closed unflushed: whoever would read them is gone
            for pipe in (process.stdin, process.stdout):
                if pipe is not None:
                    pipe.close()
            process.wait()


class Threads:
    """Several threads of this process: compiled loops run beside each other, and nothing has to be started."""

    def __init__(self, path: Path, jobs: int) -> None:
        self._path = path
        self._own = threading.local()
        self._stores: list[Store] = []
        self._pool = ThreadPoolExecutor(jobs, "counting")

    def results(self, tasks: Sequence[Task]) -> Iterator[Facts]:
        """Hand tasks out as threads become free."""
        waiting = [self._pool.submit(self._perform, name, arguments) for name, arguments in tasks]
        for result in waiting:
            yield result.result()

    def _perform(self, name: str, arguments: Facts) -> Facts:
        if not hasattr(self._own, "store"):
            self._own.store = open_for_reading(self._path, shared=True)
            self._stores.append(self._own.store)
        return perform(self._own.store, name, arguments)

    def close(self) -> None:
        """Wait for what the threads have in hand; what they have not begun is left."""
        self._pool.shutdown(cancel_futures=True)
        for store in self._stores:
            store.close()


def _pipe(pipe: Any) -> Any:
    assert pipe is not None  # both were asked for as pipes
    return pipe


@contextmanager
def crew(store: Store, jobs: int) -> Iterator[Crew]:
    """``jobs`` workers, or this process where that is one; workers see only what is committed.

    Workers are threads where loops are compiled, since those do not hold each other up; else processes.
    """
    if jobs == 1:
        yield Alone(store)
        return
    if compiled():
        with closing(Threads(store.path, jobs)) as threads:
            yield threads
        return
    with closing(Workers(store.path, jobs)) as workers:
        yield workers


def worker_environment() -> dict[str, str]:
    """The environment of a worker: it finds this very package, and sorts with the vectors that are fast here."""
    environment = dict(os.environ)
    package = str(Path(__file__).resolve().parents[2])
    environment["PYTHONPATH"] = os.pathsep.join(filter(None, [package, environment.get("PYTHONPATH")]))
    # each worker is one of several; threads inside would only stand in each other's way
    environment.setdefault("OMP_NUM_THREADS", "1")
    environment.setdefault("OPENBLAS_NUM_THREADS", "1")
    prefer_fast_sorting(environment)
    return environment
