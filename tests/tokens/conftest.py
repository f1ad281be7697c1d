"""Tests of this folder that hold for arrays and for compiled loops."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from colloc.kernels import switch


@pytest.fixture(scope="module", params=["arrays", "compiled"])
def both_ways(request: pytest.FixtureRequest) -> Iterator[None]:
    """The tests of a module once with numpy and once with compiled loops."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv(switch.SWITCH, "1" if request.param == "compiled" else "0")
        switch.use_numpy()
        assert switch.prefer_compiled(True) == (request.param == "compiled")
        yield
        switch.use_numpy()
