"""Measures for contingency tables that come from elsewhere."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.answers.columns import Columns
from colloc.errors import DataError
from colloc.measures.catalogue import MEASURES, compute_all, find
from colloc.records import FloatArray

TABLE_COLUMNS = ("joint", "first_total", "second_total", "total")


class BadRowError(DataError):
    """A row that is no contingency table; ``row`` is its number from 0, so that a reader can name the line."""

    def __init__(self, row: int, problem: str) -> None:
        super().__init__(f"row {row + 1}: {problem}")
        self.row = row
        self.problem = problem


def measured(table: Mapping[str, ArrayLike] | Columns, measures: Sequence[str] | None = None) -> Columns:
    """The table with a column for each measure after its own columns.

    Parameters
    ----------
    table : mapping of str to array-like, or Columns
        Needs joint, first_total, second_total and total. A column with the name of
        a measure that is asked for is computed anew in its place.
    measures : sequence of str
        All of the catalogue when not given.

    Raises
    ------
    UsageError
        For an unknown measure.
    DataError
        For a missing column, a value that is not a number (:class:`BadRowError`), or
        counts that no table can have.
    """
    names = tuple(MEASURES) if measures is None else tuple(measures)
    needs_cells = any([find(name).needs_cells for name in names])
    columns = table if isinstance(table, Columns) else Columns(table)
    missing = [name for name in TABLE_COLUMNS if name not in columns]
    if missing:
        raise DataError(
            f"no column {', '.join(missing)}; measures need {', '.join(TABLE_COLUMNS)}, "
            f"and the columns are {', '.join(columns.names)}"
        )
    joint, first, second, total = (_numbers(columns[name], name) for name in TABLE_COLUMNS)
    check_tables(joint, first, second, total, cells=needs_cells)
    return columns.adding(compute_all(names, joint, first, second, total))


def from_values(columns: Mapping[str, Sequence[Any]]) -> Columns:
    """Columns of values read from a file, each kept as it is: all whole numbers, all numbers, or anything."""

    def array(values: Sequence[Any]) -> NDArray[Any]:
        kinds = set(map(type, values))
        if kinds in ({int}, {float}):
            numbers = np.asarray(values)
            if numbers.dtype.kind in "if":
                return numbers
        return np.fromiter(values, dtype=object, count=len(values))

    return Columns({name: array(values) for name, values in columns.items()})


def check_tables(joint: FloatArray, first: FloatArray, second: FloatArray, total: FloatArray, *, cells: bool) -> None:
    """Raise BadRowError for the first row whose counts no table can have.

    ``cells``: whether the four cells must be possible too. The margins of
    tokens (``--margins tokens``) are not sums of cells, and measures that need none may
    be asked of them.
    """
    problems: list[tuple[NDArray[np.bool_], str]] = [
        ((joint < 0) | (first < 0) | (second < 0) | (total < 0), "a count is below 0"),
        (total <= 0, "total must be above 0"),
        ((first > total) | (second > total), "first_total or second_total is larger than total"),
        (joint > total, "joint is larger than total"),
    ]
    if cells:
        problems += [
            (joint > first, "joint is larger than first_total"),
            (joint > second, "joint is larger than second_total"),
            (first + second - joint > total, "first_total + second_total - joint is larger than total"),
        ]
    found = [(int(np.argmax(wrong)), problem) for wrong, problem in problems if wrong.any()]
    if found:
        row, problem = min(found, key=lambda entry: entry[0])
        counts = ", ".join(
            f"{name} {values[row]:.15g}"
            for name, values in zip(TABLE_COLUMNS, (joint, first, second, total), strict=True)
        )
        raise BadRowError(row, f"{problem} ({counts}); check how the counts were made")


def _numbers(values: NDArray[Any], name: str) -> FloatArray:
    """The column as float64; text is read as numbers."""
    if values.dtype.kind in "iuf":
        numbers = values.astype(np.float64)
    else:
        numbers = np.array([_number(value) for value in values.tolist()], dtype=np.float64)
    wrong = ~np.isfinite(numbers)
    if wrong.any():
        row = int(np.argmax(wrong))
        raise BadRowError(row, f"{name} is not a number: {values[row]!r}; counts are written like 42 or 42.5")
    return numbers


def _number(value: Any) -> float:
    """The number a cell holds, or nan; ``float`` alone would take True and "1_000"."""
    try:
        return math.nan if value is True or value is False or (type(value) is str and "_" in value) else float(value)
    except (TypeError, ValueError, OverflowError):
        return math.nan


def readable(part: Columns) -> Columns:
    """Texts that are numbers with more decimals than a table shows as numbers; all else as it is."""

    def column(values: NDArray[Any]) -> NDArray[Any]:
        texts = values.tolist() if values.dtype.kind == "O" else []
        if any(type(text) is str and _LONG.fullmatch(text) for text in texts) and all(
            type(text) is str and _NUMBER.fullmatch(text) for text in texts
        ):
            return np.array([float(text or "nan") for text in texts])
        return values

    return Columns({name: column(values) for name, values in part.data.items()}, part.settings)


_LONG = re.compile(r"[-+]?[0-9]*\.[0-9]{5,}(?:[eE][-+]?[0-9]+)?")
_NUMBER = re.compile(r"(?:[-+]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][-+]?[0-9]+)?)?")
"""A number in digits, or nothing."""
