"""Stores of every released schema are still read, and renewed when written; ``old_files/make.py`` made them."""

from __future__ import annotations

import gzip
import json
from pathlib import Path
from typing import Any

import pytest

from colloc.store import documents, facts, texts, vocabulary
from colloc.store.checking import check
from colloc.store.database import schema
from colloc.store.opening import Store, open_for_reading, open_for_writing

from .making import WINDOW, table_of

FOLDER = Path(__file__).parent / "old_files"
FILES = sorted(FOLDER.glob("*.gz"))


def test_there_is_one_of_the_present_schema() -> None:
    assert f"schema_{schema.SCHEMA_VERSION}.gz" in [path.name for path in FILES]


def _answers(store: Store) -> dict[str, Any]:
    words = vocabulary.term_texts(store, "fold")
    rows = list(documents.iterate_documents(store))
    return {
        "words": dict(zip(words, vocabulary.word_counts(store, "fold").tokens.tolist(), strict=True)),
        "pairs": sorted([words[x], words[y], count] for (x, y), count in table_of(store, WINDOW).items()),
        "texts": {
            row.identifier: texts.read_text(store, row.first_character, row.first_character + row.n_characters)
            for row in rows
        },
        "metadata": {row.identifier: row.metadata for row in rows},
    }


@pytest.mark.parametrize("original", FILES, ids=lambda path: path.stem)
def test_old_files(original: Path, tmp_path: Path) -> None:
    path = tmp_path / original.stem
    path.write_bytes(gzip.decompress(original.read_bytes()))
    before = path.read_bytes()
    expected = json.loads(original.with_suffix(".json").read_text(encoding="utf-8"))
    with open_for_reading(path) as store:
        assert _answers(store) == expected
        assert check(store) == []
    assert path.read_bytes() == before
    with open_for_writing(path, "test") as store:
        facts.put(store, "written", "now")
        assert store.value("PRAGMA user_version") == schema.SCHEMA_VERSION
        assert _answers(store) == expected
