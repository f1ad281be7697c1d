"""CSV and TSV: round trips through the standard library's writer, and an error with its line for what can be wrong."""

from __future__ import annotations

import csv
import io
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from colloc.errors import DataError
from colloc.settings import ReadSettings

from .samples import HOSTILE, PACKERS, prose, read_documents, read_texts


def write_csv(rows: list[list[str]], line_end: str = "\r\n") -> str:
    buffer = io.StringIO()
    csv.writer(buffer, lineterminator=line_end, quoting=csv.QUOTE_ALL).writerows(rows)
    return buffer.getvalue()


@pytest.mark.parametrize("extension", PACKERS)
@pytest.mark.parametrize("line_end", ["\r\n", "\n", "\r"])
def test_csv_texts_come_back_exactly(tmp_path: Path, extension: str, line_end: str) -> None:
    texts = [*HOSTILE, "\r", "\r\n", prose(1, 1_100_000)]
    path = tmp_path / f"a.csv{extension}"
    table = write_csv([["n", "text"], *([str(number), text] for number, text in enumerate(texts))], line_end)
    path.write_bytes(PACKERS[extension](table.encode()))
    documents = read_documents(path)
    assert ["".join(document.pieces) for document in documents] == texts
    assert [document.metadata["n"] for document in documents] == list(range(len(texts)))


@given(st.lists(st.tuples(st.text(), st.text()), max_size=6), st.sampled_from(["\r\n", "\n"]))
@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=50)
def test_any_csv_comes_back(tmp_path: Path, rows: list[tuple[str, str]], line_end: str) -> None:
    path = tmp_path / "any.csv"
    path.write_bytes(write_csv([["text", "note"], *map(list, rows)], line_end).encode())
    if b"\0" in path.read_bytes():
        with pytest.raises(DataError, match="a binary file"):
            read_documents(path)
        return
    documents = read_documents(path)
    assert ["".join(document.pieces) for document in documents] == [text for text, _ in rows]
    assert [str(document.metadata["note"]) for document in documents] == [note for _, note in rows]


def test_tsv_knows_no_quotes(tmp_path: Path) -> None:
    # IANA media type text/tab-separated-values: fields hold no TAB and no line end, and nothing is quoted.
    path = tmp_path / "a.tsv"
    path.write_bytes(b'text\tyear\n"Fog," he wrote.\t1990\r\n"\t1991\n')
    documents = read_documents(path)
    assert [(document.pieces, document.metadata["year"]) for document in documents] == [
        (('"Fog," he wrote.',), 1990),
        (('"',), 1991),
    ]


def test_identifiers_numbers_and_chosen_columns(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("id,year,text,code\nx,1990,a,007\n\n,1.5,b,-3\n")
    documents = read_documents(path)
    assert [(document.identifier, document.record, dict(document.metadata)) for document in documents] == [
        ("x", 0, {"year": 1990, "code": "007"}),
        ("a.csv:2", 1, {"year": 1.5, "code": -3}),
    ]
    (first, _) = read_documents(path, ReadSettings(text_column="code", id_column="year"))
    assert (first.identifier, first.pieces, dict(first.metadata)) == ("1990", ("007",), {"id": "x", "text": "a"})


def test_a_mark_before_the_header(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes("text,n\ngröße,1\n".encode("utf-8-sig"))
    assert read_texts(path) == ["größe"]


def test_skipping(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text('text\n"a\nb"\n\nc\nd\n')
    assert [(document.record, document.pieces) for document in read_documents(path, skip=1)] == [
        (1, ("c",)),
        (2, ("d",)),
    ]


WRONG = [
    ("csv", "", r": empty: a first line with the names of the columns was expected; add it"),
    ("csv", "\n\n", r": empty: a first line"),
    ("csv", "text,text\na,b\n", r":1: column 'text' occurs 2 times in the first line; rename one"),
    ("csv", "text, \na,b\n", r":1: a column has no name in the first line; name it"),
    ("csv", "Text,n\na,1\n", r":1: no column 'text' \(columns: 'Text', 'n'\); name the text column"),
    (
        "csv",
        "text;n\na;1\n",
        r":1: no column 'text' .* \(columns seem to be separated by semicolons; save with commas\)",
    ),
    ("csv", "text,n\na,1\nb\n", r":3: 1 fields where the first line names 2 columns; correct the row"),
    ("csv", 'text,n\n"a\nb",1\nb,2,3\n', r":4: 3 fields where the first line names 2 columns; correct the row"),
    ("csv", 'text,n\n"a"b,1\n', r":2: wrong quoting or separators \(.*\); correct it"),
    ("csv", 'text,n\na,1\n"b\nc\nd,2\n', r":5: wrong quoting .* in the record that begins in line 3; correct it"),
    ("tsv", "text\tn\na\n", r":2: 1 fields where the first line names 2 columns; correct the row"),
]


@pytest.mark.parametrize(("kind", "content", "message"), WRONG, ids=range(len(WRONG)))
def test_errors_name_file_and_line(tmp_path: Path, kind: str, content: str, message: str) -> None:
    path = tmp_path / f"table.{kind}"
    path.write_text(content)
    (tmp_path / "zz.txt").write_text("so that not all is empty")
    with pytest.raises(DataError, match=rf"table\.{kind}{message}") as raised:
        read_documents(tmp_path)
    assert "\n" not in str(raised.value)


def test_a_named_identifier_column(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("text,key\na,k\nb,\n")
    with pytest.raises(DataError, match=r"a\.csv:3: column 'key' holds no identifier; give each record one"):
        read_documents(path, ReadSettings(id_column="key"))
    with pytest.raises(
        DataError, match=r"a\.csv:1: no column 'name' \(columns: 'text', 'key'\); name the identifier col"
    ):
        read_documents(path, ReadSettings(id_column="name"))


@pytest.mark.parametrize("letter", ["a", "é"])
def test_the_largest_record_is_exact_over_several_lines(tmp_path: Path, letter: str) -> None:
    path = tmp_path / "a.csv"
    field = (letter * 999 + "\n") * 50
    path.write_text(f'text\nshort\n"{field}"\nlast\n', encoding="utf-8", newline="")
    size = len(f'"{field}"\n'.encode())
    assert read_texts(path, ReadSettings(max_record=size)) == ["short", field, "last"]
    with pytest.raises(DataError, match=rf"a\.csv:53: a record of more than {size - 1:,} bytes: allow larger records"):
        read_texts(path, ReadSettings(max_record=size - 1))


def test_an_open_quote_does_not_swallow_the_file(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text('text\n"open\n' + "more lines\n" * 20_000)
    with pytest.raises(DataError, match=r"a\.csv:\d+: a record of more than 4,096 bytes"):
        read_texts(path, ReadSettings(max_record=4096))


def test_fields_larger_than_the_csv_module_allows_by_default(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("text\n" + "sea " * 100_000 + "\n")
    assert read_texts(path) == ["sea " * 100_000]
