"""``matrix``, ``vectors``, ``similar``, ``score``, ``join`` and ``features`` from the command line."""

from __future__ import annotations

import csv
import io
import json
import shutil
from pathlib import Path

import numpy as np
import pytest

import colloc

from .conftest import Run, process

TEXTS = {
    "log": "Thick fog at dawn. The fog horn sounded twice. Heavy rain fell at dawn and heavy rain fell again. " * 3,
    "notice": "The ferry leaves at dawn. The ferry brings letters and the ferry brings news. No dogs on the ferry. "
    * 3,
}


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("engineering")
    lines = [
        json.dumps({"id": f"{genre}{n}", "genre": genre, "text": text})
        for genre, text in TEXTS.items()
        for n in range(4)
    ]
    (folder / "a.jsonl").write_text("\n".join(lines) + "\n", encoding="utf-8")
    colloc.build(folder / "s.colloc", [str(folder / "a.jsonl")], jobs=1)
    return folder / "s.colloc"


def rows_of(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text)))


def test_matrix_with_lists(run: Run, store: Path, tmp_path: Path) -> None:
    (tmp_path / "rows.txt").write_text("ferry\nfog\n", encoding="utf-8")
    ran = run("matrix", store, "-o", tmp_path / "m.mtx", "--rows-from", tmp_path / "rows.txt", "--weighting", "linear")
    assert ran.code == 0, ran.err
    assert ran.out.startswith(f"{tmp_path}/m.mtx: 2 rows, ")
    assert "rows 2 listed" in ran.err
    assert "weighting linear" in ran.err
    assert json.loads((tmp_path / "m.mtx.labels.json").read_text())["rows"] == ["ferry", "fog"]
    assert run("matrix", store, "-o", tmp_path / "m", "--value", "g2", "--weighting", "linear").code == 2
    assert run("matrix", store, "-o", tmp_path / "m", "--rows-from", tmp_path / "none.txt").code == 66
    assert run("matrix", store, "-o", tmp_path / "no" / "m").code == 73


def test_contexts_of_another_layer(run: Run, store: Path, tmp_path: Path) -> None:
    ran = run("matrix", store, "-o", tmp_path / "m.npz", "--context-layer", "form", "--value", "count")
    assert ran.code == 0, ran.err
    assert "layer fold; " in ran.err
    assert "context layer form" in ran.err
    labels = json.loads((tmp_path / "m.npz.labels.json").read_text())
    assert "the" in labels["rows"]
    assert "The" not in labels["rows"]
    assert {"the", "The"} <= set(labels["columns"])
    assert run("matrix", store, "-o", tmp_path / "m.npz", "--context-layer", "form", "--unit").code == 2


def test_vectors_written_and_judged(run: Run, store: Path, tmp_path: Path) -> None:
    ran = run("vectors", store, "-d", 5, "-o", tmp_path / "v")
    assert ran.code == 0, ran.err
    assert np.load(tmp_path / "v.npy").shape[1] == 5
    judged = tmp_path / "judged.tsv"
    judged.write_text("fog\train\t7\nferry\tnews\t6\nfog\tferry\t1\nkraken\tfog\t3\ndawn\train\t5\n", encoding="utf-8")
    ran = run("vectors", store, "-d", 5, "--evaluate", judged, "--format", "json", "--quiet")
    (row,) = json.loads(ran.out)["rows"]
    assert (row["pairs"], row["covered"], row["coverage"]) == (5, 4, 0.8)
    judged.write_text("fog rain\n", encoding="utf-8")
    ran = run("vectors", store, "-d", 5, "--evaluate", judged)
    assert (ran.code, ran.err.count("\n")) == (65, 1)
    assert run("vectors", store).code == 2
    ran = run("vectors", store, "-d", 500, "-o", tmp_path / "w")
    assert "dimensions must be between 1 and" in ran.err
    similar = run("similar", store, "fog", "--vectors", tmp_path / "v.npy", "-n", 3, "--format", "csv")
    assert len(rows_of(similar.out)) == 3
    assert run("similar", store, "kraken").code == 1


def test_similar_shows_shared_contexts(run: Run, store: Path) -> None:
    rows = rows_of(run("similar", store, "fog", "-n", 2, "--format", "csv").out)
    assert [row["word"] for row in rows] == ["fog", "fog"]
    assert rows[0]["cosine"] >= rows[1]["cosine"]
    assert rows[0]["shared"]


def test_score_in_a_pipe(store: Path) -> None:
    ran = process("score", store, "-", "--show", "pmi", stdin=b"id,first,second\n7,fog,thick\n8,Fog,kraken\n")
    assert ran.code == 0, ran.err
    rows = rows_of(ran.out)
    assert [(row["id"], row["first"], row["unknown"]) for row in rows] == [("7", "fog", ""), ("8", "Fog", "second")]
    assert float(rows[0]["pmi"]) > 0
    assert rows[1]["pmi"] == ""
    ran = process("score", store, "-", stdin=b"a,b\n1,2\n")
    assert (ran.code, ran.err.splitlines()[-1]) == (
        65,
        "colloc: standard input:1: no column first and no column second; there are a, b",
    )
    assert process("score", store, "-", "--show", "nothing", stdin=b"first,second\na,b\n").code == 2


def test_pairs_pipe_into_score(run: Run, store: Path) -> None:
    listed = run("pairs", store, "--format", "csv", "--min-count", 2).out
    rows = rows_of(run("score", store, "-", "--show", "npmi", stdin=listed).out)
    assert [(row["first"], row["joint"]) for row in rows] == [(row["first"], row["joint"]) for row in rows_of(listed)]


def test_join_text_and_records(run: Run, store: Path, tmp_path: Path) -> None:
    listed = tmp_path / "listed.txt"
    listed.write_text("fog horn\t2\nthick fog\t1\nthe * brings\n", encoding="utf-8")
    options = ["--expressions", listed]
    ran = run("join", store, "-", *options, stdin="Thick fog horn!\nThe ferry brings it.\n")
    assert (ran.code, ran.out) == (0, "Thick fog_horn!\nThe_ferry_brings it.\n")
    assert ran.err == "# join: 3 expressions; 2 joined\n"
    records = tmp_path / "a.jsonl"
    records.write_text('{"n": 1, "text": "é fog horn"}\n\n{"n": 2, "text": "thick\\nfog"}\n', encoding="utf-8")
    offsets = tmp_path / "offsets.jsonl"
    ran = run("join", store, records, *options, "--joiner", "-", "--offsets", offsets, "-q", "--across-lines")
    assert [json.loads(line) for line in ran.out.splitlines()] == [
        {"n": 1, "text": "é fog-horn"},
        {"n": 2, "text": "thick-fog"},
    ]
    assert [json.loads(line) for line in offsets.read_text().splitlines()] == [
        {"record": 0, "start": 2, "end": 10, "joined_start": 2, "joined_end": 10, "expression": "fog horn"},
        {"record": 1, "start": 0, "end": 9, "joined_start": 0, "joined_end": 9, "expression": "thick fog"},
    ]


@pytest.mark.parametrize(
    ("name", "data", "message"),
    [
        ("a.txt", b"fog \xff horn", "not UTF-8 at byte 4"),
        ("a.jsonl", b'{"text": "a"}\n{"text": 3}\n', "a.jsonl:2: no text under the key 'text'"),
        ("a.jsonl", b'{"text": "a"}\n{\n', "a.jsonl:2: not JSON"),
    ],
)
def test_join_says_where_input_is_bad(
    run: Run, store: Path, tmp_path: Path, name: str, data: bytes, message: str
) -> None:
    (tmp_path / name).write_bytes(data)
    (tmp_path / "listed.txt").write_text("fog horn\n", encoding="utf-8")
    ran = run("join", store, tmp_path / name, "--expressions", tmp_path / "listed.txt", "-o", tmp_path / "out")
    assert ran.code == 65
    assert message in ran.err
    assert not (tmp_path / "out").exists()


def test_join_wants_to_know_which(run: Run, store: Path) -> None:
    ran = run("join", store, "-", stdin="x")
    assert (ran.code, "say which expressions" in ran.err) == (2, True)
    assert run("join", store, "-", "--accepted", stdin="x").code == 2  # none is accepted in this store


def test_join_says_what_it_leaves_out(run: Run, store: Path, tmp_path: Path) -> None:
    own = Path(shutil.copy(store, tmp_path / "own.colloc"))
    colloc.judge(own, ["fog", "thick"], "accept", by="Ann")
    ran = run("join", own, "-", "--accepted", stdin="x")
    assert (ran.code, "is accepted (1 of its pairs without direction" in ran.err) == (2, True)
    colloc.judge(own, "thick fog", "accept", by="Ann")
    ran = run("join", own, "-", "--accepted", stdin="thick fog")
    assert ran.out == "thick_fog"
    assert ran.err.splitlines()[0] == "# join: 1 expression; 1 joined"
    assert ran.err.splitlines()[1].startswith("# 1 accepted pair was left out: only expressions and directed pairs")


def test_features(run: Run, store: Path) -> None:
    rows = rows_of(run("features", store, "--label", "genre", "--format", "csv", "--each-label").out)
    assert {row["word"]: row["label"] for row in rows}["fog"] == "log"
    assert {float(row["mutual_information"]) for row in rows[:2]} == {1.0}
    assert "documents:notice" in rows[0]
    pairs = rows_of(run("features", store, "--label", "genre", "--pairs", "--format", "csv").out)
    assert {"first", "second", "q"} <= pairs[0].keys()
    assert run("features", store, "--label", "colour").code == 2
