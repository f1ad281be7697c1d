"""The two sides of a contrast: which documents each has."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from colloc.errors import UsageError
from colloc.store import slices
from colloc.store.connection import Store


@dataclass(frozen=True, slots=True)
class Sides:
    """Two slices in canonical form that share no document."""

    this: str
    that: str

    @property
    def both(self) -> tuple[str, str]:
        """this, that."""
        return self.this, self.that


def resolve_sides(store: Store, this: Sequence[str], that: Sequence[str], where: Sequence[str] = ()) -> Sides:
    """The slices to compare.

    Parameters
    ----------
    this, that : sequences of str
        Conditions, joined by "and"; without ``that`` all other documents.
    where : sequence of str
        Holds for both sides.

    Raises
    ------
    UsageError
        A side is missing or has no document, or a document is on both sides.
    """
    if not this:
        raise UsageError("name the documents of one side, such as --this genre=press")
    within = slices.canonical(where)
    one = slices.canonical([*this, *where])
    other = slices.canonical([*that, *where]) if that else slices.complement(slices.canonical(this), within)
    numbers, other_numbers = slices.select(store, one), slices.select(store, other)
    for side, found in ((one, numbers), (other, other_numbers)):
        if not len(found):
            raise UsageError(f"{store.path}: no document fits {side!r}; `colloc info STORE --by KEY` lists values")
    shared = np.intersect1d(numbers, other_numbers)
    if len(shared):
        raise UsageError(
            f"{store.path}: {len(shared)} documents fit both {one!r} and {other!r}: "
            "a contrast needs sides that share none"
        )
    return Sides(one, other)
