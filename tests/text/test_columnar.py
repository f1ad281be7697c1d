"""Parquet and Arrow: rows as documents, values as metadata, and files that lie about their size."""

from __future__ import annotations

import datetime
import decimal
import gzip
import json
import resource
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pyarrow as pa
import pyarrow.feather as feather
import pyarrow.parquet as pq
import pytest

from colloc.errors import DataError
from colloc.settings import ReadSettings
from colloc.text import columnar
from colloc.text.sources import open_sources

from .samples import HOSTILE, count_characters, prose, read_documents, read_texts


def _stream(table: Any, path: str) -> None:
    with pa.ipc.new_stream(path, table.schema) as writer:
        writer.write_table(table, max_chunksize=3)


WRITERS: dict[str, Callable[[Any, str], object]] = {
    "a.parquet": lambda table, path: pq.write_table(table, path, row_group_size=4),
    "b.parquet": lambda table, path: pq.write_table(table, path, use_dictionary=False, compression="zstd"),
    "c.parquet": lambda table, path: pq.write_table(
        table, path, use_dictionary=False, column_encoding={"text": "DELTA_BYTE_ARRAY", "id": "DELTA_BYTE_ARRAY"}
    ),
    "a.feather": lambda table, path: feather.write_feather(table, path, chunksize=3),
    "a.arrows": _stream,
    "b.arrow": _stream,
}


@pytest.mark.parametrize("name", WRITERS)
def test_rows_come_back(tmp_path: Path, name: str) -> None:
    texts = [*HOSTILE, prose(1, 1_100_000)]
    table = pa.table({"id": [f"d{n}" for n in range(len(texts))], "text": texts, "year": range(len(texts))})
    WRITERS[name](table, str(tmp_path / name))
    documents = read_documents(tmp_path / name)
    assert ["".join(document.pieces) for document in documents] == texts
    assert [(document.identifier, document.metadata["year"], document.record) for document in documents] == [
        (f"d{n}", n, n) for n in range(len(texts))
    ]
    for skip in (1, 4, 5, len(texts)):
        assert read_documents(tmp_path / name, skip=skip) == documents[skip:]


def test_values_as_metadata(tmp_path: Path) -> None:
    path = tmp_path / "v.parquet"
    columns = {
        "text": ["a", "b"],
        "day": [datetime.date(1900, 1, 2), None],
        "at": [datetime.datetime(1900, 1, 2, 3, 4), None],
        "price": [decimal.Decimal("1.50"), None],
        "tags": [["x", "é"], None],
        "rate": [0.5, float("nan")],
        "open": [True, None],
        "kind": pa.array(["log", "log"]).dictionary_encode(),
    }
    pq.write_table(pa.table(columns), path)
    first, second = read_documents(path)
    assert dict(first.metadata) == {
        "day": "1900-01-02",
        "at": "1900-01-02T03:04:00",
        "price": "1.50",
        "tags": '["x", "é"]',
        "rate": 0.5,
        "open": True,
        "kind": "log",
    }
    assert dict(second.metadata) == {**dict.fromkeys(first.metadata), "kind": "log"}
    assert second.identifier == "v.parquet:2"


def test_packed_and_digest(tmp_path: Path) -> None:
    path = tmp_path / "a.parquet"
    pq.write_table(pa.table({"text": ["one", "two"]}), path)
    (tmp_path / "a.parquet.gz").write_bytes(gzip.compress(path.read_bytes()))
    assert read_texts(tmp_path / "a.parquet.gz") == ["one", "two"]
    (source,) = open_sources([str(path)], ReadSettings())
    assert [document.record for document in source.documents()] == [0, 1]
    assert (len(source.digest()), source.position) == (32, 1.0)


@pytest.mark.parametrize(
    ("table", "settings", "message"),
    [
        ({"words": ["a"]}, ReadSettings(), "no column 'text' .columns: 'words'."),
        ({"text": [1]}, ReadSettings(), "column 'text' holds int64, not text"),
        ({"text": ["a", None]}, ReadSettings(), "row 2: column 'text' holds no text"),
        ({"text": ["a" * 5000]}, ReadSettings(max_record=1024), "row 1: more than 1,024 bytes"),
        ({"text": ["a"], "name": [None]}, ReadSettings(id_column="name"), "row 1: column 'name' holds no identifier"),
        ({"text": ["ab"] * 30}, ReadSettings(max_unpacked=50), "more than the 50 characters allowed"),
        ({"text": ["a"], **{f"c{n}": [1] for n in range(5000)}}, ReadSettings(), "5,001 columns, more than 4,096"),
    ],
)
def test_wrong_tables(tmp_path: Path, table: dict[str, list[Any]], settings: ReadSettings, message: str) -> None:
    path = tmp_path / "wrong.parquet"
    pq.write_table(pa.table(table), path)
    with pytest.raises(DataError, match=rf"wrong\.parquet: {message}"):
        read_texts(path, settings)


@pytest.mark.parametrize("name", ["wide.parquet", "wide.feather", "wide.arrows"])
def test_a_description_that_would_fill_the_memory(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, name: str) -> None:
    monkeypatch.setattr(columnar, "LARGEST_FOOTER", 2**12)
    table = pa.table({"text": ["a"], **{f"column{number}": [number] for number in range(200)}})
    WRITERS[name.replace("wide", "a")](table, str(tmp_path / name))
    with pytest.raises(DataError, match=rf"{name}: describes its columns in [\d,]+ bytes, more than 4,096"):
        read_texts(tmp_path / name)


@pytest.mark.parametrize("name", ["wide.jsonl", "wide.csv"])
def test_records_of_very_many_columns(tmp_path: Path, name: str) -> None:
    names = [f"c{number}" for number in range(100_000)]
    if name == "wide.jsonl":
        content = json.dumps({"text": "a", **dict.fromkeys(names, 1)})
    else:
        content = f"text,{','.join(names)}\na{',1' * len(names)}\n"
    (tmp_path / name).write_text(content)
    with pytest.raises(DataError, match=rf"{name}: record 1: 100,000 columns, more than 4,096"):
        read_texts(tmp_path / name)


@pytest.mark.parametrize(
    ("name", "data"),
    [("a.parquet", b"PAR1" + b"0" * 90), ("a.parquet", b"text"), ("a.feather", b"ARROW1"), ("a.arrow", b"\xff" * 64)],
)
def test_no_tables(tmp_path: Path, name: str, data: bytes) -> None:
    (tmp_path / name).write_bytes(data)
    with pytest.raises(DataError, match=name):
        read_texts(tmp_path / name)


def test_a_string_said_once_and_meant_often_stays_bounded(tmp_path: Path) -> None:
    """A file of some kilobytes whose rows are 3,000 times the same 24 MB: few rows are held at once."""
    path = tmp_path / "bomb.parquet"
    often = pa.DictionaryArray.from_arrays(pa.array([0] * 3000, pa.int32()), pa.array(["sea " * 6_000_000]))
    pq.write_table(pa.table({"text": often}), path, compression="zstd")
    del often
    assert path.stat().st_size < 20_000
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    with pytest.raises(DataError, match=r"bomb\.parquet: more than the 600,000,000 characters allowed"):
        count_characters(path, ReadSettings(max_unpacked=600_000_000))
    # Two batches of half a GiB at most, in whatever form.
    assert resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before < 2 * 2**20


def test_speed_beside_json_lines(tmp_path: Path) -> None:
    texts = [prose(seed, 4000) for seed in range(60)] * 60
    pq.write_table(pa.table({"text": texts}), tmp_path / "a.parquet")
    (tmp_path / "a.jsonl").write_text("".join(json.dumps({"text": text}) + "\n" for text in texts))

    def seconds(name: str) -> float:
        took = []
        for _ in range(3):
            start = time.process_time()
            assert count_characters(tmp_path / name) == sum(map(len, texts))
            took.append(time.process_time() - start)
        return min(took)

    # With room for a busy machine; without load it takes less than the same documents in JSON Lines.
    assert seconds("a.parquet") < 2 * seconds("a.jsonl")
