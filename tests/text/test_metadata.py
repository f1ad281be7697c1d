"""Metadata from paths (against `re` on the same pattern) and from side tables."""

from __future__ import annotations

import os
import re
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.errors import DataError, UsageError
from colloc.settings import ReadSettings
from colloc.text.metadata import PathPattern, typed

from .samples import read_documents

NUMBERS = [
    ("1990", 1990),
    ("-3", -3),
    ("0", 0),
    ("1.5", 1.5),
    ("-0.0", -0.0),
    ("1e+300", 1e300),
    ("-2.2250738585072014e-308", -2.2250738585072014e-308),
    ("9223372036854775807", 2**63 - 1),
]


@pytest.mark.parametrize(("text", "value"), NUMBERS)
def test_canonical_numbers_become_numbers(text: str, value: float) -> None:
    assert typed(text) == value
    assert type(typed(text)) is type(value)


NO_NUMBERS = ["", "007", "1.50", "+1", "1_000", " 1", "1 ", "1e5", "nan", "inf", "-inf", "-", "-0", "٣", "½", "1990-1"]


@pytest.mark.parametrize("text", [*NO_NUMBERS, "9223372036854775808", "1" * 20, "1" * 5000, "true"])
def test_other_text_stays_text(text: str) -> None:
    assert typed(text) == text


@given(st.integers(-(2**63) + 1, 2**63 - 1) | st.floats(allow_nan=False, allow_infinity=False) | st.text())
def test_nothing_is_lost(value: float | str) -> None:
    text = str(value)
    assert str(typed(text)) == text


def test_a_pattern_is_matched_against_the_end_of_the_path() -> None:
    pattern = PathPattern("{genre}/{year}-{id}.txt")
    assert pattern.match("/any/where/press/1990-07-a.txt") == {"genre": "press", "year": 1990, "id": "07-a"}
    assert pattern.match("press/1990-x.txt.gz") == {"genre": "press", "year": 1990, "id": "x"}
    assert PathPattern("log/{name}.csv.xz").match("a/log/b.csv.xz") == {"name": "b"}
    assert PathPattern("{größe}.txt").match("a/Höhe [1].txt") == {"größe": "Höhe [1]"}


pattern_parts = st.lists(
    st.lists(st.sampled_from(["a", "b", "-", ".", "*"]), min_size=1, max_size=4).map("".join), min_size=1, max_size=3
)


@given(
    st.lists(st.sampled_from(["{x}", "{y}", "{z}", "-", "a", "/", ".a"]), min_size=1, max_size=8, unique=True),
    st.text("ab-./", max_size=12),
)
def test_matching_is_that_of_a_lazy_regular_expression(parts: list[str], path: str) -> None:
    pattern = "".join(parts)
    try:
        compiled = PathPattern(pattern)
    except UsageError:
        return
    expression = re.sub(r"\\\{(\w)\\\}", r"(?P<\1>[^/]+?)", re.escape(pattern.strip("/")))
    expected = re.fullmatch(rf"(?:.*/)?{expression}", path, re.DOTALL)
    if expected is None:
        with pytest.raises(DataError):
            compiled.match(path)
    else:
        assert compiled.match(path) == expected.groupdict()


def test_matching_takes_linear_time() -> None:
    pattern = PathPattern("-".join(f"{{f{number}}}" for number in range(30)) + "-end")
    with pytest.raises(DataError, match="does not end as the pattern"):
        pattern.match("-x" * 20_000 + "-en")


@pytest.mark.parametrize(
    ("pattern", "why"),
    [
        ("press/*.txt", r"it has no field such as \{genre\}"),
        ("", r"it has no field such as \{genre\}"),
        ("{a}/{a}.txt", r"field \{a\} occurs twice"),
        ("{}/{year}", r"a field's name is made of letters, digits and _ and does not begin with a digit"),
        ("{a b}", r"a field's name is made of"),
        ("{a.b}", r"a field's name is made of"),
        ("{0}", r"a field's name is made of"),
        ("{a}{b}", r"two fields stand side by side; put a character between them"),
        ("{a}/{b", r"a brace stands alone"),
        ("{a}}", r"a brace stands alone"),
        ("{{a}}", r"a brace stands alone"),
        ("{a}//{b}", r"it has 'an empty part' between slashes"),
        ("../{a}", r"it has '\.\.' between slashes"),
    ],
)
def test_wrong_patterns(tmp_path: Path, pattern: str, why: str) -> None:
    path = tmp_path / "a.txt"
    path.write_text("text")
    with pytest.raises(UsageError, match=rf"the path pattern {re.escape(repr(pattern))} is wrong: {why}") as raised:
        read_documents(path, ReadSettings(meta_from_path=pattern))
    assert raised.value.exit_code == 2


def test_a_path_that_does_not_match(tmp_path: Path) -> None:
    path = tmp_path / "press.txt"
    path.write_text("text")
    with pytest.raises(DataError, match=r"press\.txt: the path does not end as the pattern '\{g\}-\{y\}\.txt' says"):
        read_documents(path, ReadSettings(meta_from_path="{g}-{y}.txt"))


def test_the_path_above_the_input_counts(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = tmp_path / "press"
    folder.mkdir()
    (folder / "1990.jsonl").write_text('{"text": "a", "year": 1}\n{"text": "b"}\n')
    monkeypatch.chdir(folder)
    documents = read_documents("1990.jsonl", ReadSettings(meta_from_path="{genre}/{year}.jsonl"))
    assert [dict(document.metadata) for document in documents] == [
        {"genre": "press", "year": 1},
        {"genre": "press", "year": 1990},
    ]


@pytest.fixture
def corpus(tmp_path: Path) -> Path:
    for name in ("press/a.txt", "press/b.txt", "letters/c.txt"):
        path = tmp_path / "corpus" / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(name)
    return tmp_path / "corpus"


TABLES = {
    "t.csv": 'file,year,note\npress/a.txt,1990,"x, y"\nb.txt,007,z\nc.txt,1.5,\n',
    "t.tsv": "file\tyear\tnote\npress/a.txt\t1990\tx, y\nb.txt\t007\tz\nc.txt\t1.5\t\n",
    "t.jsonl": (
        '{"file": "press/a.txt", "year": 1990, "note": "x, y"}\n'
        '{"file": "b.txt", "year": "007", "note": "z"}\n{"file": "c.txt", "year": 1.5, "note": ""}\n'
    ),
}


@pytest.mark.parametrize("name", TABLES)
def test_side_tables(corpus: Path, name: str) -> None:
    """A table may lie among the texts, and is then not one of them."""
    table = corpus / name
    table.write_text(TABLES[name])
    documents = read_documents(corpus, ReadSettings(meta_table=str(table), meta_from_path="{genre}/{year}.txt"))
    assert {document.identifier: dict(document.metadata) for document in documents} == {
        "press/a.txt": {"genre": "press", "year": 1990, "note": "x, y"},
        "press/b.txt": {"genre": "press", "year": "007", "note": "z"},
        "letters/c.txt": {"genre": "letters", "year": 1.5, "note": ""},
    }


WRONG_TABLES = [
    (
        "t.csv",
        "file,year\na.txt,1\nb.txt,2\n",
        r"t\.csv: no row for 'letters/c\.txt'; add one \(first col",
    ),
    ("t.csv", "file,year\na.txt,1\na.txt,2\n", r"t\.csv:3: a second row for 'a\.txt'; keep one"),
    ("t.csv", "file,year\n,1\n", r"t\.csv:2: no file name in the first column; put it there"),
    ("t.csv", "file,file\na.txt,1\n", r"t\.csv:1: column 'file' occurs 2 times"),
    ("t.csv", "file,year\na.txt\n", r"t\.csv:2: 1 fields where the first line names 2 columns"),
    ("t.jsonl", '{"file": 1}\n', r"t\.jsonl:1: no file name in the first column; put it there"),
    ("t.jsonl", "{}\n", r"t\.jsonl:1: no file name in the first column; put it there"),
    ("t.jsonl", "x\n", r"t\.jsonl:1: not JSON"),
    ("t.txt", "a.txt 1990\n", r"t\.txt: a metadata table is a \.csv, \.tsv or \.jsonl file; save it as one"),
]


@pytest.mark.parametrize(("name", "content", "message"), WRONG_TABLES, ids=range(len(WRONG_TABLES)))
def test_wrong_tables(corpus: Path, name: str, content: str, message: str) -> None:
    table = corpus.parent / name
    table.write_text(content)
    with pytest.raises(DataError, match=message):
        read_documents(corpus, ReadSettings(meta_table=str(table)))


def test_a_bare_name_that_stands_for_two_files(corpus: Path) -> None:
    (corpus / "letters" / "a.txt").write_text("another")
    table = corpus.parent / "t.csv"
    table.write_text("file,year\na.txt,1\nb.txt,2\nc.txt,3\n")
    with pytest.raises(DataError, match=r"t\.csv: 'a\.txt' stands for 2 files; key their rows by path"):
        read_documents(corpus, ReadSettings(meta_table=str(table)))


def test_a_table_never_chooses_files(corpus: Path) -> None:
    (corpus.parent / "secret.txt").write_text("secret")
    table = corpus.parent / "t.csv"
    rows = "".join(f"{name},1\n" for name in ("../secret.txt", "/etc/passwd", "a.txt", "b.txt", "c.txt"))
    table.write_text("file,year\n" + rows)
    documents = read_documents(corpus, ReadSettings(meta_table=str(table)))
    assert sorted(os.path.basename(document.identifier) for document in documents) == ["a.txt", "b.txt", "c.txt"]
