"""``colloc expressions`` says what the Python call says, in every form of writing, and refuses what makes no sense."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import pytest

import colloc

from .conftest import Run

SENTENCES = [
    "The keeper trimmed the wick by and large",
    "By and large the fog came back at dawn",
    "We kept nets in order",
]
MORE = ["They kept ropes in order", "Fog came by and large at night", "The crew kept boats in order"]


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("expressions")
    for number in range(4):
        (folder / f"log-{number}.txt").write_text(". ".join([*SENTENCES, *MORE] * 2) + ".", encoding="utf-8")
    colloc.build(folder / "logs.colloc", [str(path) for path in sorted(folder.glob("*.txt"))], jobs=1)
    return folder / "logs.colloc"


def test_table_leads_with_the_unit_and_states_the_settings(run: Run, store: Path) -> None:
    ran = run("expressions", store, "--common", "keep", "-n", 2, "--show", "count,fragment")
    assert ran.code == 0
    heading, first, _second = ran.out.splitlines()
    assert heading.split() == ["expression", "count", "strength", "fragment"]
    assert first.startswith("by and large ")
    assert ran.err.startswith("# expressions: ")
    for stated in ("layer fold", "inside sentence", "min words 2", "max words 6", "min docs 3", "rank strength"):
        assert stated in ran.err


def test_csv_is_the_python_call(run: Run, store: Path) -> None:
    ran = run("expressions", store, "--min-words", 3, "--rank", "count", "-n", 0, "--format", "csv", "-q")
    answer = colloc.expressions(store, min_words=3, rank="count", limit=0)
    rows = list(csv.DictReader(io.StringIO(ran.out)))
    assert [row["expression"] for row in rows] == answer["expression"].tolist()
    assert [int(row["count"]) for row in rows] == answer["count"].tolist()
    assert len(rows) > 2
    assert ran.err == ""


def test_frames(run: Run, store: Path) -> None:
    ran = run("expressions", store, "--slots", 1, "--common", "keep", "-n", 0, "--format", "jsonl")
    rows = {row["expression"]: row for row in map(json.loads, ran.out.splitlines())}
    assert rows["kept _ in order"]["fillers"] == "boats 8, nets 8, ropes 8"
    assert "slots 1" in ran.err


@pytest.mark.parametrize(
    ("options", "code", "said"),
    [
        (["--max-words", "9"], 2, "expressions have 2 to 8 words"),
        (["--min-count", "1"], 2, "--min-count"),
        (["--rank", "beauty"], 2, "--rank"),
        (["--show", "beauty"], 2, "no column 'beauty' here"),
        (["--slots", "1", "--rank", "c_value"], 2, "open slots"),
        (["--pattern", "ADJ NOUN"], 2, "no word classes"),
        (["--where", "year=1900"], 2, "no document has the key 'year'"),
        (["--memory", "1MB"], 2, "--memory must be at least"),
    ],
)
def test_refusals(run: Run, store: Path, options: list[str], code: int, said: str) -> None:
    ran = run("expressions", store, *options)
    assert (ran.code, ran.out) == (code, "")
    assert said in ran.err
    assert ran.err.count("\n") == 1


def test_no_such_store(run: Run, tmp_path: Path) -> None:
    ran = run("expressions", tmp_path / "none.colloc")
    assert ran.code == 66


def test_an_expression_leads_to_its_lines(run: Run, store: Path) -> None:
    ran = run("lines", store, "by and large", "--format", "jsonl", "-n", 0)
    assert len(ran.out.splitlines()) == 24
