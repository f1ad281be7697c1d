"""The measuring itself: memory of children is seen, time is wall time, failures are not measured."""

from __future__ import annotations

import sys

import pytest

from .running import CommandFailedError, run

MEGABYTE = 2**20


def test_memory_of_a_child_process_counts() -> None:
    inner = "held = bytearray(b'x') * (64 * 2**20); import time; time.sleep(0.6)"
    code = f"import subprocess, sys; subprocess.run([sys.executable, '-c', {inner!r}], check=True); print('done')"
    result = run([sys.executable, "-c", code])
    assert result.output == "done\n"
    assert 64 * MEGABYTE < result.peak_bytes < 160 * MEGABYTE


def test_time_is_wall_time() -> None:
    result = run([sys.executable, "-c", "import time; time.sleep(0.5)"], watch_memory=False)
    assert result.seconds >= 0.5
    assert result.cpu_seconds < result.seconds


def test_a_failing_command_is_an_error() -> None:
    with pytest.raises(CommandFailedError, match=r"(?s)exit code 3.*no luck"):
        run([sys.executable, "-c", "import sys; print('no luck', file=sys.stderr); sys.exit(3)"])
