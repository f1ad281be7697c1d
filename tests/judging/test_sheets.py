"""Sheets go out, come back filled in, sorted, filtered or edited; what cannot be right is refused with its row."""

from __future__ import annotations

import csv
import io
import random
import re
import shutil
import tempfile
import zipfile
from pathlib import Path

import openpyxl
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import colloc
from colloc.answers.judging.matters import read_list, written_list
from colloc.answers.judging.sheets import SheetRow
from colloc.cli.app import main
from colloc.cli.sheets_in import sheet_rows
from colloc.errors import DataError

Row = dict[str, str]
HOSTILE = st.text(
    st.one_of(
        st.sampled_from("=+-@\t\r\n'\";,[]_x0041\u202e\u2066\u2069\u200f\u2028\x85\x00\x0b\x1f\ufeff\ufffe\U0001f600"),
        st.characters(exclude_categories=["Cs"]),
    ),
    max_size=12,
)
"""Formula openers, separators, quotes, bidi controls, line separators, controls, XLSX escapes."""


def rows_of(path: Path) -> list[Row]:
    with path.open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def write(path: Path, rows: list[Row], delimiter: str = ",") -> Path:
    with path.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.DictWriter(stream, rows[0].keys(), delimiter=delimiter)
        writer.writeheader()
        writer.writerows(rows)
    return path


@pytest.fixture
def sheet(store: Path, tmp_path: Path) -> Path:
    assert main(["sheet", str(store), "-n", "8", "--lines", "2", "-o", str(tmp_path / "s.csv"), "-q"]) == 0
    return tmp_path / "s.csv"


def test_a_sheet_sorted_filtered_and_filled_comes_back(store: Path, sheet: Path, tmp_path: Path) -> None:
    rows = rows_of(sheet)
    assert len(rows) == 8
    words = [row["words"] for row in rows]
    rows[0] |= {"verdict": "accept", "examples": "1", "labels": "weather; at sea", "note": "'=1+1"}
    rows[3] |= {"verdict": " R ", "note": "two\nlines"}
    random.Random(4).shuffle(rows)
    kept = [row for row in rows if row["words"] != words[5]]
    filled = colloc.take_sheet(store, _read(write(tmp_path / "f.csv", kept, ";")), by="Anna")
    assert (len(filled.decisions), filled.empty) == (2, 5)
    found = {" ".join(row["words"]): row for row in colloc.decisions(store).to_dicts()}
    assert found.keys() == {words[0], words[3]}
    assert found[words[0]]["note"] == "=1+1", "the guard is taken off"
    assert found[words[0]]["labels"] == ["weather", "at sea"]
    example = found[words[0]]["examples"][0]
    marked = [example["text"][begin:end].casefold() for begin, end in example["marks"]]
    assert marked == words[0].split()
    assert found[words[3]]["verdict"] == "reject"
    assert found[words[3]]["note"] == "two\nlines"


def _read(path: Path) -> list[SheetRow]:
    return list(sheet_rows(path))


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"words": "fog boat"}, "were changed since the sheet was written"),
        ({"kind": "directed"}, "were changed"),
        ({"seen": "7"}, "words, layer, kind or seen were changed"),
        ({"seen": "x"}, "`seen` was changed"),
        ({"verdict": "perhaps"}, "the verdict 'perhaps' is none"),
        ({"verdict": "", "note": "why"}, "note without a verdict"),
        ({"examples": "9"}, "no line 9"),
        ({"examples": "log 00:999999"}, "does not stand"),
        ({"examples": "log 00"}, "DOCUMENT:OFFSET"),
        ({"words": ""}, "no words"),
        ({"words": "fog", "check": ""}, "one word only"),
        ({"words": "fog zebra", "check": ""}, "'zebra' never occurs"),
        ({"words": '["fog"', "check": ""}, "begins like a list"),
        ({"judge": "Ben"}, "Ben's, not Anna's: leave --by out, or clear the cell `judge`"),
    ],
)
def test_what_was_broken_by_hand_is_refused_by_row(
    store: Path, sheet: Path, tmp_path: Path, change: Row, message: str, capsys: pytest.CaptureFixture[str]
) -> None:
    rows = rows_of(sheet)
    for row in rows[:4]:
        row["verdict"] = "accept"
    rows[2] |= change
    path = write(tmp_path / "f.csv", rows)
    line = _line_of_row(path, 2)
    assert main(["judge", str(store), "--from", str(path), "--by", "Anna"]) == 65
    error = capsys.readouterr().err
    assert f"f.csv:{line}: " in error
    assert message in error
    assert "nothing was recorded" in error
    assert len(colloc.decisions(store)) == 0


def _line_of_row(path: Path, row: int) -> int:
    """Where a row ends: cells may hold line ends."""
    reader = csv.reader(io.StringIO(path.read_text(encoding="utf-8"), newline=""))
    for _ in range(row + 2):
        next(reader)
    return reader.line_num


def test_the_same_words_twice_with_different_verdicts(store: Path, sheet: Path, tmp_path: Path) -> None:
    rows = rows_of(sheet)
    twice = [rows[0] | {"verdict": "accept"}, rows[1], rows[0] | {"verdict": "reject"}]
    with pytest.raises(DataError, match=r"stands in .* too, decided differently"):
        colloc.take_sheet(store, _read(write(tmp_path / "f.csv", twice)), by="Anna")


def test_a_decision_made_meanwhile_is_a_conflict(store: Path, sheet: Path, tmp_path: Path) -> None:
    rows = rows_of(sheet)
    rows[1]["verdict"] = "accept"
    path = write(tmp_path / "f.csv", rows)
    colloc.judge(store, rows[1]["words"].split(), "reject", by="Anna")
    differing = r"is reject by Anna since .*; verdict: the store says 'reject', the row says 'accept'; .*--override"
    with pytest.raises(DataError, match=differing):
        colloc.take_sheet(store, _read(path), by="Anna")
    assert len(colloc.take_sheet(store, _read(path), by="Ben").decisions) == 1, "another judge is no conflict"
    assert len(colloc.take_sheet(store, _read(path), by="Anna", override=True).decisions) == 1
    assert colloc.take_sheet(store, _read(path), by="Anna").unchanged == 1
    assert [row["verdict"] for row in colloc.decisions(store, by="Anna", history=True)] == ["reject", "accept"]


@pytest.mark.parametrize("verdict", ["accept", "Accepted", " ACCEPT ", "A", "accept\u00a0"])
def test_what_means_the_same_is_no_conflict(store: Path, sheet: Path, tmp_path: Path, verdict: str) -> None:
    rows = rows_of(sheet)
    words = rows[1]["words"].split()
    labels = ["sea", "old  word"]
    colloc.judge(store, words, "accept", by="Anna", sense="dense  air", note="two\nlines", labels=labels)
    rows[1] |= {"verdict": verdict, "sense": " dense air\u00a0", "note": "two\r\nlines ", "labels": "old word ;sea"}
    found = colloc.take_sheet(store, _read(write(tmp_path / "same.csv", rows)), by="Anna")
    assert (len(found.decisions), found.unchanged) == (0, 1)
    rows[1] |= {"sense": "", "note": " ", "labels": ""}
    found = colloc.take_sheet(store, _read(write(tmp_path / "blank.csv", rows)), by="Anna")
    assert (len(found.decisions), found.unchanged) == (0, 1), "an empty cell contradicts nothing"
    [kept] = [row for row in colloc.decisions(store, by="Anna") if list(row["words"]) == words]
    assert (kept["sense"], kept["note"], list(kept["labels"])) == ("dense  air", "two\nlines", labels)
    for change, name, said in (
        ({"verdict": "reject"}, "verdict", "accept"),
        ({"sense": "thin air"}, "sense", "dense  air"),
        ({"labels": "sea"}, "labels", "sea; old  word"),
        ({"note": "two lines, no"}, "note", r"two\nlines"),
    ):
        changed = [*rows[:1], rows[1] | change, *rows[2:]]
        both = f"; {name}: the store says '{said}', the row says '{change[name]}'; nothing was recorded: --override"
        with pytest.raises(DataError, match=f"is accept by Anna since .*{re.escape(both)}"):
            colloc.take_sheet(store, _read(write(tmp_path / "other.csv", changed)), by="Anna")


def test_a_sheet_filled_in_over_two_sittings(store: Path, sheet: Path, tmp_path: Path) -> None:
    rows = rows_of(sheet)
    rows[0] |= {"verdict": "accept", "labels": "sea"}
    first = write(tmp_path / "first.csv", rows)
    assert len(colloc.take_sheet(store, _read(first), by="Anna").decisions) == 1
    rows[0] |= {"sense": "dense air", "labels": "", "examples": "1"}
    rows[1]["verdict"] = "reject"
    second = write(tmp_path / "second.csv", rows)
    found = colloc.take_sheet(store, _read(second), by="Anna")
    assert (len(found.decisions), found.conflicts) == (2, [])
    again = colloc.take_sheet(store, _read(second), by="Anna")
    older = colloc.take_sheet(store, _read(first), by="Anna")
    assert (len(again.decisions), again.unchanged) == (0, 2)
    assert (len(older.decisions), older.unchanged) == (0, 1)
    kept = {" ".join(row["words"]): row for row in colloc.decisions(store).to_dicts()}
    row = kept[rows[0]["words"]]
    assert (row["verdict"], row["sense"], row["labels"]) == ("accept", "dense air", ["sea"])
    assert len(row["examples"]) == 1
    assert kept[rows[1]["words"]]["verdict"] == "reject"
    assert [row["sense"] for row in colloc.decisions(store, history=True).to_dicts()] == ["", "dense air", ""]


def test_the_way_out_of_a_conflict_is_told_beside_other_errors(store: Path, sheet: Path, tmp_path: Path) -> None:
    rows = rows_of(sheet)
    colloc.judge(store, rows[0]["words"].split(), "reject", by="Anna")
    rows[0]["verdict"] = "accept"
    rows[1]["verdict"] = "perhaps"
    with pytest.raises(DataError, match=r"'perhaps' is none.*'accept'; nothing was recorded: --override lets rows win"):
        colloc.take_sheet(store, _read(write(tmp_path / "f.csv", rows)), by="Anna")


def test_a_row_made_for_one_judge_is_taken_for_another_once_its_judge_is_cleared(store: Path, tmp_path: Path) -> None:
    colloc.judge(store, ["thick", "fog"], "accept", by="Anna")
    given = tmp_path / "given.txt"
    given.write_text("thick fog\nstrong wind\nclean oil\n", encoding="utf-8")
    path = tmp_path / "s.csv"
    assert main(["sheet", str(store), "--given", str(given), "--by", "Anna", "-o", str(path), "-q"]) == 0
    rows = rows_of(path)
    for row, verdict in zip(rows, ("", "reject", ""), strict=True):
        row |= {"judge": "", "verdict": verdict}
    found = colloc.take_sheet(store, _read(write(path, rows)), by="Ben")
    assert [(one.judge, one.words) for one in found.decisions] == [("Ben", ("strong", "wind"))]
    assert found.empty == 2, "what Anna had decided is nothing that Ben emptied"
    with pytest.raises(DataError, match="write withdrawn"):
        colloc.take_sheet(store, _read(path), by="Anna")


def test_the_same_words_twice_meaning_the_same(store: Path, sheet: Path, tmp_path: Path) -> None:
    rows = rows_of(sheet)
    rows[1] |= {"verdict": "Accepted", "sense": "x y"}
    again = rows[1] | {"verdict": " a", "sense": "x  y ", "kind": rows[1]["kind"].upper()}
    found = colloc.take_sheet(store, _read(write(tmp_path / "f.csv", [*rows, again])), by="Anna")
    assert [(one.verdict, one.sense) for one in found.decisions] == [("accept", "x y")]


def test_a_changed_blank_is_kept_where_the_row_knows_the_decision(store: Path, tmp_path: Path) -> None:
    colloc.judge(store, ["thick", "fog"], "accept", by="Anna", sense="dense  air")
    given = tmp_path / "given.txt"
    given.write_text("thick fog\n", encoding="utf-8")
    path = tmp_path / "s.csv"
    assert main(["sheet", str(store), "--given", str(given), "--by", "Anna", "-o", str(path), "-q"]) == 0
    rows = rows_of(path)
    rows[0]["sense"] = "dense air"
    assert [one.sense for one in colloc.take_sheet(store, _read(write(path, rows))).decisions] == ["dense air"]


def test_a_sheet_of_a_judge_has_what_was_decided_and_knows_when_that_changes(store: Path, tmp_path: Path) -> None:
    colloc.judge(store, ["thick", "fog"], "accept", by="Anna", sense="dense", labels=["a; b"])
    path = tmp_path / "s.csv"
    given = tmp_path / "given.txt"
    given.write_text("thick fog\nstrong\twind\nby_and_large\n", encoding="utf-8")
    assert main(["sheet", str(store), "--given", str(given), "--by", "Anna", "-o", str(path), "-q"]) == 0
    rows = rows_of(path)
    assert [row["words"] for row in rows] == ["thick fog", "strong wind", "by and large"]
    assert [row["kind"] for row in rows] == ["pair", "pair", "expression"]
    assert rows[0]["verdict"] == "accept"
    rows[0]["verdict"] = "unsure"
    filled = colloc.take_sheet(store, _read(write(path, rows)))
    assert [(one.verdict, one.labels, one.sense) for one in filled.decisions] == [("unsure", ("a; b",), "dense")]
    rows[0]["verdict"] = ""
    with pytest.raises(DataError, match="write withdrawn"):
        colloc.take_sheet(store, _read(write(path, rows)))


def _workbook(store: Path, path: Path, note: str) -> Path:
    colloc.judge(store, ["thick", "fog"], "accept", by="Anna", note=note, sense="+1")
    assert main(["sheet", str(store), "-n", "0", "--lines", "0", "--by", "Anna", "-o", str(path), "-q"]) == 0
    return path


def test_a_workbook_comes_back(store: Path, tmp_path: Path) -> None:
    path = _workbook(store, tmp_path / "s.xlsx", "=SUM(A1) _x0041_ _x005F_ \x0b\r\n")
    assert colloc.take_sheet(store, _read(path)).unchanged == 1


def test_a_workbook_filled_in_by_another_program_comes_back(store: Path, tmp_path: Path) -> None:
    path = _workbook(store, tmp_path / "s.xlsx", "=SUM(A1)")
    book = openpyxl.load_workbook(path)
    sheet = book.worksheets[0]
    names = [cell.value for cell in sheet[1]]
    formulas = [cell.coordinate for row in sheet.iter_rows() for cell in row if cell.data_type == "f"]
    assert formulas == []
    rows = {str(row[0].value): row for row in sheet.iter_rows(min_row=2)}
    untouched = next(words for words in rows if words != "thick fog")
    rows[untouched][names.index("verdict")].value = "reject"
    for row in rows.values():
        for cell in row:
            if isinstance(cell.value, str):
                cell.data_type = "s"  # the program would make a formula of =SUM(A1)
    book.save(path)
    filled = colloc.take_sheet(store, _read(path))
    assert [" ".join(one.words) for one in filled.decisions] == [untouched]
    rows[untouched][names.index("note")].value = "=1+1"
    book.save(path)
    with pytest.raises(DataError, match=r"s\.xlsx:\d+, cell [A-Z]+\d+: a formula"):
        _read(path)


def test_a_workbook_saved_by_another_program_is_read_alike(tmp_path: Path) -> None:
    """openpyxl writes other parts than we do, and reads as numbers what it wrote as numbers."""
    book = openpyxl.Workbook()
    sheet = book.active
    assert sheet is not None
    rows = [["words", None, "verdict", "n"], ["thick fog", "x", "accept", 1.5], [None] * 4, ["a b", None, True, 12]]
    for row in rows:
        sheet.append(row)
    book.create_sheet("other").append(["nothing"])
    book.save(tmp_path / "s.xlsx")
    found = [(row.place.rpartition(":")[2], dict(row.cells)) for row in _read(tmp_path / "s.xlsx")]
    assert found == [
        ("2", {"words": "thick fog", "verdict": "accept", "n": "1.5"}),
        ("4", {"words": "a b", "verdict": "TRUE", "n": "12"}),
    ]


def test_a_workbook_with_entities_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "s.xlsx"
    book = openpyxl.Workbook()
    book.save(path)
    bomb = tmp_path / "bomb.xlsx"
    with zipfile.ZipFile(path) as old, zipfile.ZipFile(bomb, "w") as new:
        for item in old.infolist():
            data = old.read(item)
            if item.filename == "xl/workbook.xml":
                data = b'<!DOCTYPE x [<!ENTITY a "aaaa">]>' + data.partition(b"?>")[2]
            new.writestr(item, data)
    with pytest.raises(DataError, match="XML declarations"):
        _read(bomb)


def test_what_is_no_workbook(tmp_path: Path) -> None:
    path = tmp_path / "s.xlsx"
    path.write_bytes(b"words,verdict\n")
    with pytest.raises(DataError, match="not an XLSX file"):
        _read(path)


@given(texts=st.lists(HOSTILE.filter(str.strip), max_size=4))
def test_lists_in_one_cell_come_back(texts: list[str]) -> None:
    for separator in (" ", "; "):
        assert read_list(written_list(texts, separator), separator) == texts


@settings(max_examples=12, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(sense=HOSTILE, note=HOSTILE, label=HOSTILE.filter(str.strip), ending=st.sampled_from(["csv", "tsv", "xlsx"]))
def test_every_character_survives_sheet_and_json_lines(
    harbour: Path, sense: str, note: str, label: str, ending: str
) -> None:
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        store = Path(shutil.copy(harbour, folder / "one"))
        made = colloc.judge(store, ["thick", "fog"], "accept", by="Anna", sense=sense, note=note, labels=[label])
        given_file = folder / "given.tsv"
        given_file.write_text("first\tsecond\nthick\tfog\n", encoding="utf-8")
        sheet = folder / f"s.{ending}"
        asked = [
            "sheet",
            str(store),
            "--by",
            "Anna",
            "--given",
            str(given_file),
            "--lines",
            "0",
            "-o",
            str(sheet),
            "-q",
        ]
        assert main(asked) == 0
        assert colloc.take_sheet(store, _read(sheet)).unchanged == 1, "the sheet says what the store says"
        other = Path(shutil.copy(harbour, folder / "two"))
        assert colloc.take_sheet(other, _read(sheet)).decisions[0].note == note
        lines = folder / "d.jsonl"
        assert main(["decisions", str(store), "--history", "-f", "jsonl", "-o", str(lines), "-q"]) == 0
        third = Path(shutil.copy(harbour, folder / "three"))
        assert main(["judge", str(third), "--from", str(lines), "-q"]) == 0
        assert colloc.decisions(third, history=True).to_dicts() == colloc.decisions(store, history=True).to_dicts()
        assert colloc.decisions(third)["note"].tolist() == [made.note]
