"""What is measured of ``colloc`` itself: its commands, each in a fresh process, as a user would type them."""

from __future__ import annotations

import json
import shutil
import sys
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from .running import Run, run

COLLOC = str(Path(sys.executable).with_name("colloc"))
COLD_RUNS = 5
"""Runs of a command that takes less than a second; the fastest counts."""


@dataclass(frozen=True)
class Task:
    """One measurement. ``tokens`` and ``occurrences`` (of pairs) are what was worked through, 0 where not the point."""

    name: str
    engine: str
    window: int
    run: Run
    tokens: int = 0
    occurrences: int = 0


def drop(store: Path) -> None:
    """Remove a store and what SQLite, the writer lock and a killed run leave beside it."""
    for path in store.parent.glob(store.name + "*"):
        if path.is_dir():
            shutil.rmtree(path)
        else:
            path.unlink()


def build(store: Path, inputs: Sequence[Path], window: int, jobs: int, watch: bool = True) -> Run:
    """A fresh store, text and token stream kept."""
    drop(store)
    names = [str(path) for path in inputs]
    command = [COLLOC, "build", str(store), *names, "--window", str(window), "--jobs", str(jobs), "--quiet"]
    return run(command, watch_memory=watch)


def tokens_in(store: Path) -> int:
    output = run([COLLOC, "info", str(store), "--format", "json", "--quiet"], watch_memory=False).output
    return int(json.loads(output)["tokens"])


def occurrences_in(store: Path) -> int:
    """Pairs of tokens in the table that the store was built with: the total of a directed answer."""
    command = [COLLOC, "pairs", str(store), "--directed", "--limit", "1", "--format", "jsonl", "--quiet"]
    return int(json.loads(run(command, watch_memory=False).output)["total"])


def cold(command: Sequence[str]) -> Run:
    """The fastest of several fresh processes."""
    return min((run(command, watch_memory=False) for _ in range(COLD_RUNS)), key=lambda one: one.seconds)


def questions(store: Path, words: Sequence[str], tokens: int, folder: Path) -> Iterator[Task]:
    """Tasks on a store built with window 5: further counting, ranking, cold answers, export."""
    name = str(store)
    one_core = [COLLOC, "tally", name, "--window", "5", "--layer", "form", "--jobs", "1", "--quiet"]
    yield Task("tally, layer form, one core", "colloc", 5, run(one_core), tokens)
    ranking = [COLLOC, "pairs", name, "--min-count", "1", "--limit", "100", "--format", "csv", "--quiet"]
    for measure in ("npmi", "g2"):
        yield Task(f"pairs, all ranked by {measure}", "colloc", 5, run([*ranking, "--measure", measure]))
    yield Task("pairs, all measures shown", "colloc", 5, run([*ranking, "--show", "all"]))
    yield Task("pairs, cold", "colloc", 5, cold([COLLOC, "pairs", name, "--quiet"]))
    for word in words:
        yield Task(f"around {word}, cold", "colloc", 5, cold([COLLOC, "around", name, word, "--quiet"]))
    matrix = [COLLOC, "matrix", name, "-o", str(folder / "matrix.npz"), "--quiet"]
    yield Task("matrix export", "colloc", 5, run(matrix))


def adding(store: Path, text: Path, folder: Path, jobs: int) -> Iterator[Task]:
    """Adding the last twentieth of the text to a store of the rest, and, beside it, building that part alone."""
    lines = text.read_bytes().splitlines(keepends=True)
    cut = len(lines) * 19 // 20
    rest, part = folder / "rest.txt", folder / "part.txt"
    rest.write_bytes(b"".join(lines[:cut]))
    part.write_bytes(b"".join(lines[cut:]))
    alone = build(store, [part], 5, jobs)
    tokens = tokens_in(store)
    build(store, [rest], 5, jobs)
    added = run([COLLOC, "add", str(store), str(part), "--jobs", str(jobs), "--quiet"])
    yield Task("add a twentieth", "colloc", 5, added, tokens)
    yield Task("build that twentieth alone", "colloc", 5, alone, tokens)
    drop(store)
