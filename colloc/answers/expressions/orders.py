"""Flexible word order: the same words side by side in whatever order."""

from __future__ import annotations

import numpy as np

from colloc.answers.expressions.gathering import Gathered
from colloc.counts.sequences.growing import Grower
from colloc.records import Int64Array


def in_any_order(grower: Grower, table: Gathered, rows: Int64Array) -> Int64Array:
    """Times the words of each row stand side by side in any order, its own included."""
    lengths = table.lengths[rows]
    result = np.zeros(len(rows), np.int64)
    for words in np.unique(lengths).tolist():
        here = np.flatnonzero(lengths == words)
        bags = np.sort(table.terms(rows[here], words), axis=1)
        distinct, place = np.unique(bags, axis=0, return_inverse=True)
        result[here] = grower.bags(distinct)[place.reshape(-1)]
    return result
