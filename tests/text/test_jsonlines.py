"""JSON Lines: documents, metadata, and an error with its line for each thing that can be wrong."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from colloc.errors import DataError
from colloc.settings import ReadSettings

from .samples import HOSTILE, PACKERS, json_line, prose, read_documents, read_texts


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "log.jsonl"


@pytest.mark.parametrize("extension", PACKERS)
@pytest.mark.parametrize("ascii_only", [True, False])
def test_texts_come_back_exactly(tmp_path: Path, extension: str, ascii_only: bool) -> None:
    texts = [*HOSTILE, "\0", prose(1, 1_100_000)]
    lines = "".join(json.dumps({"text": text}, ensure_ascii=ascii_only) + "\n" for text in texts)
    path = tmp_path / f"a.ndjson{extension}"
    path.write_bytes(PACKERS[extension](lines.encode()))
    assert read_texts(path) == texts


json_values = st.recursive(
    st.none()
    | st.booleans()
    | st.integers(-(2**63) + 1, 2**63 - 1)
    | st.floats(allow_nan=False, allow_infinity=False)
    | st.text(),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(), inner, max_size=3),
    max_leaves=6,
)


@given(st.lists(st.tuples(st.text(), st.dictionaries(st.text(), json_values, max_size=4)), max_size=5))
@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=50)
def test_any_record_comes_back(tmp_path: Path, records: list[tuple[str, dict[str, object]]]) -> None:
    path = tmp_path / "any.jsonl"
    records = [
        (text, {key: value for key, value in meta.items() if key not in ("id", "text")}) for text, meta in records
    ]
    path.write_text("\n" + "".join(json_line(text=text, **meta) for text, meta in records), encoding="utf-8")
    documents = read_documents(path)
    assert ["".join(document.pieces) for document in documents] == [text for text, _ in records]
    for document, (_, meta) in zip(documents, records, strict=True):
        nested = {key: value for key, value in meta.items() if isinstance(value, dict | list)}
        assert {key: json.loads(str(document.metadata[key])) for key in nested} == nested
        assert {key: value for key, value in document.metadata.items() if key not in nested} == {
            key: value for key, value in meta.items() if key not in nested
        }


def test_identifiers_and_columns(path: Path) -> None:
    path.write_text(
        json_line(id="first", text="a", year=1990, tags=["x", "é"], deep={"a": None})
        + "\n  \t\r\n"
        + json_line(id=7, text="b", open=True, rate=0.5, nothing=None)
        + json_line(text="c", year="1990")
        + json_line(id=None, text="d", large=2**70)
    )
    documents = read_documents(path)
    assert [document.identifier for document in documents] == ["first", "7", f"{path.name}:3", f"{path.name}:4"]
    assert [document.record for document in documents] == [0, 1, 2, 3]
    assert [dict(document.metadata) for document in documents] == [
        {"year": 1990, "tags": '["x", "é"]', "deep": '{"a": null}'},
        {"open": True, "rate": 0.5, "nothing": None},
        {"year": "1990"},
        {"large": str(2**70)},
    ]


def test_chosen_columns(path: Path) -> None:
    path.write_text(json_line(body="a", key="k", text="meta", id=3))
    (document,) = read_documents(path, ReadSettings(text_column="body", id_column="key"))
    assert (document.identifier, document.pieces, dict(document.metadata)) == ("k", ("a",), {"text": "meta", "id": 3})


def test_skipped_records_are_not_parsed(path: Path) -> None:
    path.write_text("not json\n\nneither\n" + json_line(text="c") + json_line(text="d"))
    documents = read_documents(path, skip=2)
    assert [(document.record, document.pieces) for document in documents] == [(2, ("c",)), (3, ("d",))]
    assert documents[0].identifier == "log.jsonl:3"
    assert read_documents(path, skip=99) == []


def test_only_lf_ends_a_line(path: Path) -> None:
    path.write_bytes('{"text": "a\u2028b\u0085c"}\r\n{"text":\r"d"}'.encode())
    assert read_texts(path) == ["a\u2028b\u0085c", "d"]


def test_other_encodings(path: Path) -> None:
    path.write_bytes(json_line(text="größe").encode("utf-16"))
    assert read_texts(path) == ["größe"]
    path.write_bytes(json_line(text="größe").encode("cp1252"))
    assert read_texts(path, ReadSettings(encoding="cp1252")) == ["größe"]


WRONG = {
    "not json": r"not JSON: Expecting value \(column 1\); correct the line",
    '{"text": "a"} {"text": "b"}': r"not JSON: Extra data \(column 15\); correct the line",
    '{"text": "a"': r"not JSON: Expecting ',' delimiter \(column 13\); correct the line",
    '{"text": "a\tb"}': r"not JSON: Invalid control character at \(column 12\); correct the line",
    '{"text": "a", "n": NaN}': r"not JSON: NaN is not JSON; correct the line",
    '{"text": "a", "n": -Infinity}': r"not JSON: -Infinity is not JSON; correct the line",
    '{"text": "a", "n": 1e999}': r"column 'n' holds a number too large to keep; write it as a string",
    '["text"]': r'a JSON object was expected, such as \{"text": "..."\}; correct the line',
    '"text"': r"a JSON object was expected",
    "7": r"a JSON object was expected",
    '{"Text": "a", "id": 1}': r"no column 'text' \(columns: 'Text', 'id'\); name the text column",
    "{}": r"no column 'text' \(columns: none\); name the text column",
    '{"text": null}': r"column 'text' holds null, not text; correct it",
    '{"text": 7}': r"column 'text' holds a number, not text; correct it",
    '{"text": true}': r"column 'text' holds true or false, not text; correct it",
    '{"text": ["a"]}': r"column 'text' holds a list, not text; correct it",
    '{"text": {"a": 1}}': r"column 'text' holds an object, not text; correct it",
    '{"text": "a", "text": "b"}': r"column 'text' occurs twice in one record; rename one",
    '{"text": "a", "m": {"k": 1, "k": 2}}': r"column 'k' occurs twice in one record; rename one",
    '{"text": "a \\ud83d b"}': r"half a surrogate pair \(\\ud83d\) is no character; correct the escape",
    '{"text": "a", "k": ["\\uDE00"]}': r"half a surrogate pair \(\\ude00\) is no character; correct the escape",
    '{"text": "a", "\\uDE00": 1}': r"half a surrogate pair",
    '{"text": "a", "id": [1]}': r"column 'id' holds no identifier; give each record one",
    '{"text": "a", "n": ' + "[" * 100_000 + "]" * 100_000 + "}": r"JSON nested too deeply; flatten the record",
    '{"text": "a", "n": ' + "9" * 5000 + "}": r"not JSON: .*; correct the line",
}


@pytest.mark.parametrize("wrong", WRONG, ids=range(len(WRONG)))
def test_errors_name_file_and_line(path: Path, wrong: str) -> None:
    path.write_text(json_line(text="good") + "\n" + wrong + "\n")
    with pytest.raises(DataError, match=rf"^{path}:3: {WRONG[wrong]}") as raised:
        read_documents(path)
    assert "\n" not in str(raised.value)


def test_whole_pairs_of_surrogates_are_characters(path: Path) -> None:
    path.write_text('{"text": "\\ud83d\\ude00 \\\\ud83d"}')
    assert read_texts(path) == ["😀 \\ud83d"]


@pytest.mark.parametrize("value", [None, "", {}])
def test_a_named_identifier_column_must_hold_one(path: Path, value: object) -> None:
    path.write_text(json_line(text="a", key=value))
    with pytest.raises(DataError, match=rf"^{path}:1: column 'key' holds no identifier; give each record one"):
        read_documents(path, ReadSettings(id_column="key"))


def test_undecodable_bytes_have_their_offset(path: Path) -> None:
    path.write_bytes(b'{"text": "a"}\n{"text": "\xe9"}\n')
    with pytest.raises(DataError, match=rf"^{path}: byte 24 \(0xe9\) is not utf-8"):
        read_documents(path)


@pytest.mark.parametrize("ended", ["\n", ""])
@pytest.mark.parametrize("before", [0, 70_000])
@pytest.mark.parametrize("letter", ["a", "é", "灯"])
def test_the_largest_record_is_exact(path: Path, ended: str, before: int, letter: str) -> None:
    """The bound counts bytes of UTF-8, and the line is named."""
    first = json_line(text="b" * before)
    empty = len(json_line(text="")) - 1
    count = 100_000 // len(letter.encode())
    path.write_text(first + json_line(text=letter * count).rstrip("\n") + ended, encoding="utf-8")
    size = empty + count * len(letter.encode())
    assert [len(text) for text in read_texts(path, ReadSettings(max_record=size))] == [before, count]
    message = rf"^{path}:2: a record of more than {size - 1:,} bytes: allow larger records \(max_record\)"
    with pytest.raises(DataError, match=message):
        read_documents(path, ReadSettings(max_record=size - 1))
