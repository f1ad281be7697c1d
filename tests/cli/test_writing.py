"""Sizes, spreadsheet guards, formats, files and progress, against Python's own readers and pyarrow's."""

from __future__ import annotations

import csv
import io
import json
import math
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow.parquet
import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.answers.columns import Columns
from colloc.answers.rowtext import QUICK_ROWS
from colloc.cli.output import Target, deliver, settings_line
from colloc.cli.progress import ProgressLine, clock, progress_text
from colloc.cli.render import make_writer
from colloc.cli.sizes import size_in_bytes, written_size
from colloc.errors import UsageError
from colloc.exports.spreadsheets import defuse, restore

TEXT = st.text(st.characters(exclude_categories=("Cs",)), max_size=8)
RISKY = st.text(st.sampled_from("'=+-@\t\ra1.e"), max_size=6)


@pytest.mark.parametrize(
    ("written", "size"),
    [("1", 1), ("2GB", 2 * 1024**3), ("64 mb", 64 * 1024**2), ("1.5KiB", 1536), ("3T", 3 * 1024**4), ("7B", 7)],
)
def test_sizes(written: str, size: int) -> None:
    assert size_in_bytes(written) == size


@pytest.mark.parametrize("wrong", ["", "GB", "-1", "0", "1 PB", "2GB!", "1e9", "½GB"])
def test_what_is_no_size(wrong: str) -> None:
    with pytest.raises(UsageError, match="a size is a number with KB, MB, GB or TB"):
        size_in_bytes(wrong)


@given(st.integers(1, 2**44))
def test_written_sizes_read_back(size: int) -> None:
    assert size_in_bytes(written_size(size)) == pytest.approx(size, rel=0.06)


@given(TEXT | RISKY)
def test_guard_and_back(cell: str) -> None:
    assert restore(defuse(cell)) == cell


@given(TEXT | RISKY)
def test_guarded_cells_are_numbers_or_harmless(cell: str) -> None:
    """OWASP, "CSV Injection": cells must not begin with = + - @ tab or carriage return."""
    written = defuse(cell)
    if written.startswith(("=", "+", "-", "@", "\t", "\r")):
        float(written)


SAMPLE = Columns(
    {
        "first": ["=SUM(A1)", "海", "'=x", 'a "b", c', "-5", None],
        "joint": np.array([1, -2, 3, 4, 2**62, 0]),
        "pmi": np.array([0.1, math.nan, math.inf, -math.inf, 1e-300, -0.25]),
        "kept": np.array([True, False, True, False, True, False]),
    },
    {"window": 5, "where": "genre=log"},
)


def written(file_format: str, answer: Columns = SAMPLE, parts: int = 1) -> bytes:
    stream = io.BytesIO()
    writer = make_writer(file_format, stream, answer.settings)
    step = -(-len(answer) // parts) or 1
    for start in range(0, max(len(answer), 1), step):
        writer.write(answer[start : start + step])
    writer.close()
    return stream.getvalue()


@pytest.mark.parametrize(("file_format", "delimiter"), [("csv", ","), ("tsv", "\t")])
def test_delimited(file_format: str, delimiter: str) -> None:
    rows = list(csv.DictReader(io.StringIO(written(file_format).decode(), newline=""), delimiter=delimiter))
    assert [restore(row["first"]) for row in rows] == ["=SUM(A1)", "海", "'=x", 'a "b", c', "-5", ""]
    assert rows[0]["first"] == "'=SUM(A1)"
    assert [int(row["joint"]) for row in rows] == SAMPLE["joint"].tolist()
    assert [row["pmi"] for row in rows] == ["0.1", "", "inf", "-inf", "1e-300", "-0.25"]
    assert [row["kept"] for row in rows] == ["true", "false"] * 3


@given(st.lists(st.tuples(TEXT | RISKY, st.floats(allow_nan=False)), min_size=1, max_size=5))
def test_csv_gives_back_any_text_and_number(rows: list[tuple[str, float]]) -> None:
    answer = Columns({"first": [row[0] for row in rows], "pmi": np.array([row[1] for row in rows])})
    back = list(csv.reader(io.StringIO(written("csv", answer).decode(), newline="")))[1:]
    assert [(restore(first), float(pmi)) for first, pmi in back] == rows


def expected_values(value: Any) -> Any:
    if isinstance(value, float) and not math.isfinite(value):
        return None if math.isnan(value) else str(value)
    return value


def test_json_lines_and_json() -> None:
    rows = [{name: expected_values(value) for name, value in row.items()} for row in SAMPLE]

    def refuse(name: str) -> None:
        raise AssertionError(f"{name} is not JSON (RFC 8259, section 6)")

    assert [json.loads(line, parse_constant=refuse) for line in written("jsonl").decode().splitlines()] == rows
    for parts in (1, 3):
        whole = json.loads(written("json", parts=parts), parse_constant=refuse)
        assert whole == {"settings": {"window": 5, "where": "genre=log"}, "rows": rows}
    assert json.loads(written("json", SAMPLE[:0]))["rows"] == []


def test_parquet() -> None:
    table = pyarrow.parquet.read_table(io.BytesIO(written("parquet", parts=2)))
    assert table.column_names == list(SAMPLE.names)
    assert table["first"].to_pylist() == SAMPLE["first"].tolist()
    np.testing.assert_array_equal(table["pmi"].to_numpy(), SAMPLE["pmi"])
    assert json.loads(table.schema.metadata[b"colloc"]) == {"window": 5, "where": "genre=log"}


def test_table_is_aligned_in_one_or_many_parts() -> None:
    lines = written("table").decode().splitlines()
    assert lines[0].split() == ["first", "joint", "pmi", "kept"]
    # first takes 8 cells, joint 19, pmi 10 (1.000e-300); two between columns.
    assert lines[2] == "海" + " " * (6 + 2 + 17) + "-2" + " " * (2 + 10 + 2) + "no"
    many = written("table", parts=6).decode().splitlines()
    assert len(many) == len(lines) == 7
    assert [line.split() for line in many] == [line.split() for line in lines]


@pytest.mark.parametrize("file_format", ["table", "csv", "tsv", "jsonl", "json", "parquet"])
def test_files_are_whole_or_not_there(tmp_path: Path, file_format: str, capsys: pytest.CaptureFixture[str]) -> None:
    goal = tmp_path / "out"
    target = Target(file_format, goal, settings_beside=True)
    deliver(SAMPLE, target, "pairs")
    assert goal.read_bytes() == written(file_format) or file_format == "parquet"
    assert json.loads((tmp_path / "out.settings.json").read_text()) == {
        "colloc": "0.1.0",
        "command": "pairs",
        "settings": {"window": 5, "where": "genre=log"},
    }
    assert capsys.readouterr() == ("", "# pairs: window 5; where genre=log\n")
    before = goal.read_bytes()
    with pytest.raises(TypeError):
        deliver(Columns({"x": np.array([object()])}, {"bad": object()}), target, "pairs")
    if file_format in ("json", "parquet"):
        assert goal.read_bytes() == before
    assert sorted(path.name for path in tmp_path.iterdir()) == ["out", "out.settings.json"]


PAIR_SETTINGS = {
    "store": "x",
    "layer": "fold",
    "kind": "window",
    "left": 0,
    "right": 5,
    "inside": "sentence",
    "where": "",
    "relation": "",
    "margins": "pairs",
    "directed": False,
    "spanned": True,
    "min_word_count": 1,
}


@pytest.mark.parametrize(
    ("changes", "line"),
    [
        ({}, "store x; layer fold; window 5; inside sentence; margins pairs; min word count 1"),
        (
            {"kind": "span", "left": 1, "right": 0, "directed": True},
            "store x; layer fold; left 1; right 0; inside sentence; margins pairs; directed; min word count 1",
        ),
        ({"kind": "unit", "right": 0}, "store x; layer fold; unit; inside sentence; margins pairs; min word count 1"),
        (
            {"kind": "relation", "relation": "obj"},
            "store x; layer fold; relation obj; inside sentence; margins pairs; min word count 1",
        ),
        (
            {"kind": "relation"},
            "store x; layer fold; relation; inside sentence; margins pairs; min word count 1",
        ),
        (
            {"margins": "tokens", "spanned": False, "words": ["a", "b"]},
            "store x; layer fold; window 5; inside sentence; margins tokens; min word count 1; words a, b; no span",
        ),
    ],
)
def test_settings_line_uses_the_words_of_the_options(changes: dict[str, Any], line: str) -> None:
    assert settings_line("pairs", {**PAIR_SETTINGS, **changes}) == f"# pairs: {line}"


class Screen(io.StringIO):
    def isatty(self) -> bool:
        return True


def test_progress_only_on_a_terminal() -> None:
    for stream, quiet in ((io.StringIO(), False), (Screen(), True)):
        with ProgressLine(quiet=quiet, stream=stream) as progress:
            progress(0.5, 1000, "reading")
        assert stream.getvalue() == ""


def test_progress_line_is_redrawn_and_wiped() -> None:
    screen = Screen()
    with ProgressLine(stream=screen) as progress:
        progress(0.0, 0, "reading the text")
        progress(0.1, 10, "reading the text")
        progress(0.5, 10, "counting")
    text = screen.getvalue()
    assert "reading the text    0 %" in text
    assert " 10 %" not in text, "drawn again too soon"
    assert "\rcounting   50 %" in text
    assert text.endswith(" \r")
    assert "\n" not in text


def test_progress_tells_rate_and_time_left() -> None:
    assert progress_text(0.25, 3_000_000, "reading", 2.0) == "reading   25 %  1.50 M tokens/s  0:06 left"
    assert progress_text(0.0, 0, "reading", 0.1) == "reading    0 %"
    assert progress_text(1.2, 5, "reading", 0.1) == "reading  100 %"
    assert [clock(seconds) for seconds in (0, 59.6, 3725)] == ["0:00", "1:00", "1:02:05"]


@pytest.mark.parametrize(("file_format", "delimiter"), [("csv", ","), ("tsv", "\t")])
def test_many_rows_are_the_same_characters_as_few(file_format: str, delimiter: str) -> None:
    """A large part is written at once: it must be what its rows are one by one, quotes and guards too."""
    random = np.random.default_rng(2)
    n = QUICK_ROWS + 100
    texts = np.array(["sea", "'tis", "1,000", "=A1", 'a "b"', "tab\there", "", "-5", "two\nlines"], dtype=object)
    answer = Columns(
        {
            "first": texts[random.integers(0, len(texts), n)],
            "joint": random.integers(0, 50, n),
            "total": random.integers(0, 9, n) / 2,
            "pmi": np.where(
                random.random(n) < 0.1, np.nan, random.standard_normal(n) * 10.0 ** random.integers(-9, 9, n)
            ),
            "a, b": np.where(random.random(n) < 0.5, None, 1.5),
        }
    )
    whole, piecemeal = io.BytesIO(), io.BytesIO()
    for stream, size in ((whole, n), (piecemeal, QUICK_ROWS // 3)):
        writer = make_writer(file_format, stream, {})
        for start in range(0, n, size):
            writer.write(answer[start : start + size])
    assert whole.getvalue() == piecemeal.getvalue()
    rows = list(csv.reader(io.StringIO(whole.getvalue().decode(), newline=""), delimiter=delimiter))
    assert len(rows) == n + 1
    assert [restore(row[0]) for row in rows[1:]] == answer["first"].tolist()
