"""Flexible word order: the same words side by side in whatever order."""

from __future__ import annotations

import numpy as np

from colloc.answers.expressions.gathering import Gathered
from colloc.counts.sequences.growing import Grower
from colloc.counts.sequences.sets import SetCounter
from colloc.records import Int64Array


def in_any_order(grower: Grower, table: Gathered, rows: Int64Array) -> Int64Array:
    """Times the words of each row stand side by side in any order, its own included."""
    lengths, counter = table.lengths[rows], SetCounter(grower.ground, gap=0)
    result = np.zeros(len(rows), np.int64)
    for words in np.unique(lengths).tolist():
        here = np.flatnonzero(lengths == words)
        sets = np.sort(table.terms(rows[here], words), axis=1)
        distinct, place = np.unique(sets, axis=0, return_inverse=True)
        result[here] = counter.survey(distinct).counts[place.reshape(-1)]
    return result
