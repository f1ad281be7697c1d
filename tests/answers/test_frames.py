"""Answers as data frames: types and values in pandas, Polars and Arrow are those of the columns, for every question."""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import polars as pl
import pyarrow as pa
import pytest

import colloc
from colloc.answers.columns import Columns

CORPORA = Path(__file__).resolve().parents[2] / "corpora_demo"
ARROW = {"O": pa.string(), "i": pa.int64(), "f": pa.float64(), "b": pa.bool_()}
POLARS = {"O": pl.String(), "i": pl.Int64(), "f": pl.Float64(), "b": pl.Boolean()}
QUESTIONS: dict[str, Callable[[Path], Columns]] = {
    "pairs": lambda store: colloc.pairs(store, limit=30),
    "around": lambda store: colloc.around(store, "fog", limit=20),
    "words": lambda store: colloc.words(store, limit=20),
    "score": lambda store: colloc.score(store, [("fog", "thick"), ("fog", "kraken")]),
    "similar": lambda store: colloc.similar(store, "fog", limit=5),
    "features": lambda store: colloc.features(store, label="author", limit=5),
    "lines": lambda store: colloc.lines(store, "thick fog", limit=5),
}


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("frames") / "s.colloc"
    colloc.build(path, [str(CORPORA / "logbooks.jsonl")], jobs=1)
    return path


def same(one: Any, other: Any) -> bool:
    if isinstance(one, float) and math.isnan(one):
        return other is None or math.isnan(other)
    return bool(one == other)


@pytest.mark.parametrize("question", QUESTIONS)
def test_types_and_values(store: Path, question: str) -> None:
    answer = QUESTIONS[question](store)
    assert len(answer) > 0
    table, frame, other = answer.to_arrow(), answer.to_polars(), answer.to_pandas()
    assert table.column_names == frame.columns == list(other.columns) == list(answer.names)
    assert json.loads(table.schema.metadata[b"colloc"])["store"] == other.attrs["colloc"]["store"] == str(store)
    for name in answer.names:
        kind = answer[name].dtype.kind
        assert table.schema.field(name).type == ARROW[kind]
        assert frame.schema[name] == POLARS[kind]
        assert other[name].dtype.kind == kind or kind == "O"
        for values in (table[name].to_pylist(), frame[name].to_list(), other[name].tolist()):
            expected = [v if v is None or kind != "O" or isinstance(v, str) else json.dumps(v) for v in answer[name]]
            assert all(map(same, expected, values)), name
            assert len(values) == len(answer)
