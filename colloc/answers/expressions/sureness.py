"""How sure the weakest split of an expression is: its interval over documents."""

from __future__ import annotations

import numpy as np

from colloc.answers.expressions.gathering import Gathered
from colloc.answers.sureness.documents import document_interval
from colloc.counts.sequences.growing import Grower
from colloc.counts.sequences.places import NONE
from colloc.records import FloatArray, Int64Array


def split_intervals(
    grower: Grower, table: Gathered, rows: Int64Array, weakest: FloatArray, cut: Int64Array
) -> tuple[FloatArray, FloatArray]:
    """Both ends of the 95 % interval of the PMI across the weakest cut of some rows of the table, in bits.

    The delete-a-group jackknife over documents (Kott 2001), as for pairs: the cut stays where it is, and the counts of
    the whole and of both halves are those without each of the groups that documents are dealt into.

    Parameters
    ----------
    weakest, cut : arrays, shape (len(rows),)
        The PMI, and how many words are left of the cut.
    """
    parts = np.empty((3, len(rows)), np.int64)
    lengths = table.lengths[rows]
    for words in np.unique(lengths).tolist():
        for place in np.unique(cut[lengths == words]).tolist():
            here = np.flatnonzero((lengths == words) & (cut == place))
            parts[0, here] = rows[here]
            parts[1, here] = table.part(rows[here], words, 0, place)
            parts[2, here] = table.part(rows[here], words, place, words)
    distinct, index = np.unique(parts, return_inverse=True)
    by_group = _by_group(grower, table, distinct)
    # every token in one row: the tokens of each group
    everything = grower.by_group(grower.single, np.zeros(len(grower.single), np.uint32))[0]
    whole, left, right = (
        (table.counts[part] - by_group[place].T).astype(np.float64)
        for part, place in zip(parts, index.reshape(parts.shape), strict=True)
    )
    with np.errstate(divide="ignore", invalid="ignore"):
        replicates = np.log2(whole * (table.total - everything)[:, None] / (left * right))
    interval = document_interval(weakest, replicates)
    return interval.low, interval.high


def _by_group(grower: Grower, table: Gathered, rows: Int64Array) -> Int64Array:
    """Occurrences of rows of the table in each group of documents: shape (len(rows), groups)."""
    counts = np.zeros((len(rows), grower.groups), np.int64)
    level = table.level_of(rows)
    for index in np.unique(level).tolist():
        here = np.flatnonzero(level == index)
        asked = np.full(len(table.levels[index]), NONE)
        asked[rows[here] - int(table.begins[index])] = np.arange(len(here))
        counts[here] = grower.by_group(table.levels[index], asked)[: len(here)]
    return counts
