"""What the figures were measured on."""

from __future__ import annotations

import os
import platform
import sqlite3
from importlib.metadata import version
from pathlib import Path

import psutil

LIBRARIES = ("colloc", "numpy", "scipy", "duckdb", "polars", "scikit-learn")


def _processor() -> str:
    for line in Path("/proc/cpuinfo").read_text(encoding="utf-8").splitlines():
        if line.startswith("model name"):
            return line.partition(":")[2].strip()
    return platform.machine()


def describe() -> dict[str, str]:
    """Processor, cores, memory, system and versions, by name."""
    return {
        "processor": _processor(),
        "cores": str(len(os.sched_getaffinity(0))),
        "memory": f"{psutil.virtual_memory().total / 2**30:.0f} GB",
        "system": f"{platform.system()} {platform.release()}",
        "python": platform.python_version(),
        "sqlite": sqlite3.sqlite_version,
        **{name: version(name) for name in LIBRARIES},
    }
