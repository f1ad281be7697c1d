"""One store of a treebank for the whole folder."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from colloc.build.building import build
from colloc.kernels import switch
from colloc.store.opening import Store, open_for_reading

from .treebanks import treebank_files


@pytest.fixture(scope="module", params=["numpy", "compiled"])
def loops(request: pytest.FixtureRequest) -> Iterator[None]:
    """Each test of a module that uses it runs once with numpy and once with compiled loops."""
    switch.use_numpy()
    if request.param == "compiled":
        assert switch.prefer_compiled(True), "numba is missing, or its cache cannot be written"
    yield
    switch.use_numpy()


@pytest.fixture(scope="session")
def files(tmp_path_factory: pytest.TempPathFactory) -> list[Path]:
    """A treebank in CoNLL-U."""
    return treebank_files(tmp_path_factory.mktemp("treebank"))


@pytest.fixture(scope="session")
def text(files: list[Path]) -> str:
    """The same as text."""
    return "".join(path.read_text(encoding="utf-8") for path in files)


@pytest.fixture(scope="session")
def store_path(files: list[Path], tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A store of it, made by two processes."""
    path = tmp_path_factory.mktemp("store") / "treebank.colloc"
    build(path, [str(file) for file in files], jobs=2)
    return path


@pytest.fixture
def store(store_path: Path) -> Iterator[Store]:
    """The store, open for reading."""
    with open_for_reading(store_path) as opened:
        yield opened
