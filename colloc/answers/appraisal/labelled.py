"""What rankings are held against: candidates with a label each, from decisions or from a list."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Sequence
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray

from colloc.answers.columns import Columns
from colloc.answers.judging.listing import standing
from colloc.errors import UsageError
from colloc.records import FloatArray, Int64Array
from colloc.store.connection import Store
from colloc.store.decisions import Decision, Key, Kind

Scores = dict[str, FloatArray]
"""Ranking values by measure, the highest first."""


class Labelled(ABC):
    """Candidates, and which of them are wanted.

    Attributes
    ----------
    what : str
        What the candidates are, in the plural.
    wanted : bool array, shape (n,)
    listed : int
        Entries of the list, or decisions of the kind asked about, whether or not the store has them as candidates.
    passed_over : int
        Of those, how many are no candidates: too rare, never met, or undecided.
    groups : int64 array, shape (n,)
        The first word of each, as a number.
    """

    what: ClassVar[str]
    wanted: NDArray[np.bool_]
    listed: int
    passed_over: int
    groups: Int64Array

    def __len__(self) -> int:
        return len(self.wanted)

    @abstractmethod
    def measures(self, names: Sequence[str] | None) -> list[str]:
        """The measures asked for, all that can rank these candidates when not given.

        Raises
        ------
        UsageError
            For a name that is none of them.
        """

    @abstractmethod
    def scores(self, measures: Sequence[str]) -> Scores:
        """Ranking value of each candidate by each measure."""

    def turned(self, measure: str) -> bool:
        """Whether the strongest end of a measure is its lowest, so that its ranking values are negative."""
        return False

    @abstractmethod
    def settings(self, **more: Any) -> dict[str, Any]:
        """How the candidates were counted."""

    @abstractmethod
    def ranked(
        self, measures: Sequence[str], odds: Callable[[Scores], FloatArray], min_count: int, limit: int
    ) -> Columns:
        """What the store has, by odds that were learnt from the measures: ``combined`` is them, ``wanted`` the label.

        Parameters
        ----------
        limit : int
            Rows.
        """


def decided(store: Store, kind: Kind, layer: str, judge: str | None) -> tuple[list[Decision], NDArray[np.bool_], int]:
    """What was accepted or rejected of one kind in one layer; what judges dispute, or are unsure of, is passed over.

    Returns
    -------
    decisions : list of Decision
        One of each matter.
    wanted : bool array
        Whether it was accepted.
    listed : int
        Matters that were decided at all.
    """
    verdicts: dict[Key, set[str]] = {}
    matters: dict[Key, Decision] = {}
    for one in standing(store, judge):
        if one.kind == kind and one.layer == layer:
            verdicts.setdefault(one.key, set()).add(one.verdict)
            matters[one.key] = one
    clear = [key for key, found in verdicts.items() if len(found & {"accept", "reject"}) == 1]
    wanted = np.array(["accept" in verdicts[key] for key in clear], np.bool_)
    return [matters[key] for key in clear], wanted, len(verdicts)


def check_both(store: Store, wanted: NDArray[np.bool_], what: str, layer: str) -> None:
    """Raise UsageError where everything, or nothing, is wanted."""
    if wanted.all() or not wanted.any():
        verdict = "accepted" if not wanted.any() else "rejected"
        raise UsageError(
            f"{store.path}: no {what} of layer {layer!r} was {verdict}: accept some and reject some, "
            "or give a list with --gold"
        )
