"""All measures of a pair by name: the command line, the documentation and the shared tests go by this list."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from types import MappingProxyType

from numpy.typing import ArrayLike

from colloc.errors import UsageError
from colloc.measures.catalogue.entries import ENTRIES
from colloc.measures.catalogue.measure import Measure
from colloc.measures.contingency import FloatArray, evaluate


def compute_all(
    names: Sequence[str], joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike
) -> dict[str, FloatArray]:
    """Several measures of the same tables, in the order asked, sharing what they have in common.

    Raises
    ------
    UsageError
        A name is not in the catalogue.
    """
    rules = [find(name).rule for name in names]
    return dict(zip(names, evaluate(rules, joint, first_total, second_total, total), strict=True))


def find_ranking(name: str) -> Measure:
    """The measure of that name, to rank by.

    Raises
    ------
    UsageError
        There is none, or it tells only how uncertain another measure is.
    """
    measure = find(name)
    if measure.tells == "error":
        raise UsageError(f"{name} tells how uncertain another measure is, not how strong a pair: rank by another")
    return measure


def find(name: str) -> Measure:
    """The measure of that name.

    Raises
    ------
    UsageError
        There is none; the message lists those there are.
    """
    try:
        return MEASURES[name]
    except KeyError as error:
        raise UsageError(f"unknown measure {name!r}; there are {', '.join(MEASURES)}") from error


MEASURES: Mapping[str, Measure] = MappingProxyType({entry.name: entry for entry in ENTRIES})
"""All measures by name, in the order of the documentation. A new one is a function and an entry in ``entries``."""
