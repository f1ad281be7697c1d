"""``python -m tests.bench``: measure ``colloc`` and general-purpose engines on the same text in the same run.

Needs the extra ``bench``. Text: ``--text``, else what COLLOC_DATA and Debian's ``dict-gcide`` give, else a stream drawn
from a Zipf-Mandelbrot law. Every measurement is one process (and its children) of its own; each is repeated in turn and
the fastest counts, since everything else that a machine does can only add time.
"""

from __future__ import annotations

import argparse
import json
import os
import re
import sys
import tempfile
from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import replace
from functools import partial
from pathlib import Path

from . import subject
from .engines import ENGINES, PYTHON_WORD
from .machine import describe
from .report import rows_of, table, write_json
from .running import Run, run
from .subject import Task
from .texts import real_sources, write_real, write_stream

QUICK_TOKENS = 2_000_000
STREAM_TOKENS = 15_000_000
WINDOWS = (1, 2, 5, 10)
ENGINE_WINDOWS = {"polars": (1, 5), "duckdb": (1, 5), "sklearn": (1,), "coreutils": (1, 5)}
SLOW = ("sklearn", "coreutils")
"""Run once: they take a minute and more."""
HERE = Path(__file__).resolve().parents[2]


def say(line: str) -> None:
    print(line, file=sys.stderr, flush=True)


def prepare(folder: Path, files: list[Path], quick: bool) -> tuple[Path, str]:
    """The text to measure on, and what it is."""
    text = folder / "text.txt"
    sources = files or real_sources()
    with text.open("wb") as out:
        if sources:
            write_real(out, sources, tokens=QUICK_TOKENS if quick else None)
        else:
            write_stream(out, tokens=QUICK_TOKENS if quick else STREAM_TOKENS, seed=1)
    return text, ", ".join(source.name for source in sources) or "Zipf-Mandelbrot stream, seed 1"


def words_to_ask(text: Path) -> list[str]:
    """A frequent and a rare word of the first two megabytes."""
    with text.open(encoding="utf-8", errors="ignore") as opened:
        counts = Counter(re.findall(PYTHON_WORD, opened.read(2_000_000).lower()))
    ranked = [word for word, _ in counts.most_common()]
    return [ranked[0], next((word for word in ranked if counts[word] <= 10), ranked[-1])]


Measure = Callable[[bool], Run]
"""Runs something once; the argument says whether its memory is watched, which slows it down."""


def by_turns(contenders: dict[str, Measure], times: int) -> dict[str, Run]:
    """Each contender in turn, some times over, and once more for its memory; the fastest time of each counts.

    What takes a minute is run once, watched.
    """
    timed: dict[str, list[Run]] = {name: [] for name in contenders}
    for _ in range(times):
        for name, once in contenders.items():
            if name not in SLOW:
                timed[name].append(once(False))
    found = {}
    for name, once in contenders.items():
        watched = once(True)
        best = min(timed[name] or [watched], key=lambda one: one.seconds)
        found[name] = replace(best, peak_bytes=watched.peak_bytes)
    return found


def engine(name: str, text: Path, window: int, threads: int, watch: bool) -> Run:
    command = [sys.executable, "-m", "tests.bench.engines", name, str(text)]
    environment = {**os.environ, "PYTHONPATH": str(HERE)}
    return run([*command, "--window", str(window), "--threads", str(threads)], environment, watch_memory=watch)


def measure(text: Path, folder: Path, chosen: argparse.Namespace) -> Iterator[Task]:
    """Everything, in an order that sets engines close in time to what they are compared with."""
    store = folder / "bench.colloc"
    tokens = 0
    for window in WINDOWS:
        contenders: dict[str, Measure] = {}
        if "colloc" in chosen.engines:
            contenders["colloc"] = partial(subject.build, store, [text], window, chosen.jobs)
        for name in chosen.engines:
            if window in ENGINE_WINDOWS.get(name, ()):
                contenders[name] = partial(engine, name, text, window, chosen.jobs)
        for name, done in by_turns(contenders, chosen.repeat).items():
            if name == "colloc":
                tokens = subject.tokens_in(store)
                yield Task("build", name, window, done, tokens, subject.occurrences_in(store))
            else:
                yield Task("build", name, window, done, tokens, json.loads(done.output)["occurrences"])
    if "colloc" in chosen.engines:
        alone = by_turns({"colloc": partial(subject.build, store, [text], 5, 1)}, chosen.repeat)
        yield Task("build, one core", "colloc", 5, alone["colloc"], tokens)
        yield from subject.questions(store, words_to_ask(text), tokens, folder)
        yield from subject.adding(store, text, folder, chosen.jobs)


def main() -> None:
    parser = argparse.ArgumentParser(prog="python -m tests.bench", description=__doc__)
    parser.add_argument("--text", nargs="+", type=Path, default=[], help="UTF-8 files, or .jsonl.gz with a key text")
    parser.add_argument("--engines", nargs="+", choices=["colloc", *ENGINES], default=["colloc", *ENGINES])
    parser.add_argument("--jobs", type=int, default=2, help="processes of colloc, threads of the engines")
    parser.add_argument("--repeat", type=int, default=3, help="runs of each build; the fastest counts")
    parser.add_argument("--quick", action="store_true", help=f"only {QUICK_TOKENS:,} words")
    parser.add_argument("--folder", type=Path, help="where text and stores go for the time being (4 GB)")
    parser.add_argument("--json", type=Path, metavar="FILE", help="write the figures to this file as well")
    chosen = parser.parse_args()
    with tempfile.TemporaryDirectory(dir=chosen.folder) as scratch:
        folder = Path(scratch)
        text, name = prepare(folder, chosen.text, chosen.quick)
        size = text.stat().st_size
        say(f"{size / 1e6:.1f} MB of text: {name}")
        tasks = []
        for task in measure(text, folder, chosen):
            say(f"{task.name:32} {task.engine:10} window {task.window:2} {task.run.seconds:8.2f} s")
            tasks.append(task)
        rows = rows_of(tasks)
        print(table(rows))
        if chosen.json:
            write_json(chosen.json, {"machine": describe(), "text": name, "bytes": size, "rows": rows})


if __name__ == "__main__":
    main()
