"""Running the command line: in this process for speed, and as real processes for pipes, signals and exit codes."""

from __future__ import annotations

import io
import sqlite3
import subprocess
import sys
from collections.abc import Callable
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path

import pytest

from colloc.cli.app import main

COLLOC = [sys.executable, "-m", "colloc"]


@dataclass(frozen=True)
class Ran:
    """What one command line gave."""

    code: int
    out: str
    err: str


Run = Callable[..., Ran]


@pytest.fixture
def run(monkeypatch: pytest.MonkeyPatch) -> Run:
    """Run a command line here: ``run("pairs", store, "--limit", 5, stdin="...")``."""

    def running(*arguments: object, stdin: str | bytes = "") -> Ran:
        data = stdin.encode() if isinstance(stdin, str) else stdin
        streams = {
            "stdin": io.TextIOWrapper(io.BytesIO(data), encoding="utf-8"),
            "stdout": io.TextIOWrapper(io.BytesIO(), encoding="utf-8", newline=""),
            "stderr": io.TextIOWrapper(io.BytesIO(), encoding="utf-8", newline=""),
        }
        with monkeypatch.context() as patched:
            for name, stream in streams.items():
                patched.setattr(sys, name, stream)
            code = main([str(argument) for argument in arguments])
            for stream in streams.values():
                stream.flush()
        out, err = (streams[name].buffer.getvalue().decode() for name in ("stdout", "stderr"))  # type: ignore[attr-defined]
        return Ran(code, out, err)

    return running


def process(*arguments: object, stdin: bytes = b"", folder: Path | None = None) -> Ran:
    """Run a command line as a process of its own."""
    done = subprocess.run(
        [*COLLOC, *map(str, arguments)], input=stdin, capture_output=True, cwd=folder, check=False, timeout=60
    )
    return Ran(done.returncode, done.stdout.decode(), done.stderr.decode())


NOTES = ("writer", "pending_inputs", "pending_read")
"""Facts that say who wrote last and what an interrupted change was about: no part of what a store holds."""


def contents(store: Path) -> list[str]:
    """Everything a store holds, as SQL."""
    notes = tuple(f"INSERT INTO \"facts\" VALUES('{name}'" for name in NOTES)
    with closing(sqlite3.connect(f"{store.as_uri()}?mode=ro", uri=True)) as connection:
        return [line for line in connection.iterdump() if not line.startswith(notes) and "sqlite_sequence" not in line]
