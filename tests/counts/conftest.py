"""Both ways of counting: with numpy, and with compiled loops."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from colloc.kernels import switch


@pytest.fixture(scope="module", params=["numpy", "compiled"])
def loops(request: pytest.FixtureRequest) -> Iterator[str]:
    """Each test of a module that uses it runs once with either."""
    switch.use_numpy()
    if request.param == "compiled":
        assert switch.prefer_compiled(True), "numba is missing, or its cache cannot be written"
    yield request.param
    switch.use_numpy()
