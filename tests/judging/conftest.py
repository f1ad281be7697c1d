"""A small store to judge in: invented sentences of a harbour, with planted pairs and expressions."""

from __future__ import annotations

import json
import shutil
from importlib.resources import as_file, files
from pathlib import Path

import numpy as np
import pytest

import colloc

SENTENCES = (
    "The thick fog came down over the bay",
    "By and large the thick fog stayed till noon",
    "We trimmed the lamp and filled it with clean oil",
    "The lamp burned clean oil by and large all night",
    "A strong wind drove the boat past the reef",
    "The boat and the strong wind were of one mind",
    "They took the tide into account before they sailed",
    "She took the weather into account and stayed",
    "The keeper counted the boats at dawn",
    "At dawn the keeper wrote the log",
)


def harbour_lines() -> list[str]:
    """Sixty documents of twelve sentences each, chosen by a seeded generator."""
    generator = np.random.default_rng(7)
    lines = []
    for number in range(60):
        chosen = generator.choice(len(SENTENCES), 12)
        text = "".join(f"{SENTENCES[place]}.\n" for place in chosen)
        lines.append(
            json.dumps(
                {
                    "id": f"log {number:02d}",
                    "text": text,
                    "author": f"A. Keeper {number % 3}",
                    "year": 1880 + number % 5,
                }
            )
        )
    return lines


@pytest.fixture(scope="session")
def harbour(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("harbour")
    source = folder / "harbour.jsonl"
    source.write_text("\n".join(harbour_lines()), encoding="utf-8")
    colloc.build(folder / "harbour.colloc", [str(source)], jobs=1)
    return folder / "harbour.colloc"


@pytest.fixture
def store(harbour: Path, tmp_path: Path) -> Path:
    """A copy that the test may write to."""
    return Path(shutil.copy(harbour, tmp_path / "harbour.colloc"))


@pytest.fixture(scope="session")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A store of the demo texts, to read only."""
    path = tmp_path_factory.mktemp("demo") / "demo.colloc"
    with as_file(files("corpora_demo")) as corpus:
        colloc.build(path, sorted(str(text) for text in corpus.glob("*.jsonl")), jobs=1)
    return path
