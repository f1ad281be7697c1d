"""Rows written at once by a library, against Python's own ``repr``, row by row."""

from __future__ import annotations

import math
import sys

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.answers import rowtext
from colloc.answers.rowtext import rows_as_text

LIMITS = [1e-10, 1e-9, 1e-6, 1e-5, 1e-4, 1.0, 2.0**53, 1e15, 1e16, 1e17]
"""Where one of the two changes how it writes numbers."""
NEAR = st.builds(
    lambda limit, steps, sign: sign * float(np.float64(limit) + steps * np.spacing(limit)),
    st.sampled_from(LIMITS),
    st.integers(-3, 3),
    st.sampled_from([1, -1]),
)
SHORT = st.builds(lambda digits, exponent: float(f"{digits}e{exponent}"), st.integers(-999, 999), st.integers(-14, 20))
FLOATS = st.floats() | NEAR | SHORT | st.floats(-1e-4, 1e-4)


def as_python(numbers: list[float], whole: bool) -> list[str]:
    texts = ["" if math.isnan(number) else repr(number) for number in numbers]
    return [text.removesuffix(".0") for text in texts] if whole else texts


@given(st.lists(st.tuples(FLOATS, FLOATS, st.integers(-(2**63), 2**63 - 1), st.booleans()), min_size=1, max_size=20))
def test_numbers_are_written_as_python_writes_them(rows: list[tuple[float, float, int, bool]]) -> None:
    first, second, whole, truth = map(list, zip(*rows, strict=True))
    columns = [np.array(first), np.array(second), np.array(whole), np.array(truth), [f"w{i}" for i in range(len(rows))]]
    found = rows_as_text(columns, [False, True, False, False, False], "\t")
    expected = zip(as_python(first, False), as_python(second, True), whole, truth, columns[4], strict=True)
    lines = "".join(f"{a}\t{b}\t{c}\t{'true' if d else 'false'}\t{e}\n" for a, b, c, d, e in expected)
    assert found == lines.encode()


def test_counts_and_halves() -> None:
    columns = [
        np.array([3.0, 0.0, 2.0**60]),
        np.array([2.5, 7.0, -0.0]),
        np.array([0.5, 1.5], np.float32).repeat([1, 2]),
    ]
    assert rows_as_text(columns, [True, True, False], ",") == (b"3,2.5,0.5\n0,7,1.5\n1.152921504606847e+18,-0,1.5\n")


def test_many_numbers_of_every_size() -> None:
    random = np.random.default_rng(5)
    numbers = random.standard_normal(20_000) * 10 ** random.uniform(-12, 18, 20_000)
    found = rows_as_text([numbers, numbers], [False, False], ",")
    assert found == "".join(f"{number!r},{number!r}\n" for number in numbers.tolist()).encode()


def test_where_it_is_not_to_be_had(monkeypatch: pytest.MonkeyPatch) -> None:
    column = np.array([1.5])
    assert rows_as_text([column], [False], ",") is None  # a single empty cell would be an empty line
    with monkeypatch.context() as patched:
        patched.setattr(rowtext, "_SAMPLES", (*rowtext._SAMPLES, math.nan))  # written otherwise: as nothing
        rowtext._polars.cache_clear()
        assert rows_as_text([column, column], [False, False], ",") is None
    monkeypatch.setitem(sys.modules, "polars", None)
    rowtext._polars.cache_clear()
    assert rows_as_text([column, column], [False, False], ",") is None
    monkeypatch.undo()
    rowtext._polars.cache_clear()
    assert rows_as_text([column, column], [False, False], ",") == b"1.5,1.5\n"
