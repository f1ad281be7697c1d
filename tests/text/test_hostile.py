"""Hostile inputs through every reader: only clear refusals may come out, quickly and in little memory."""

from __future__ import annotations

import resource
import signal
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from .hostile import hostile_case, read_or_refuse

TOO_LONG = 30
"""Seconds after which a case counts as hanging."""
EVERYDAY = 500
LONG = 10_000


def _hangs(signal_number: int, frame: object) -> None:
    raise TimeoutError(f"a case took more than {TOO_LONG} seconds")


@pytest.fixture(autouse=True)
def alarm() -> Iterator[None]:
    """A reader that hangs fails the test instead of stopping the suite."""
    before = signal.signal(signal.SIGALRM, _hangs)
    yield
    signal.signal(signal.SIGALRM, before)


def read_cases(folder: Path, seeds: range) -> tuple[int, int, float]:
    """Cases read, cases refused, and the longest time of one in seconds of this process."""
    read = refused = 0
    longest = 0.0
    for seed in seeds:
        name, data, settings = hostile_case(seed)
        path = folder / name
        path.write_bytes(data or b"\n")
        start = time.process_time()
        signal.alarm(TOO_LONG)
        try:
            outcome = read_or_refuse(path, settings)
        except Exception as error:
            error.add_note(f"hostile_case({seed})")
            raise
        finally:
            signal.alarm(0)
        longest = max(longest, time.process_time() - start)
        path.unlink()
        read += outcome >= 0
        refused += outcome < 0
    return read, refused, longest


def test_hostile_inputs(tmp_path: Path) -> None:
    read, refused, longest = read_cases(tmp_path, range(EVERYDAY))
    # Neither all are refused nor all let through, else nothing would have been tried.
    assert read > EVERYDAY // 10
    assert refused > EVERYDAY // 4
    assert longest < 5


@pytest.mark.long
def test_ten_thousand_hostile_inputs(tmp_path: Path) -> None:
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    read, refused, longest = read_cases(tmp_path, range(EVERYDAY, EVERYDAY + LONG))
    assert read > LONG // 10
    assert refused > LONG // 4
    assert longest < 5
    assert resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before < 300 * 1024
