"""Run a command to its end and say what it took: wall time, processor time, memory of all its processes."""

from __future__ import annotations

import resource
import subprocess
import tempfile
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from time import perf_counter

import psutil

SAMPLE_EVERY = 0.1
"""Seconds between two looks at the memory; a peak shorter than this can be missed."""


@dataclass(frozen=True)
class Run:
    seconds: float
    cpu_seconds: float
    peak_bytes: int
    """Largest sum of proportional set sizes over all processes: memory they share is counted once."""
    output: str


class CommandFailedError(Exception):
    """A measured command ended with an error: there is nothing to measure."""


def _memory_of_tree(root: psutil.Process) -> int:
    total = 0
    for process in [root, *root.children(recursive=True)]:
        try:
            total += process.memory_full_info().pss
        except (psutil.NoSuchProcess, psutil.ZombieProcess, psutil.AccessDenied):
            continue  # it ended between being listed and being looked at
    return total


def _peak_until_end(process: subprocess.Popen[bytes]) -> int:
    peak = 0
    root = psutil.Process(process.pid)
    while True:
        try:
            process.wait(timeout=SAMPLE_EVERY)
        except subprocess.TimeoutExpired:
            try:
                peak = max(peak, _memory_of_tree(root))
            except psutil.NoSuchProcess:
                continue
        else:
            return peak


def _cpu_of_children() -> float:
    usage = resource.getrusage(resource.RUSAGE_CHILDREN)
    return usage.ru_utime + usage.ru_stime


def run(command: Sequence[str], environment: Mapping[str, str] | None = None, *, watch_memory: bool = True) -> Run:
    """Run once. ``watch_memory=False`` costs the command nothing and is for what ends within a second."""
    with tempfile.TemporaryFile() as out, tempfile.TemporaryFile() as errors:
        cpu, start = _cpu_of_children(), perf_counter()
        process = subprocess.Popen(command, stdin=subprocess.DEVNULL, stdout=out, stderr=errors, env=environment)
        peak = _peak_until_end(process) if watch_memory else 0
        code = process.wait()
        seconds, cpu = perf_counter() - start, _cpu_of_children() - cpu
        out.seek(0)
        errors.seek(0)
        if code != 0:
            said = errors.read().decode(errors="replace").strip()
            raise CommandFailedError(f"exit code {code}: {' '.join(command)}\n{said}")
        return Run(seconds, cpu, peak, out.read().decode(errors="replace"))
