"""The committed corpora, read once."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

FOLDER = Path(__file__).resolve().parents[2] / "corpora_demo"


@pytest.fixture(scope="session")
def committed() -> list[dict[str, Any]]:
    """All committed documents, logs first."""
    names = ("logbooks.jsonl", "notices.jsonl")
    return [json.loads(line) for name in names for line in (FOLDER / name).read_text(encoding="utf-8").splitlines()]


@pytest.fixture(scope="session")
def ordinary(committed: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """All documents but the talkative one, which is the log in the middle."""
    truths = json.loads((FOLDER / "truths.json").read_text(encoding="utf-8"))
    return [document for document in committed if document["id"] != truths["committed"]["talkative_document"]]


@pytest.fixture(scope="session")
def items() -> list[dict[str, Any]]:
    """The planted items of the committed ``truths.json``."""
    found: list[dict[str, Any]] = json.loads((FOLDER / "truths.json").read_text(encoding="utf-8"))["items"]
    return found
