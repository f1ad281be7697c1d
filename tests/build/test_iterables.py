"""Documents from Python: every form of one, what is refused, and what a failure leaves behind."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import colloc
from colloc.errors import CannotCreateError, DataError, UsageError
from colloc.settings import ReadSettings
from colloc.store import facts
from colloc.store.documents import iterate_documents
from colloc.store.inputs.sources import source_list
from colloc.store.opening import open_for_reading, open_for_writing

SENTENCE = "Strong tea and fresh bread. "


def documents_of(path: Path) -> list[tuple[str, dict[str, Any], int]]:
    with open_for_reading(path) as store:
        return [(row.identifier, dict(row.metadata), row.n_tokens) for row in iterate_documents(store)]


def test_the_same_store_as_from_a_file(tmp_path: Path) -> None:
    texts = [SENTENCE * (n % 7 + 1) for n in range(40)]
    import json

    (tmp_path / "a.jsonl").write_text(
        "".join(json.dumps({"id": f"d{n}", "text": text, "year": 1900 + n}) + "\n" for n, text in enumerate(texts))
    )
    colloc.build(tmp_path / "file.colloc", [str(tmp_path / "a.jsonl")], jobs=1)
    rows = ({"id": f"d{n}", "text": text, "year": np.int64(1900 + n)} for n, text in enumerate(texts))
    colloc.build(tmp_path / "rows.colloc", documents=rows, jobs=1)
    assert documents_of(tmp_path / "rows.colloc") == documents_of(tmp_path / "file.colloc")
    both = [colloc.pairs(tmp_path / name, min_count=1).to_dicts() for name in ("file.colloc", "rows.colloc")]
    assert both[0] == both[1]
    assert len(both[0]) > 0


def test_forms_of_a_document(tmp_path: Path) -> None:
    path = tmp_path / "s.colloc"
    colloc.build(path, documents=[SENTENCE, ("x", SENTENCE), ("y", SENTENCE, {"a": [1]})], jobs=1)
    colloc.add(path, documents=[SENTENCE], jobs=1)
    colloc.add(
        path, documents=[{"body": SENTENCE, "key": 7}], read=ReadSettings(text_column="body", id_column="key"), jobs=1
    )
    assert [name for name, _, _ in documents_of(path)] == ["iterable:1", "x", "y", "iterable 2:1", "7"]
    with open_for_reading(path) as store:
        sources = source_list(store)
    assert [source.info.name for source in sources] == ["iterable", "iterable 2", "iterable 3"]
    assert all(source.finished and source.digest for source in sources)


@pytest.mark.parametrize(
    ("value", "message"),
    [
        (7, "document 2: int is no document"),
        ({"words": "a"}, "document 2: no 'text'"),
        (("a", 1), "document 2: its text is int, not str"),
        (("a", "b", 3), "document 2: its metadata is int"),
        (("a", "b", {"k": object()}), "document 2: metadata 'k' cannot be kept"),
        ("\ud800", "document 2: half a surrogate pair"),
    ],
)
def test_what_is_no_document(tmp_path: Path, value: object, message: str) -> None:
    path = tmp_path / "s.colloc"
    with pytest.raises(DataError, match=f"^iterable, {message}"):
        colloc.build(path, documents=[SENTENCE, value], jobs=1)
    assert not path.exists()


def failing() -> Iterator[str]:
    yield SENTENCE * 3
    raise KeyError("the user's own")


def test_a_failure_leaves_the_store_as_it_was(tmp_path: Path) -> None:
    path = tmp_path / "s.colloc"
    with pytest.raises(KeyError):
        colloc.build(path, documents=failing(), jobs=1)
    assert not path.exists()
    colloc.build(path, documents=[SENTENCE], jobs=1)
    with pytest.raises(KeyError):
        colloc.add(path, documents=failing(), jobs=1)
    assert len(documents_of(path)) == 1
    assert colloc.add(path, documents=[SENTENCE], jobs=1).total_documents == 2


def test_an_addition_that_was_killed_is_taken_back(tmp_path: Path) -> None:
    path = tmp_path / "s.colloc"
    colloc.build(path, documents=[SENTENCE], jobs=1)
    with open_for_writing(path, "test") as store, store.transaction():
        facts.put(store, "state", "adding")
        facts.put(store, "pending_inputs", '["iterable 2"]')
    assert colloc.add(path, documents=[SENTENCE], jobs=1).total_documents == 2


def test_what_contradicts(tmp_path: Path) -> None:
    path = tmp_path / "s.colloc"
    with pytest.raises(UsageError, match="inputs or documents, not both"):
        colloc.build(path, ["a.txt"], documents=[SENTENCE])
    colloc.build(path, documents=[SENTENCE], jobs=1)
    with pytest.raises(CannotCreateError, match=r"s\.colloc exists already: use `add`"):
        colloc.build(path, documents=[SENTENCE], jobs=1)
