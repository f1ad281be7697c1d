"""The pairs about as frequent as one pair, to rank it among, and the mutual information of the whole table."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from colloc.answers.questions import Question
from colloc.answers.tables import PairTable, joined
from colloc.measures.catalogue import MEASURES, compute_all
from colloc.records import FloatArray, Int64Array, PairBlock
from colloc.store.paging.runs import take

FACTOR = 2
"""Pairs met between 1/FACTOR and FACTOR times as often are about as frequent."""
MOST = 2000
"""Pairs compared: of more, each so-many-th in the order of the table."""


@dataclass(frozen=True, slots=True)
class Similar:
    """What one pass over a table gives.

    Attributes
    ----------
    low, high : int
        Joint counts that count as about as frequent.
    n_pairs : int
        Pairs of the table with such a count.
    table : PairTable
        Those compared.
    information : float or None
        Mutual information of the table in bits, by its counts as they are; None where the table is no
        distribution of pairs (positions, units, margins of tokens).
    """

    low: int
    high: int
    n_pairs: int
    table: PairTable
    information: float | None

    def places(self, names: Sequence[str], own: PairTable) -> Int64Array:
        """The place of a pair among those compared, 1 for the strongest, by each measure; ties share the best place.

        0 where nothing is compared, and by measures that tell no strength (p-values, standard errors, conditional
        probabilities).
        """
        if not len(self.table):
            return np.zeros(len(names), np.int64)
        values = compute_all(names, *self.table.arguments)
        of_pair = compute_all(names, *own.arguments)
        places = np.zeros(len(names), np.int64)
        for row, name in enumerate(names):
            if MEASURES[name].tells != "strength":
                continue
            others, value = values[name], of_pair[name][0]
            stronger = others > value if MEASURES[name].strongest == "highest" else others < value
            # Rounding must not put a pair behind itself: it may be among those compared.
            places[row] = 1 + np.count_nonzero(stronger & ~np.isclose(others, value, rtol=1e-12, atol=0.0))
        return places


def similar_pairs(question: Question, joint: int) -> Similar:
    """Look through the whole table once."""
    reader = question.reader
    # A pair that never met has no like: no table lists those.
    low, high = -(-joint // FACTOR), joint * FACTOR
    found: list[PairBlock] = []
    n_found = 0
    cells = _CellSum() if question.convention.margins == "pairs" and question.spec.kind != "unit" else None
    for block in reader.tally.blocks():
        if cells is not None:
            cells.add(block, ordered=reader.ordered)
        keep = _fitting(block, max(low, 1), high, ordered=reader.ordered)
        n_found += len(keep)
        found.append(take(block, keep))
    tables = [reader.table(block) for block in found if len(block)]
    table = joined(tables) if tables else reader.given(np.empty(0, np.uint32), np.empty(0, np.uint32))
    inside = (table.joint >= max(low, 1)) & (table.joint <= high)
    rows = np.flatnonzero(inside)
    step = -(-len(rows) // MOST) if len(rows) else 1
    information = None if cells is None else cells.information(question)
    return Similar(low, high, len(rows), table.take(rows[::step]), information)


def _fitting(block: PairBlock, low: int, high: int, *, ordered: bool) -> Int64Array:
    """Rows of which a pair may fit."""
    if ordered:
        one, other = block.forward, block.backward
        return np.flatnonzero(((one >= low) & (one <= high)) | ((other >= low) & (other <= high)))
    together = block.forward + block.backward
    return np.flatnonzero((together >= low) & (together <= high))


class _CellSum:
    """Adds up n log2 n over the cells of a table."""

    def __init__(self) -> None:
        self._sum = 0.0

    def add(self, block: PairBlock, *, ordered: bool) -> None:
        if ordered:
            self._sum += _n_log_n(block.forward) + _n_log_n(block.backward)
            return
        same = block.low == block.high
        # S has each unordered pair in two cells, and twice its count on the diagonal.
        self._sum += 2 * _n_log_n((block.forward + block.backward)[~same]) + _n_log_n(2 * block.forward[same])

    def information(self, question: Question) -> float:
        """log2 N + (sum of cells - sum of rows - sum of columns) / N."""
        reader = question.reader
        margins = _n_log_n(reader.first_totals()) + _n_log_n(reader.second_totals())
        total = float(reader.total)
        return float(np.log2(total) + (self._sum - margins) / total)


def _n_log_n(counts: Int64Array | FloatArray) -> float:
    """Equal counts are gathered first: there are few different ones."""
    counts = counts[counts > 0]
    if not len(counts):
        return 0.0
    small = counts[counts < 4096].astype(np.int64)
    times = np.bincount(small, minlength=2).astype(np.float64)
    values = np.arange(len(times), dtype=np.float64)
    values[0] = 1.0
    large = counts[counts >= 4096].astype(np.float64)
    return float((times * values * np.log2(values)).sum() + (large * np.log2(large)).sum())
