"""When compiled loops are used, and what is said where they cannot be."""

from __future__ import annotations

import importlib.util
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from colloc.errors import MissingExtraError
from colloc.kernels import switch


@pytest.fixture(autouse=True)
def off() -> Iterator[None]:
    switch.use_numpy()
    yield
    switch.use_numpy()


def test_small_work_is_left_to_numpy() -> None:
    assert not switch.prefer_compiled(False)
    assert switch.prefer_compiled(True)
    assert switch.prefer_compiled(False), "what is loaded stays in use"


def test_the_environment_decides(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv(switch.SWITCH, "0")
    assert not switch.prefer_compiled(True)
    monkeypatch.setenv(switch.SWITCH, "1")
    assert switch.prefer_compiled(False)


def test_without_numba(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(importlib.util, "find_spec", lambda name: None)
    assert not switch.prefer_compiled(True)
    monkeypatch.setenv(switch.SWITCH, "1")
    with pytest.raises(MissingExtraError, match=r"colloc\[fast\]"):
        switch.prefer_compiled(True)


def test_no_place_for_the_cache_is_said(tmp_path: Path) -> None:
    """numba looks beside the module, then in the user's cache folder; where neither can be written it refuses."""
    script = (
        "import warnings\nimport numpy\n"  # which warns itself where an earlier test chose its vectors
        "warnings.simplefilter('error')\n"
        "from numba.core import caching\n"
        "caching.CacheImpl._locator_classes = []\n"
        "from colloc.kernels.switch import prefer_compiled\n"
        "try:\n    prefer_compiled(True)\nexcept UserWarning as warning:\n    print(warning)\n"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, cwd=tmp_path, timeout=120)
    assert "set NUMBA_CACHE_DIR" in done.stdout, done.stderr


def test_importing_the_loops_loads_no_compiler() -> None:
    script = "import sys\nfrom colloc.kernels import loading\nassert 'numba' not in sys.modules"
    assert subprocess.run([sys.executable, "-c", script], timeout=60).returncode == 0
