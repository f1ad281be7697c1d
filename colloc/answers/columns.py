"""The record every answer is: named columns of equal length, and the settings that made them.

Column names are stable; the command line, the files and the Python calls use the same:

``first``, ``second``
    The words of a pair (``word`` where one word is a row).
``joint``, ``first_total``, ``second_total``, ``total``
    The pair's contingency table: joint count, the two margins, the sum.
``expected``
    Joint count expected if the words were independent: first_total * second_total / total.
``pmi``, ``npmi``, ``ppmi``, ``g2``, ...
    Measures, by their names in ``colloc.measures.catalogue``.
``pmi_low``, ``pmi_high``, ``q_value``, ``above_order``, ...
    Sureness: ``colloc.answers.sureness.wishes`` has the names, ``docs/sureness.md`` what they mean.
``count``, ``per_million``, ``documents``, ``dp``, ``dp_norm``
    Frequency and dispersion of a word; ``documents`` also of a pair where it is asked for.
"""

from __future__ import annotations

import importlib
import json
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from types import MappingProxyType, ModuleType
from typing import TYPE_CHECKING, Any, overload

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.answers.plain import Grid
from colloc.errors import MissingExtraError

if TYPE_CHECKING:
    import pandas as pd
    import polars as pl
    import pyarrow as pa

REPR_ROWS = 10


@dataclass(frozen=True, slots=True, eq=False, repr=False)
class Columns:
    """A frozen table of named numpy columns.

    Parameters
    ----------
    data : mapping of str to array-like, each of shape (n,)
        In the order in which they are shown. Text becomes an object array of ``str``
        (``None`` where missing); numbers keep their dtype. Arrays are not copied, and
        cannot be written to through this record.
    settings : mapping
        Everything that decided the numbers, as JSON values.

    Raises
    ------
    ValueError
        Where columns differ in length or are not one-dimensional.

    Examples
    --------
    >>> answer = Columns({"first": ["sea", "fog"], "joint": [7, 3]}, {"window": 5})
    >>> answer["joint"].sum(), len(answer[:1]), answer.to_dicts()[0]
    (np.int64(10), 1, {'first': 'sea', 'joint': 7})
    """

    data: Mapping[str, Any]
    settings: Mapping[str, Any] = field(default_factory=dict)

    def __post_init__(self) -> None:
        arrays = {str(name): _frozen(values) for name, values in self.data.items()}
        lengths = {name: len(array) for name, array in arrays.items()}
        if len(set(lengths.values())) > 1:
            raise ValueError(f"columns differ in length: {lengths}")
        object.__setattr__(self, "data", MappingProxyType(arrays))
        object.__setattr__(self, "settings", MappingProxyType(dict(self.settings)))

    @property
    def names(self) -> tuple[str, ...]:
        """Column names in order."""
        return tuple(self.data)

    def __len__(self) -> int:
        return next((len(array) for array in self.data.values()), 0)

    @overload
    def __getitem__(self, key: str) -> NDArray[Any]: ...
    @overload
    def __getitem__(self, key: slice) -> Columns: ...
    def __getitem__(self, key: str | slice) -> NDArray[Any] | Columns:
        """A column by its name, or some of the rows by a slice.

        Raises
        ------
        KeyError
            For a column that is not there; the message lists those that are.
        """
        if isinstance(key, slice):
            return self.take(key)
        if key not in self.data:
            raise KeyError(f"no column {key!r}: there are {', '.join(self.names)}")
        column: NDArray[Any] = self.data[key]
        return column

    def __contains__(self, name: object) -> bool:
        return name in self.data

    def __iter__(self) -> Iterator[dict[str, Any]]:
        """Rows as dictionaries of plain Python values."""
        lists = [array.tolist() for array in self.data.values()]
        for row in zip(*lists, strict=True):
            yield dict(zip(self.data, row, strict=True))

    def take(self, rows: slice | NDArray[Any] | Sequence[int]) -> Columns:
        """Rows chosen by a slice, a mask or row numbers."""
        return Columns({name: array[rows] for name, array in self.data.items()}, self.settings)

    def select(self, names: Iterable[str]) -> Columns:
        """Some of the columns, in the order given."""
        return Columns({name: self[name] for name in names}, self.settings)

    def adding(self, more: Mapping[str, ArrayLike]) -> Columns:
        """The same columns, then others; a name already there is replaced in its place."""
        return Columns({**self.data, **more}, self.settings)

    def is_numeric(self, name: str) -> bool:
        """Whether the column holds numbers (and stands to the right in a table)."""
        return self[name].dtype.kind in "iuf"

    def to_dicts(self) -> list[dict[str, Any]]:
        """One dictionary of plain Python values a row."""
        return list(self)

    def to_pandas(self) -> pd.DataFrame:
        """A data frame; the settings are in its ``attrs``.

        Raises
        ------
        MissingExtraError
            Where pandas is not installed.
        """
        frame: pd.DataFrame = _library("pandas").DataFrame({name: array.copy() for name, array in self.data.items()})
        frame.attrs["colloc"] = dict(self.settings)
        return frame

    def to_arrow(self) -> pa.Table:
        """An Arrow table; the settings are JSON under the schema's metadata key ``colloc``.

        Raises
        ------
        MissingExtraError
            Where pyarrow is not installed.
        """
        arrow = _library("pyarrow")
        arrays = [
            arrow.array(_texts(array), type=arrow.string()) if _holds_text(array) else arrow.array(array)
            for array in self.data.values()
        ]
        table: pa.Table = arrow.table(arrays, names=list(self.names))
        return table.replace_schema_metadata({"colloc": json.dumps(dict(self.settings), default=str)})

    def to_polars(self) -> pl.DataFrame:
        """A Polars data frame.

        Raises
        ------
        MissingExtraError
            Where polars is not installed.
        """
        polars = _library("polars")
        text = {name: polars.String for name in self.names if _holds_text(self[name])}
        columns = {name: _texts(array) if name in text else _plain(array) for name, array in self.data.items()}
        frame: pl.DataFrame = polars.DataFrame(columns, schema_overrides=text)
        return frame

    def __eq__(self, other: object) -> bool:
        """Equal names in the same order, equal values (nan equals nan) and equal settings."""
        if not isinstance(other, Columns):
            return NotImplemented
        return (
            self.names == other.names
            and self.settings == other.settings
            and all(_equal(array, other.data[name]) for name, array in self.data.items())
        )

    __hash__ = None  # type: ignore[assignment]

    def __repr__(self) -> str:
        """Settings, then the first rows as an aligned table."""
        settings = ", ".join(f"{key} {value}" for key, value in self.settings.items() if value not in ("", None))
        shown = self[:REPR_ROWS]
        grid = Grid(self.names, [self.is_numeric(name) for name in self.names])
        lines = [f"{len(self)} rows" + (f"; {settings}" if settings else "")]
        lines += grid.lines([array.tolist() for array in shown.data.values()], heading=True) if self.names else []
        if len(self) > REPR_ROWS:
            lines.append(f"... {len(self) - REPR_ROWS} more")
        return "\n".join(lines)


def _frozen(values: ArrayLike) -> NDArray[Any]:
    array = np.asarray(values, dtype=object) if _is_text(values) else np.asarray(values)
    if array.ndim != 1:
        raise ValueError(f"a column has one dimension, not {array.ndim}")
    if array.dtype.kind in "US":
        array = array.astype(object)
    view = array.view()
    view.flags.writeable = False
    return view


def _is_text(values: ArrayLike) -> bool:
    """Lists of str go straight to objects: a fixed-width numpy string would drop trailing NUL characters.

    An empty list is taken as text; columns of numbers come as arrays.
    """
    if not isinstance(values, list | tuple):
        return False
    return not values or any(isinstance(value, str) or value is None for value in values)


def _holds_text(array: NDArray[Any]) -> bool:
    """Whether a column goes into data frames as text: one of yes and no, some of them unknown, does not."""
    return array.dtype.kind == "O" and {*map(type, array)} - {type(None)} != {bool}


def _plain(array: NDArray[Any]) -> NDArray[Any] | list[Any]:
    return array.tolist() if array.dtype.kind == "O" else array


def _texts(array: NDArray[Any]) -> list[str | None]:
    """Values of an object column as text: data frames have no columns of mixed kinds, so others become JSON."""
    return [value if value is None or isinstance(value, str) else json.dumps(value) for value in array.tolist()]


def _equal(one: NDArray[Any], other: NDArray[Any]) -> bool:
    if one.dtype.kind == "f" and other.dtype.kind == "f":
        return np.array_equal(one, other, equal_nan=True)
    return one.dtype.kind == other.dtype.kind and np.array_equal(one, other)


def _library(name: str) -> ModuleType:
    try:
        return importlib.import_module(name)
    except ImportError as error:
        raise MissingExtraError(f"{name} is not installed: pip install 'colloc[tables]'") from error
