"""``colloc measure``: values against published tables and scipy, columns passed through, and every bad input."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import numpy as np
import pytest
from scipy.stats import chi2_contingency

import colloc
from colloc.cli.tables_in import ROWS_A_PART, read_rows
from colloc.errors import DataError
from colloc.measures.catalogue import MEASURES

from .conftest import Run

HEADER = "joint,first_total,second_total,total"
# Church & Hanks (1990), Computational Linguistics 16(1), Table 3: printed I(x, y), f(x, y), f(x), f(y), x, y. The paper
# says N = 15 million; all its 43 rows come out for any N from 14,811,507 to 14,859,966.
CHURCH_HANKS = (
    (11.3, 12, 111, 621, "honorary", "doctor"),
    (11.3, 8, 1105, 44, "doctors", "dentists"),
    (10.7, 30, 1105, 241, "doctors", "nurses"),
    (9.4, 8, 1105, 154, "doctors", "treating"),
    (9.0, 6, 275, 621, "examined", "doctor"),
    (8.9, 11, 1105, 317, "doctors", "treat"),
    (8.7, 25, 621, 1407, "doctor", "bills"),
    (8.4, 6, 241, 1105, "nurses", "doctors"),
    (0.96, 6, 621, 73785, "doctor", "with"),
    (0.95, 41, 284690, 1105, "a", "doctors"),
    (0.93, 12, 84716, 1105, "is", "doctors"),
)
# Dunning (1993), Computational Linguistics 19(1), Table 2: -2 log lambda and the four cells, N = 31,777.
DUNNING = (
    (270.72, 110, 2442, 111, 29114),
    (263.90, 29, 13, 123, 31612),
    (167.23, 10, 0, 3, 31764),
    (157.21, 76, 104, 2476, 29121),
    (115.02, 16, 0, 865, 30896),
)


def rows_of(text: str, delimiter: str = ",") -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text, newline=""), delimiter=delimiter))


def test_church_and_hanks(run: Run) -> None:
    lines = [f"{x},{y},{o},{fx},{fy},14835000" for _, o, fx, fy, x, y in CHURCH_HANKS]
    ran = run("measure", "-", "--measure", "pmi", stdin=f"first,second,{HEADER}\n" + "\n".join(lines) + "\n")
    assert ran.code == 0
    rows = rows_of(ran.out)
    for row, (printed, *_, first, second) in zip(rows, CHURCH_HANKS, strict=True):
        digits = 1 if printed > 1 else 2
        assert (row["first"], row["second"]) == (first, second)
        assert round(float(row["pmi"]), digits) == printed


def test_dunning(run: Run) -> None:
    lines = [f"{a},{a + b},{a + c},{a + b + c + d}" for _, a, b, c, d in DUNNING]
    rows = rows_of(run("measure", "-", "-m", "g2", stdin=f"{HEADER}\n" + "\n".join(lines)).out)
    assert [round(float(row["g2"]), 2) for row in rows] == [row[0] for row in DUNNING]


def test_all_measures_when_none_is_named(run: Run) -> None:
    rows = rows_of(run("measure", "-", stdin=f"{HEADER}\n7,20,30,1000\n").out)
    assert list(rows[0]) == [*HEADER.split(","), *MEASURES]
    g2, p = chi2_contingency([[7, 13], [23, 957]], correction=False, lambda_="log-likelihood")[:2]
    assert float(rows[0]["g2"]) == pytest.approx(g2, rel=1e-12)
    assert float(rows[0]["g2_p"]) == pytest.approx(p, rel=1e-9)


def test_other_columns_pass_through_unchanged_and_in_order(run: Run) -> None:
    given = f'note,{HEADER},"odd ""name""",x\n"a, b",7,20,30,1000,007,\'=A1\n"li\nne",3,5,5,1000,-1.50,+\n'
    ran = run("measure", "-", "-m", "npmi,pmi", "--measure", "dice", stdin=given)
    assert ran.err == "# measure: table standard input; measures npmi, pmi, dice\n"
    back = [row[:-3] for row in csv.reader(io.StringIO(ran.out, newline=""))]
    before = list(csv.reader(io.StringIO(given, newline="")))
    before[2][6] = "'+"  # a lone plus sign is guarded
    assert back == before
    assert ran.out.splitlines()[0].endswith(",npmi,pmi,dice")


def test_a_measure_that_is_there_is_computed_anew_in_its_place(run: Run) -> None:
    out = run("measure", "-", "-m", "pmi", stdin=f"pmi,{HEADER}\n99,8,8,8,1024\n").out
    assert out == f"pmi,{HEADER}\n7.0,8,8,8,1024\n"  # log2(8 * 1024 / 64)


@pytest.mark.parametrize("name", ["table.tsv", "table"])
def test_tab_separated(run: Run, tmp_path: Path, name: str) -> None:
    path = tmp_path / name
    path.write_text("\ufeff" + "\t".join(["word", *HEADER.split(",")]) + "\nsea\t7\t20\t30\t1000\n", encoding="utf-8")
    ran = run("measure", path, "-m", "pmi", "--format", "tsv")
    assert rows_of(ran.out, "\t")[0]["word"] == "sea"


def test_json_lines(run: Run) -> None:
    row = {
        "word": "sea",
        "joint": 7,
        "first_total": 20.5,
        "second_total": 30,
        "total": 1000,
        "tags": ["a", 1],
        "x": None,
    }
    ran = run("measure", "-", "-m", "pmi", "--format", "jsonl", stdin=json.dumps(row) + "\n\n" + json.dumps(row))
    for line in ran.out.splitlines():
        assert json.loads(line) == {**row, "pmi": pytest.approx(np.log2(7 * 1000 / (20.5 * 30)))}
    as_csv = rows_of(run("measure", "-", "-m", "pmi", stdin=json.dumps(row)).out)[0]
    assert as_csv["tags"] == '["a", 1]'
    assert as_csv["joint"] == "7"


def test_json_lines_into_parquet(run: Run, tmp_path: Path) -> None:
    import pyarrow.parquet

    goal = tmp_path / "out.parquet"
    rows = [{"joint": 7, "first_total": 20, "second_total": 30, "total": 1000, "x": value} for value in (1, None, [2])]
    ran = run("measure", "-", "-f", "parquet", "-o", goal, stdin="\n".join(map(json.dumps, rows)))
    assert ran.code == 0
    table = pyarrow.parquet.read_table(goal)
    assert table["x"].to_pylist() == ["1", None, "[2]"]
    assert table["joint"].to_pylist() == [7, 7, 7]


def test_a_long_table_comes_in_stretches(run: Run, tmp_path: Path) -> None:
    path = tmp_path / "long.csv"
    numbers = np.arange(1, 2 * ROWS_A_PART + 10)
    path.write_text(f"{HEADER}\n" + "".join(f"{n},{2 * n},{3 * n},{7 * n}\n" for n in numbers.tolist()))
    assert [len(rows) for rows in read_rows(path)] == [ROWS_A_PART, ROWS_A_PART, 9]
    lines = run("measure", path, "-m", "dice").out.splitlines()
    assert len(lines) == len(numbers) + 1
    assert lines[-1] == f"{numbers[-1]},{2 * numbers[-1]},{3 * numbers[-1]},{7 * numbers[-1]},0.4"


def test_a_header_alone_gives_a_header(run: Run) -> None:
    assert run("measure", "-", "-m", "pmi", stdin=f"{HEADER}\n").out == f"{HEADER},pmi\n"


def test_measures_without_cells_may_have_margins_that_are_no_sums(run: Run) -> None:
    table = f"{HEADER}\n9,8,20,1000\n"
    assert run("measure", "-", "-m", "pmi", stdin=table).code == 0
    refused = run("measure", "-", "-m", "pmi,g2", stdin=table)
    assert refused.code == 65
    assert "joint is larger than first_total" in refused.err


BAD = [
    (
        "joint,first_total,total\n1,2,3\n",
        ":1: no column second_total; measures need joint, first_total, second_total, total",
    ),
    (f"{HEADER}\n1,2,3,10\nx,2,3,10\n", ":3: joint is not a number: 'x'; counts are written like 42 or 42.5"),
    (f"{HEADER}\n1,2,3,10\n\n1,,3,10\n", ":4: first_total is not a number: ''"),
    (f"{HEADER}\n1,2,nan,10\n", ":2: second_total is not a number: 'nan'"),
    (f"{HEADER}\n1_0,2,3,10\n", ":2: joint is not a number: '1_0'"),
    (f'note,{HEADER}\n"two\nlines",5,2,3,10\n', ":3: joint is larger than first_total (joint 5, first_total 2,"),
    (f"{HEADER}\n3,5,2,10\n", ":2: joint is larger than second_total"),
    (f"{HEADER}\n1,11,3,10\n", ":2: first_total or second_total is larger than total"),
    (f"{HEADER}\n1,8,8,10\n", ":2: first_total + second_total - joint is larger than total"),
    (f"{HEADER}\n-1,2,3,10\n", ":2: a count is below 0"),
    (f"{HEADER}\n0,0,0,0\n", ":2: total must be above 0"),
    (f"{HEADER}\n1,2,3\n", ":2: 3 cells where the header has 4"),
    (f"{HEADER},joint\n1,2,3,10,1\n", ":1: the header names 'joint' twice"),
    (f'{HEADER}\n1,2,3,"10\n', "not a table of the expected form"),
    (f"{HEADER}\n1,2,3,10\n".encode() + b"1,2,3,\xff\n", ":3: not UTF-8 (byte 7 of the line)"),
    ('{"joint": 1, "first_total": 2, "second_total": 3, "total": 10}\n{"joint": 1,\n', ":2: not a line of JSON"),
    ('{"joint": true, "first_total": 2, "second_total": 3, "total": 10}\n', ":1: joint is not a number: True"),
    ('{"joint": 1, "first_total": 2, "second_total": 3, "total": 10}\n[1]\n', ":2: a JSON object is needed"),
    ('{"joint": 1}\n{"joint": 1, "more": 2}\n', ":2: 'more' is not in the first line"),
    ("{" * 3, ":1: not a line of JSON"),
    ('{"joint": ' + "[" * 100_000 + "\n", ":1: not a line of JSON"),
]


@pytest.mark.parametrize(("table", "message"), BAD)
def test_bad_tables(run: Run, tmp_path: Path, table: str | bytes, message: str) -> None:
    path, goal = tmp_path / "table", tmp_path / "out"
    path.write_bytes(table if isinstance(table, bytes) else table.encode())
    goal.write_text("as it was")
    ran = run("measure", path, "-o", goal)
    assert ran.code == 65
    assert ran.err.startswith(f"colloc: {path}:")
    assert message in ran.err
    assert ran.err.count("\n") == 1
    assert goal.read_text() == "as it was"


def test_an_error_in_a_later_stretch_leaves_no_half_file(run: Run, tmp_path: Path) -> None:
    path, goal = tmp_path / "long.csv", tmp_path / "out"
    path.write_text(f"{HEADER}\n" + "1,2,3,10\n" * (ROWS_A_PART + 5) + "oops,2,3,10\n")
    ran = run("measure", path, "-m", "pmi", "-o", goal)
    assert (ran.code, goal.exists()) == (65, False)
    assert f":{ROWS_A_PART + 7}: joint is not a number" in ran.err


def test_no_table(run: Run, tmp_path: Path) -> None:
    missing = run("measure", tmp_path / "none.csv")
    assert (missing.code, missing.err) == (66, f"colloc: {tmp_path}/none.csv: no such file\n")
    folder = run("measure", tmp_path)
    assert (folder.code, folder.err) == (66, f"colloc: {tmp_path}: cannot be read: Is a directory\n")
    empty = run("measure", "-", stdin="")
    assert empty.code == 66
    assert "standard input: the table is empty" in empty.err


def test_from_python() -> None:
    table = {"joint": [7], "first_total": [20], "second_total": [30], "total": [1000], "word": ["sea"]}
    answer = colloc.measure(table, measures=["pmi"])
    assert answer.names == ("joint", "first_total", "second_total", "total", "word", "pmi")
    assert answer["pmi"][0] == pytest.approx(np.log2(7000 / 600))
    assert colloc.measure(answer, measures=["pmi"]) == answer
    with pytest.raises(DataError, match="row 1: total must be above 0"):
        colloc.measure({**table, "total": [0], "joint": [0], "first_total": [0], "second_total": [0]})


def test_tables_round_numbers_that_pass_through(run: Run, tmp_path: Path) -> None:
    table = tmp_path / "t.csv"
    rows = ["7,64,47,16065942,0.00018722836171075434,1.10,007,a", "8,64,47,16065942,,1.2,012,0.123456"]
    table.write_text("\n".join([f"{HEADER},expected,version,id,note", *rows]) + "\n", encoding="utf-8")
    shown = [line.split() for line in run("measure", table, "-m", "npmi", "-f", "table", "-q").out.splitlines()[1:]]
    assert [row[4:-1] for row in shown] == [["0.0002", "1.10", "007", "a"], ["1.2", "012", "0.123456"]]
    kept = run("measure", table, "-m", "npmi", "-q").out.splitlines()[1:]
    assert [line.rpartition(",")[0] for line in kept] == rows
