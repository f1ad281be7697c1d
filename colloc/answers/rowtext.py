"""Many rows as delimited text at once: the same characters as row by row, several times as fast.

Python takes half a microsecond to write a float with all its digits. Polars, where it is installed (extra
``tables``), finds the same shortest digits in a tenth of that, and writes them like Python but for small numbers:
1.5e-05 is ``0.000015`` there and 1.5e-06 ``1.5e-6``. Those are put right.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache
from io import BytesIO
from types import ModuleType
from typing import TYPE_CHECKING, Any

import numpy as np

from colloc.records import FloatArray, Int64Array

if TYPE_CHECKING:
    import polars as pl

QUICK_ROWS = 8192
"""From so many rows on it takes less time to load Polars than to do without."""

_LEAST, _POINT, _MOST = 1e-9, 1e-5, 1e-4
"""From the first up to the last, Polars writes numbers otherwise than Python; from the second on without exponent."""

_SAMPLES = (
    0.0, -0.0, 1.0, -2.5, 0.1, 1 / 3, 1e-4, 1.5e-4, 9.9e-11, -1.25e-100, 5e-324, 123456.75, 2.0**53, -1.5e15, 9.99e15,
    9.999999999999999e-10, 1e-9, -1.25e-8, 3e-7, 9.999999999999999e-06, 1e-5, -2e-5, 1.25e-5, -9.875e-5,
    9.999999999999999e-05, 1e16, 1.25e17, 1e100, 1.7976931348623157e308, float("inf"), float("-inf"),
)  # fmt: skip
"""Numbers of every kind."""


def rows_as_text(columns: Sequence[Any], whole: Sequence[bool], delimiter: str) -> bytes | None:
    """Rows, each ended by a line feed, in UTF-8; None where the quick way is not to be had.

    Parameters
    ----------
    columns : sequence of arrays of numbers or lists of str, at least two, each of length n
        Texts are written as they are: quote them before.
    whole : sequence of bool
        For each column whether whole floats are written without a point.
    delimiter : str

    Returns
    -------
    bytes or None
        Floats as ``repr`` writes them, a value that is not a number as nothing, truth as ``true`` and ``false``.
        None for a single column, and where Polars is not installed or does not write numbers as Python does.
    """
    if len(columns) < 2 or (polars := _polars()) is None:
        return None
    return _written(polars.DataFrame(_series(polars, columns, whole)), delimiter)


@cache
def _polars() -> ModuleType | None:
    """The library, if it is there and writes the samples as Python does."""
    try:
        import polars
    except ImportError:
        return None
    numbers = np.array(_SAMPLES)
    direct = np.where((np.abs(numbers) >= _LEAST) & (np.abs(numbers) < _MOST), 0.0, numbers)
    frame = polars.DataFrame(_series(polars, [direct, numbers], [False, False]))
    expected = "".join(f"{one!r},{other!r}\n" for one, other in zip(direct.tolist(), _SAMPLES, strict=True))
    return polars if _written(frame, ",") == expected.encode() else None


def _written(frame: pl.DataFrame, delimiter: str) -> bytes:
    stream = BytesIO()
    frame.write_csv(stream, include_header=False, separator=delimiter, quote_style="never")
    return stream.getvalue()


def _series(polars: ModuleType, columns: Sequence[Any], whole: Sequence[bool]) -> dict[str, pl.Series]:
    """The columns as Polars is to write them, small numbers as text."""
    made: dict[str, pl.Series] = {}
    small: dict[str, tuple[Int64Array, FloatArray]] = {}
    for name, column, exact in zip(map(str, range(len(columns))), columns, whole, strict=True):
        if isinstance(column, list):
            made[name] = polars.Series(column, dtype=polars.String)
        elif column.dtype.kind != "f":
            made[name] = polars.Series(column)
        elif exact and _are_counts(column):
            made[name] = polars.Series(column.astype(np.int64))
        else:
            numbers = column.astype(np.float64, copy=False)
            series = polars.Series(numbers, nan_to_null=True)
            sizes = np.abs(numbers)
            places = np.flatnonzero((sizes >= _LEAST) & (sizes < _MOST))
            if len(places):
                small[name] = places, numbers[places]
            if exact or len(places):
                series = series.cast(polars.String)
            made[name] = series.str.strip_suffix(".0") if exact else series
    if small:
        # all columns together: a call costs more than the writing of a few numbers
        texts = _small_as_text(polars, np.concatenate([numbers for _, numbers in small.values()]))
        done = 0
        for name, (places, _) in small.items():
            made[name] = made[name].scatter(places, texts[done : done + len(places)])
            done += len(places)
    return made


def _are_counts(numbers: FloatArray) -> bool:
    """Whether all are whole, and so small that they are written without exponent."""
    return bool(((numbers == np.floor(numbers)) & (numbers < 2.0**53) & ~np.signbit(numbers)).all())


def _small_as_text(polars: ModuleType, numbers: FloatArray) -> pl.Series:
    """Numbers that Polars writes otherwise, as Python does: ``1.5e-6`` as ``1.5e-06``, ``0.000015`` as ``1.5e-05``."""
    digits = polars.col("text").str
    moved = polars.concat_str([digits.slice(6, 1), polars.lit("."), digits.slice(7), polars.lit("e-05")])
    frame = polars.DataFrame({"number": numbers, "text": polars.Series(np.abs(numbers)).cast(polars.String)})
    mended = (
        polars.when(polars.col("number").abs() < _POINT)
        .then(digits.replace("e-", "e-0", literal=True))
        .otherwise(moved.str.replace(".e", "e", literal=True))
    )
    sign = polars.when(polars.col("number") < 0).then(polars.lit("-")).otherwise(polars.lit(""))
    signed: pl.Series = frame.select(polars.concat_str([sign, mended])).to_series()
    return signed
