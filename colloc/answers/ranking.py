"""The best rows of a stream, in bounded memory and in a fixed order of ties.

Order: score (highest first), then joint count (highest first), then the words
by code point.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from colloc.answers.tables import PairTable, joined
from colloc.records import FloatArray, Int64Array

_ROOM = 1 << 18
"""Rows gathered before the weaker ones are let go."""


class TopRows:
    """Keeps the ``limit`` best rows of all that are added.

    Parameters
    ----------
    limit : int
        0 keeps every row.
    text_ranks : callable
        Gives for every term its place among all terms sorted by text; called
        only when more rows tie than there is room for.
    """

    def __init__(self, limit: int, text_ranks: Callable[[], Int64Array]) -> None:
        self._limit = limit
        self._text_ranks = text_ranks
        self._tables: list[PairTable] = []
        self._scores: list[FloatArray] = []
        self._rows = 0
        self._floor = -np.inf

    def add(self, table: PairTable, scores: FloatArray) -> None:
        """Add rows; rows whose score is not a number are left out."""
        keep = scores >= self._floor
        if not keep.all():
            table, scores = table.take(keep), scores[keep]
        if not len(table):
            return
        self._tables.append(table)
        self._scores.append(scores)
        self._rows += len(table)
        if self._limit and self._rows > max(_ROOM, 4 * self._limit):
            self._prune()

    def _gathered(self) -> tuple[PairTable, FloatArray]:
        table, scores = joined(self._tables), np.concatenate(self._scores)
        self._tables, self._scores = [table], [scores]
        return table, scores

    def _prune(self) -> None:
        table, scores = self._gathered()
        kth = np.partition(scores, len(scores) - self._limit)[len(scores) - self._limit]
        keep = np.flatnonzero(scores >= kth)
        if len(keep) > 2 * self._limit:
            ranks = self._text_ranks()
            order = np.lexsort((ranks[table.second[keep]], ranks[table.first[keep]], -table.joint[keep], -scores[keep]))
            keep = keep[order[: self._limit]]
        self._tables, self._scores = [table.take(keep)], [scores[keep]]
        self._rows = len(keep)
        self._floor = float(kth)

    def best(self, texts: Callable[[np.ndarray], list[str]]) -> tuple[PairTable, FloatArray, list[str], list[str]]:
        """The rows in order, with their scores and the texts of both words."""
        if not self._tables:
            empty = np.zeros(0, dtype=np.int64)
            nothing = PairTable(empty.astype(np.uint32), empty.astype(np.uint32), empty, empty, empty, empty)
            return nothing, np.zeros(0), [], []
        if self._limit and self._rows > self._limit:
            self._prune()
        table, scores = self._gathered()
        both = texts(np.concatenate([table.first, table.second]))
        first, second = np.array(both[: len(table)], dtype=object), np.array(both[len(table) :], dtype=object)
        order = _ordered(scores, table.joint, first, second)
        if self._limit:
            order = order[: self._limit]
        return table.take(order), scores[order], first[order].tolist(), second[order].tolist()


def _ordered(scores: FloatArray, joint: Int64Array, first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """Row numbers by score and joint count, descending, then by text.

    Texts are compared only within ties: sorting all of them would dominate.
    """
    order = np.lexsort((-joint, -scores))
    tied = np.flatnonzero((scores[order][1:] == scores[order][:-1]) & (joint[order][1:] == joint[order][:-1]))
    if not len(tied):
        return order
    run_starts = tied[np.r_[True, np.diff(tied) > 1]]
    run_ends = tied[np.r_[np.diff(tied) > 1, True]] + 2
    for start, end in zip(run_starts.tolist(), run_ends.tolist(), strict=True):
        rows = order[start:end].tolist()
        rows.sort(key=lambda row: (first[row], second[row]))
        order[start:end] = rows
    return order
