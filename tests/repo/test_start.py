"""The command line answers at once: what ``colloc --help`` loads, and how long it takes, in fresh processes."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path
from time import perf_counter

COLLOC = str(Path(sys.executable).with_name("colloc"))
ALLOWANCE = 0.1
"""Seconds that ``colloc --help`` may take beyond the import of its command line library alone."""
MOST_ROUNDS = 21


def _seconds(command: list[str]) -> float:
    # As a user's process starts: from compiled modules, which the first run leaves behind.
    environment = {name: value for name, value in os.environ.items() if name != "PYTHONDONTWRITEBYTECODE"}
    start = perf_counter()
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL, env=environment)
    return perf_counter() - start


def test_help_loads_nothing_heavy() -> None:
    code = (
        "import sys\n"
        "from colloc.cli.app import main\n"
        "sys.argv = ['colloc', '--help']\n"
        "try:\n"
        "    main()\n"
        "except SystemExit:\n"
        "    pass\n"
        "print(*sys.modules, file=sys.stderr)\n"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert "build" in run.stdout
    loaded = {name.split(".")[0] for name in run.stderr.split()}
    assert "typer" in loaded
    assert not loaded & {"numpy", "scipy", "sqlite_utils", "pandas", "matplotlib", "regex", "zstandard", "sqlite3"}


def test_help_answers_at_once() -> None:
    """Minimums of at least seven runs each, taken in turn; more runs where the machine is busy."""
    bare, ours = float("inf"), float("inf")
    for done in range(1, MOST_ROUNDS + 1):
        bare = min(bare, _seconds([sys.executable, "-c", "import typer"]))
        ours = min(ours, _seconds([COLLOC, "--help"]))
        if done >= 7 and ours <= bare + ALLOWANCE:
            break
    assert ours <= bare + ALLOWANCE


def test_running_as_a_module() -> None:
    run = subprocess.run([sys.executable, "-m", "colloc", "--help"], capture_output=True, text=True, check=True)
    assert "build" in run.stdout
