"""Stores that several tests of answers read: the demo corpora, and texts in several scripts."""

from __future__ import annotations

import json
import shutil
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import pytest

import colloc
from colloc.store.opening import Store

CORPORA = Path(__file__).resolve().parents[2] / "corpora_demo"


@dataclass(frozen=True)
class Demo:
    """A store of the demo corpora and the texts it was built from."""

    store: Store
    texts: dict[str, str]
    metadata: dict[str, dict[str, object]]


SCRIPTS = {
    "ar": "كان البحر هادئا في الصباح. ثم هبت ريح قوية على البحر وعاد الصيادون إلى الميناء. هل رأيت البحر؟",
    "he": "הים היה שקט בבוקר. אחר כך נשבה רוח חזקה מן הים והדייגים חזרו לנמל.",
    "ja": "海は静かだった。「海へ行こう」と彼は言った。漁師たちは海から帰ってきた。",
    "el": "Η θάλασσα ήταν ήρεμη. Ο ΨΑΡΆΣ είδε τη ΘΆΛΑΣΣΑ.",
    "marks": "The e\u0301te\u0301 sea. <script>alert('sea')</script> & \"sea\" <b>sea</b>\u202e sea\x07 sea.",
}
"""Invented sentences: right-to-left, wide, case that folds, combining marks, markup and controls."""


def documents_of(folder: Path) -> Iterator[tuple[str, str, dict[str, object]]]:
    """Identifier, text and metadata of the demo documents."""
    for name in ("logbooks.jsonl", "notices.jsonl"):
        for line in (folder / name).read_text(encoding="utf-8").splitlines():
            record = json.loads(line)
            yield record.pop("id"), record.pop("text"), record


@pytest.fixture(scope="session")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Demo]:
    """The demo corpora as a store open for reading."""
    folder = tmp_path_factory.mktemp("demo")
    for name in ("logbooks.jsonl", "notices.jsonl"):
        shutil.copy(CORPORA / name, folder / name)
    path = folder / "demo.colloc"
    colloc.build(path, [str(folder / "logbooks.jsonl"), str(folder / "notices.jsonl")], jobs=1)
    found = list(documents_of(folder))
    with colloc.open_store(path) as store:
        yield Demo(store, {name: text for name, text, _ in found}, {name: data for name, _, data in found})


def write_documents(path: Path, texts: dict[str, str]) -> str:
    """Texts as JSON Lines."""
    lines = [json.dumps({"id": name, "text": text}, ensure_ascii=False) for name, text in texts.items()]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return str(path)


@pytest.fixture(scope="session")
def scripts(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Store]:
    """A store of ``SCRIPTS``."""
    folder = tmp_path_factory.mktemp("scripts")
    path = folder / "scripts.colloc"
    colloc.build(path, [write_documents(folder / "scripts.jsonl", SCRIPTS)], jobs=1)
    with colloc.open_store(path) as store:
        yield store
