"""The demo corpora with a notice that repeats a phrase five hundred times."""

from __future__ import annotations

import json
import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest

import colloc
from colloc.store.opening import Store

CORPORA = Path(__file__).resolve().parents[3] / "corpora_demo"
PHRASE = "the gilded parrot whistles."


@pytest.fixture(scope="session")
def talkative(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Store]:
    """Logs, notices, and one more notice that says ``PHRASE`` 500 times."""
    folder = tmp_path_factory.mktemp("talkative")
    for name in ("logbooks.jsonl", "notices.jsonl"):
        shutil.copy(CORPORA / name, folder / name)
    parrot = {"id": "parrot", "genre": "notice", "year": 1880, "text": " ".join([PHRASE.capitalize()] * 500)}
    (folder / "parrot.jsonl").write_text(json.dumps(parrot) + "\n", encoding="utf-8")
    colloc.build(folder / "t.colloc", [str(folder)], jobs=1)
    with colloc.open_store(folder / "t.colloc") as store:
        yield store


@pytest.fixture(scope="session")
def logs_only(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Store]:
    """A fresh store of the logs alone."""
    folder = tmp_path_factory.mktemp("logs")
    shutil.copy(CORPORA / "logbooks.jsonl", folder / "logbooks.jsonl")
    colloc.build(folder / "logs.colloc", [str(folder / "logbooks.jsonl")], jobs=1)
    with colloc.open_store(folder / "logs.colloc") as store:
        yield store
