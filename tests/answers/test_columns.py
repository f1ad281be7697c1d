"""The record of every answer, against pandas, polars and pyarrow; its text, against UAX #11 and UAX #9."""

from __future__ import annotations

import dataclasses
import sys
import unicodedata

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.answers.columns import Columns
from colloc.answers.plain import Grid, cell_text, number_text, shown_text, width
from colloc.errors import MissingExtraError

ANSWER = Columns(
    {"first": ["sea", "fog", None], "joint": np.array([7, 3, 1]), "pmi": np.array([1.5, np.nan, -np.inf])},
    {"window": 5, "where": ""},
)


def test_columns_and_rows() -> None:
    assert ANSWER.names == ("first", "joint", "pmi")
    assert len(ANSWER) == 3
    assert ANSWER["joint"].sum() == 11
    assert "pmi" in ANSWER
    assert "g2" not in ANSWER
    assert ANSWER.to_dicts()[0] == {"first": "sea", "joint": 7, "pmi": 1.5}
    assert type(ANSWER.to_dicts()[0]["joint"]) is int
    assert list(ANSWER[1:])[1] == {"first": None, "joint": 1, "pmi": -np.inf}
    assert ANSWER[::-1]["joint"].tolist() == [1, 3, 7]
    assert ANSWER.take(ANSWER["joint"] > 2)["first"].tolist() == ["sea", "fog"]
    assert ANSWER.select(["pmi", "first"]).names == ("pmi", "first")
    assert ANSWER.adding({"joint": np.zeros(3), "g2": np.ones(3)}).names == ("first", "joint", "pmi", "g2")
    assert len(Columns({})) == 0


def test_it_cannot_be_changed() -> None:
    with pytest.raises(dataclasses.FrozenInstanceError):
        ANSWER.data = {}  # type: ignore[misc]
    with pytest.raises(ValueError, match="read-only"):
        ANSWER["joint"][0] = 9
    with pytest.raises(TypeError):
        ANSWER.data["joint"] = np.ones(3)  # type: ignore[index]
    with pytest.raises(TypeError):
        ANSWER.settings["window"] = 6  # type: ignore[index]


def test_a_column_that_is_not_there() -> None:
    with pytest.raises(KeyError, match="no column 'g2': there are first, joint, pmi"):
        ANSWER["g2"]


def test_what_is_no_table() -> None:
    with pytest.raises(ValueError, match="differ in length"):
        Columns({"a": [1], "b": [1, 2]})
    with pytest.raises(ValueError, match="one dimension, not 2"):
        Columns({"a": np.ones((2, 2))})


def test_equality() -> None:
    same = Columns(dict(ANSWER.data), {"where": "", "window": 5})
    assert same == ANSWER
    assert ANSWER[:2] != ANSWER
    assert Columns(dict(ANSWER.data), {"window": 4, "where": ""}) != ANSWER
    assert ANSWER.select(["joint", "first", "pmi"]) != ANSWER
    assert ANSWER.adding({"joint": ANSWER["joint"].astype(float)}) != ANSWER
    assert ANSWER != "something else"
    with pytest.raises(TypeError, match="unhashable"):
        hash(ANSWER)


def test_repr_shows_settings_and_first_rows() -> None:
    assert repr(ANSWER).splitlines() == [
        "3 rows; window 5",
        "first  joint     pmi",
        "sea        7  1.5000",
        "fog        3",
        "           1    -inf",
    ]
    long = Columns({"n": np.arange(25)})
    assert repr(long).splitlines()[0] == "25 rows"
    assert repr(long).splitlines()[-1] == "... 15 more"
    assert len(repr(long).splitlines()) == 13


def test_text_with_trailing_nul_is_kept() -> None:
    assert Columns({"a": ["x\x00", "y"]})["a"].tolist() == ["x\x00", "y"]
    assert Columns({"a": np.array(["x", "yy"])})["a"].dtype == object
    assert Columns({"a": []})["a"].dtype == object


def test_pandas() -> None:
    frame = ANSWER.to_pandas()
    assert list(frame.columns) == ["first", "joint", "pmi"]
    assert frame["joint"].tolist() == [7, 3, 1]
    assert frame["first"].isna().tolist() == [False, False, True]
    assert frame.attrs["colloc"] == {"window": 5, "where": ""}
    frame.loc[0, "joint"] = 100
    assert ANSWER["joint"][0] == 7


def test_arrow_and_polars() -> None:
    table = ANSWER.to_arrow()
    assert [str(kind) for kind in table.schema.types] == ["string", "int64", "double"]
    assert table["first"].to_pylist() == ["sea", "fog", None]
    assert str(ANSWER[:0].to_arrow().schema.field("first").type) == "string"
    frame = ANSWER.to_polars()
    assert frame.columns == ["first", "joint", "pmi"]
    assert frame["first"].to_list() == ["sea", "fog", None]
    assert frame["pmi"].to_list()[2] == -np.inf


@pytest.mark.parametrize(
    ("library", "call"), [("pandas", "to_pandas"), ("pyarrow", "to_arrow"), ("polars", "to_polars")]
)
def test_a_missing_library_is_named(monkeypatch: pytest.MonkeyPatch, library: str, call: str) -> None:
    monkeypatch.setitem(sys.modules, library, None)
    with pytest.raises(MissingExtraError, match=rf"{library} is not installed: pip install 'colloc\[tables\]'"):
        getattr(ANSWER, call)()


@pytest.mark.parametrize(
    ("text", "columns"),
    # UAX #11: W and F take two cells, H and Na one; combining marks (Mn, Me) none. Jamo vowels join their syllable.
    [
        ("fog", 3),
        ("海霧", 4),
        ("ｆｏｇ", 6),
        ("ｱ", 1),
        ("e\u0301", 1),
        ("", 0),
        ("\u1112\u1161\u11ab", 2),
        ("क\u094d\u200dष", 2),
    ],
)
def test_width(text: str, columns: int) -> None:
    assert width(text) == columns


def test_text_cannot_steer_the_terminal() -> None:
    assert shown_text("a\x1b[31mb") == "a\\x1b[31mb"
    assert shown_text("a\u202eb") == "a\\u202eb"
    assert shown_text("tab\there") == "tab\\x09here"
    assert shown_text("fog") == "fog"
    assert shown_text("soft\u00adhyphen") == "soft\u00adhyphen"


def test_right_to_left_stands_in_an_isolate() -> None:
    """UAX #9, section 2.4: first strong isolate U+2068, pop U+2069; they take no cell."""
    assert shown_text("שלום") == "\u2068שלום\u2069"
    assert width(shown_text("שלום")) == 4
    assert shown_text("Äther") == "Äther"


@given(st.text())
def test_shown_text_is_printable(text: str) -> None:
    shown = shown_text(text)
    shown.encode()
    assert not [character for character in shown if unicodedata.category(character) in ("Cc", "Cs", "Zl", "Zp")]


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.12345, "0.1235"),
        (-12.5, "-12.5000"),
        (1e-5, "1.000e-05"),
        (3.2e13, "3.200e+13"),
        (np.inf, "inf"),
        (-0.0, "0.0000"),
    ],
)
def test_numbers(value: float, text: str) -> None:
    assert number_text(value) == text


def test_cells() -> None:
    assert [cell_text(value) for value in (None, True, False, 12, 0.5, "x")] == ["", "yes", "no", "12", "0.5000", "x"]


def test_counts_read_as_counts_also_beside_halves() -> None:
    grid = Grid(["total", "pmi", "per_million"], [True, True, True])
    assert grid.lines([[10.0, 8.5, np.nan], [1.0, 1.0, 1.0], [2.0, 2.25, 3.0]], heading=True) == [
        "total     pmi  per_million",
        "   10  1.0000          2.0",
        "  8.5  1.0000          2.2",
        "       1.0000          3.0",
    ]
    for name in ("joint", "count", "first_total", "joint_this", "count_that", "fragment_count"):
        assert Grid([name], [True]).lines([[500082016.0]], heading=False)[0].strip() == "500082016"
    assert Grid(["count"], [True]).lines([[1e15, 1 / 3]], heading=False) == ["1000000000000000", "          0.3333"]


def test_small_probabilities_keep_their_digits() -> None:
    """A float below 5e-324 is 0 (IEEE 754): that is no certainty, and no table says so."""
    values = [0.0, 1.2e-9, 4.24e-4, 0.25, np.nan]
    for name in ("p", "q", "q_value", "document_q", "g2_p"):
        lines = Grid([name], [True]).lines([values], heading=False)
        assert [line.strip() for line in lines] == ["<1e-300", "1.200e-09", "4.240e-04", "0.2500", ""]
    for name in ("g2_log10_p", "pmi", "dp"):
        assert Grid([name], [True]).lines([[0.0]], heading=False) == ["0.0000".rjust(len(name))]
