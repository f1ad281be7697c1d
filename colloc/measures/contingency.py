"""The two-by-two table of a pair: its layout, its expected count, and how rules over it are evaluated.

One observation (a pair of tokens, a token, a sentence ...) either has the first word or not, and either has the
second word or not. Four numbers say it all, and are the arguments of every measure::

                     second word          not second
    first word       joint                only_first     | first_total
    not first        only_second          neither        | total - first_total
                     ------------------------------------+---------------------
                     second_total         total - second_total   total

This is the only module that knows the layout.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from functools import cached_property
from typing import Protocol, cast

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.errors import DataError, UsageError

FloatArray = NDArray[np.float64]

BLOCK_ROWS = 8192
"""Rows evaluated at a time: a handful of float64 columns of this length stays in the processor's cache."""


class Table:
    """A block of two-by-two tables; what several measures need is computed once.

    Parameters
    ----------
    joint, first_total, second_total, total : float64 arrays that broadcast together
        Counts are turned into float64 before anything is multiplied: products of margins pass 2**63 long before
        the counts do. Float64 holds every count up to 2**53 exactly.
    """

    def __init__(self, joint: FloatArray, first_total: FloatArray, second_total: FloatArray, total: FloatArray) -> None:
        self.joint = joint
        self.first_total = first_total
        self.second_total = second_total
        self.total = total
        self._kept: dict[Rule, FloatArray] = {}

    def once(self, rule: Rule) -> FloatArray:
        """What the rule gives for this table, computed at most once; not to be changed in place."""
        if rule not in self._kept:
            self._kept[rule] = rule(self)
        return self._kept[rule]

    @cached_property
    def margin_product(self) -> FloatArray:
        """``first_total * second_total``."""
        return self.first_total * self.second_total

    @cached_property
    def expected(self) -> FloatArray:
        """Joint count that independence predicts: ``first_total * second_total / total``."""
        return self.margin_product / self.total

    @cached_property
    def only_first(self) -> FloatArray:
        """Observations with the first word and without the second."""
        return self.first_total - self.joint

    @cached_property
    def only_second(self) -> FloatArray:
        """Observations with the second word and without the first."""
        return self.second_total - self.joint

    @cached_property
    def neither(self) -> FloatArray:
        """Observations with neither word."""
        return (self.total - self.first_total) - self.only_second

    @cached_property
    def excess(self) -> FloatArray:
        """``joint - expected``, as (ad - bc) / N: exactly 0 where a word is always or never there."""
        return (self.joint * self.neither - self.only_first * self.only_second) / self.total

    @cached_property
    def pmi(self) -> FloatArray:
        """log2(joint / expected); many measures start from it."""
        ratio: FloatArray = self.joint * self.total
        ratio /= self.margin_product
        return np.log2(ratio, out=ratio)

    def cells(self) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """``joint, only_first, only_second, neither``: the table read row by row."""
        return self.joint, self.only_first, self.only_second, self.neither

    def expected_cells(self) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """Expected counts in the order of :meth:`cells`, from the margins (no differences of large numbers)."""
        without_first = self.total - self.first_total
        without_second = self.total - self.second_total
        return (
            self.expected,
            self.first_total * without_second / self.total,
            without_first * self.second_total / self.total,
            without_first * without_second / self.total,
        )


Rule = Callable[[Table], FloatArray]


class TableFunction(Protocol):
    """A measure of a pair: counts in, float64 out; ``rule`` is the same formula over a :class:`Table`."""

    rule: Rule

    def __call__(
        self, joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike
    ) -> FloatArray: ...


def table_function(rule: Rule) -> TableFunction:
    """Turn a formula over a :class:`Table` into a function of ``joint, first_total, second_total, total``.

    The function takes integers or floats that broadcast together and returns float64 of the common shape. It
    evaluates block by block and lets no numpy warning out: limits at zero cells are part of each formula.
    """

    def compute(joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike) -> FloatArray:
        return evaluate([rule], joint, first_total, second_total, total)[0]

    compute.__name__, compute.__qualname__ = rule.__name__, rule.__qualname__
    compute.__module__, compute.__doc__ = rule.__module__, rule.__doc__
    compute.__dict__["rule"] = rule
    return cast(TableFunction, compute)


def evaluate(
    rules: Sequence[Rule], joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike
) -> list[FloatArray]:
    """Evaluate several rules over the same tables, sharing what they have in common.

    Returns
    -------
    list of float64 arrays
        One for each rule, each of the shape the four arguments broadcast to.

    Raises
    ------
    UsageError
        The arguments do not broadcast together, or are not numbers.
    """
    columns, shape = _columns(joint, first_total, second_total, total)
    size = int(np.prod(shape))
    results = [np.empty(size) for _ in rules]
    with np.errstate(all="ignore"):
        for start, stop in _blocks(size):
            table = Table(*(_part(column, start, stop) for column in columns))
            for rule, result in zip(rules, results, strict=True):
                result[start:stop] = rule(table)
    return [result.reshape(shape) for result in results]


def _columns(*arguments: ArrayLike) -> tuple[list[NDArray[np.generic]], tuple[int, ...]]:
    """The arguments as flat columns (single numbers stay single), and their common shape."""
    arrays = [np.asarray(argument) for argument in arguments]
    for array in arrays:
        if array.dtype.kind not in "biuf":
            raise UsageError(f"counts must be whole numbers or floats, not {array.dtype}")
    try:
        shape = np.broadcast_shapes(*(array.shape for array in arrays))
    except ValueError as error:
        shapes = ", ".join(str(array.shape) for array in arrays)
        raise UsageError(f"joint, first_total, second_total and total must broadcast together, not {shapes}") from error
    flat = [array.reshape(1) if array.size == 1 else np.broadcast_to(array, shape).reshape(-1) for array in arrays]
    return flat, shape


def _blocks(size: int) -> Iterator[tuple[int, int]]:
    for start in range(0, size, BLOCK_ROWS):
        yield start, min(start + BLOCK_ROWS, size)


def _part(column: NDArray[np.generic], start: int, stop: int) -> FloatArray:
    return (column if column.size == 1 else column[start:stop]).astype(np.float64)


@table_function
def expected(table: Table) -> FloatArray:
    """Joint count that independence predicts, ``first_total * second_total / total``; nan where total is 0."""
    return table.expected


def impossible(joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike) -> NDArray[np.bool]:
    """Which tables cannot be: a cell is negative, a number is not finite, or the total is not above zero.

    Returns
    -------
    bool array of the common shape
    """

    def possible(table: Table) -> FloatArray:
        sound = np.isfinite(table.total) & (table.total > 0)
        for cell in table.cells():
            sound = sound & np.isfinite(cell) & (cell >= 0)
        return sound.astype(np.float64)

    return np.equal(evaluate([possible], joint, first_total, second_total, total)[0], 0.0)


def require_possible(
    joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike, first_row: int = 1
) -> None:
    """Refuse tables that cannot be (see :func:`impossible`).

    Parameters
    ----------
    first_row : int
        What the first row is called in the message: 2 for a file with a header line.

    Raises
    ------
    DataError
        Names the first impossible row and its four numbers.
    """
    wrong = np.flatnonzero(impossible(joint, first_total, second_total, total))
    if wrong.size:
        arrays = np.broadcast_arrays(joint, first_total, second_total, total)
        numbers = ", ".join(str(array.reshape(-1)[wrong[0]]) for array in arrays)
        raise DataError(
            f"row {wrong[0] + first_row}: joint, first_total, second_total, total = {numbers} cannot be: joint must "
            "not exceed either margin, and the margins together must not exceed total by more than joint"
        )
