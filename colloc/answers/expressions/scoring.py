"""Scores of contiguous sequences of two words and more; arrays begin with the first sequence of two words."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colloc.answers.expressions.gathering import Gathered
from colloc.measures.likelihood import g2
from colloc.measures.multivariate import c_value, specific_correlation, weakest_split
from colloc.records import FloatArray, Int64Array


@dataclass(frozen=True, slots=True)
class Bonds:
    """How a sequence holds together; arrays of shape (n,), in bits where not said otherwise.

    Attributes
    ----------
    correlation : float64 array
        Specific correlation of all words.
    weakest : float64 array
        PMI across the cut where the halves cling least.
    cut : int64 array
        Words left of that cut.
    g2 : float64 array
        Largest log-likelihood ratio across any cut.
    """

    correlation: FloatArray
    weakest: FloatArray
    cut: Int64Array
    g2: FloatArray


def bonds(table: Gathered) -> Bonds:
    """Specific correlation, and what the cuts say, for all sequences."""
    correlation, weakest, cuts, best = [], [], [], []
    for words in range(2, table.longest + 1):
        rows = table.rows(words)
        joint = table.counts[rows]
        left, right = table.halves(words)
        correlation.append(specific_correlation(joint, table.counts[table.terms(rows, words)].T, table.total))
        value, cut = weakest_split(joint, left, right, table.total)
        weakest.append(value)
        cuts.append(cut)
        best.append(g2(joint, left, right, table.total).max(axis=0))
    return Bonds(*(np.concatenate(parts) for parts in (correlation, weakest, cuts, best)))


@dataclass(frozen=True, slots=True)
class Nesting:
    """Occurrences inside longer candidates, none counted twice.

    Attributes
    ----------
    inside : int64 array
        Occurrences inside longer candidates.
    longer : int64 array
        How many different longer candidates these are.
    """

    inside: Int64Array
    longer: Int64Array


def nesting(table: Gathered, candidates: NDArray[np.bool_]) -> Nesting:
    """For all sequences, where they stand inside longer candidates.

    An occurrence in a candidate that itself stands in a longer one is counted with the longer one only (Frantzi,
    Ananiadou & Mima 2000, doi:10.1007/s007999900023); candidates that never occur outside longer ones are none.

    Parameters
    ----------
    candidates : bool array, shape (n,)
        Which sequences of two words and more are candidates.
    """
    first = table.edges[1]
    inside, longer = np.zeros(len(candidates), np.int64), np.zeros(len(candidates), np.int64)
    for words in range(table.longest, 2, -1):
        rows = table.rows(words)
        own = np.maximum(table.counts[rows] - inside[rows - first], 0)
        held = candidates[rows - first] & (own > 0)
        rows, own = rows[held], own[held]
        for length in range(2, words):
            seen: list[Int64Array] = []
            for begin in range(words - length + 1):
                part = table.part(rows, words, begin, begin + length)
                fresh = np.ones(len(part), bool)
                for other in seen:
                    # a sequence that stands twice in a longer one is there once
                    fresh &= part != other
                seen.append(part)
                np.add.at(inside, part[fresh] - first, own[fresh])
                np.add.at(longer, part[fresh] - first, 1)
    return Nesting(inside, longer)


def c_values(table: Gathered, nested: Nesting) -> tuple[FloatArray, FloatArray]:
    """C-value of all sequences, with the weight log2 length and with length - 1."""
    lengths, counts = table.lengths[table.edges[1] :], table.counts[table.edges[1] :]
    by_log = c_value(lengths, counts, nested.inside, nested.longer, form="log2")
    by_length = c_value(lengths, counts, nested.inside, nested.longer, form="length")
    return by_log, by_length
