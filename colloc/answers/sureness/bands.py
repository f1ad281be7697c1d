"""Bands of expected count, and how many pairs of words lie in each, met or not."""

from __future__ import annotations

import numpy as np

from colloc.answers.tables import TableReader
from colloc.records import FloatArray, Int64Array

EDGES: FloatArray = np.concatenate([[0.0], 2.0 ** np.arange(-8, 31, 0.5)])
"""Where bands begin: half an octave each, all below 1/256 together."""


def band_of(expected: FloatArray) -> Int64Array:
    """The band of each expected count."""
    return np.searchsorted(EDGES, expected, side="right") - 1


def count_pairs(reader: TableReader) -> FloatArray:
    """Pairs of words in each band, from the margins alone.

    Pairs are counted as the reader has rows: ordered, or unordered with each word beside itself (units hold two
    different words). Words that do not occur are in no pair.

    Returns
    -------
    float64 array, shape (len(EDGES),)
    """
    first, second = _distinct(reader.first_totals()), _distinct(reader.second_totals())
    total = float(reader.total)
    below = np.array([_pairs_below(first, second, edge * total) for edge in EDGES[1:]])
    itself = first[0] ** 2
    diagonal = np.array([first[1][itself < edge * total].sum() for edge in EDGES[1:]])
    whole = float(first[1].sum()) * float(second[1].sum())
    if not reader.ordered:
        below = (below - diagonal) / 2
        whole = (whole - first[1].sum()) / 2
        if reader.tally.spec.kind != "unit":
            # a word beside itself has the half of everything, hence half the expected count
            below = below + [first[1][itself / 2 < edge * total].sum() for edge in EDGES[1:]]
            whole += first[1].sum()
    return np.diff(np.concatenate([[0.0], below, [whole]]))


def _distinct(totals: FloatArray | Int64Array) -> tuple[FloatArray, FloatArray]:
    values, counts = np.unique(totals[totals > 0], return_counts=True)
    return values.astype(np.float64), counts.astype(np.float64)


def _pairs_below(first: tuple[FloatArray, FloatArray], second: tuple[FloatArray, FloatArray], product: float) -> float:
    """Ordered pairs whose product of margins is below ``product``."""
    sums = np.concatenate([[0.0], np.cumsum(second[1])])
    with np.errstate(divide="ignore"):
        return float((first[1] * sums[np.searchsorted(second[0], product / first[0])]).sum())
