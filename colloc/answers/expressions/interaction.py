"""Specific interaction of expressions: how often every choice of their words stands at the same distances."""

from __future__ import annotations

import numpy as np

from colloc.answers.expressions.gathering import Gathered
from colloc.counts.sequences.growing import Grower
from colloc.counts.sequences.levels import Level
from colloc.measures.multivariate import specific_interaction
from colloc.records import FloatArray, Int64Array

Shape = tuple[int, ...]


def interactions(grower: Grower, table: Gathered, rows: Int64Array) -> FloatArray:
    """Specific interaction (SI1 of Van de Cruys 2011) of some rows of the table, in bits; PMI for two words.

    The count of a choice of words is that of the words at the distances that they have in the expression, whatever
    stands between; so every choice is counted anew from the stream.
    """
    lengths, level = table.lengths[rows], table.level_of(rows)
    wanted: dict[Shape, list[Int64Array]] = {}
    groups = []
    for index in np.unique(level).tolist():
        here = np.flatnonzero(level == index)
        shape = table.levels[index].words
        terms = table.terms(rows[here], int(lengths[here[0]]))
        groups.append((here, shape, terms))
        for chosen in _choices(len(shape)):
            wanted.setdefault(_moved(shape, chosen), []).append(terms[:, chosen])
    counts = _counted(grower, {shape: np.unique(np.concatenate(parts), axis=0) for shape, parts in wanted.items()})
    result = np.empty(len(rows))
    for here, shape, terms in groups:
        subsets = [counts[_moved(shape, chosen)].of(terms[:, chosen]) for chosen in _choices(len(shape))]
        result[here] = specific_interaction(np.stack(subsets), table.total)
    return result


class _Counts:
    """Counts of sequences of one shape, found by their terms."""

    def __init__(self, terms: Int64Array, level: Level) -> None:
        self.terms, self.level = terms, level
        self._row = {tuple(row): number for number, row in enumerate(terms.tolist())}

    def numbers(self, terms: Int64Array) -> Int64Array:
        return np.array([self._row[tuple(row)] for row in terms.tolist()], np.int64)

    def of(self, terms: Int64Array) -> Int64Array:
        return self.level.counts[self.numbers(terms)]


def _counted(grower: Grower, wanted: dict[Shape, Int64Array]) -> dict[Shape, _Counts]:
    """Counts of the sequences wanted, ascending by terms; with each shape the one without its last word is there."""
    done: dict[Shape, _Counts] = {}
    for shape in sorted(wanted, key=lambda shape: (len(shape), shape)):
        terms = wanted[shape]
        if len(shape) == 1:
            keys = np.empty(0, np.uint64)
            single = grower.single
            level = Level(shape, None, None, keys, single.counts[terms[:, 0]], single.ids, None)
            done[shape] = _Counts(terms, level)
            continue
        # of single words the number is the term; of longer ones the row: both ascend as the terms do
        before = done[shape[:-1]]
        left = terms[:, 0] if len(shape) == 2 else before.numbers(terms[:, :-1])
        keys = left.astype(np.uint64) << np.uint64(32) | terms[:, -1].astype(np.uint64)
        left_level = grower.single if len(shape) == 2 else before.level
        done[shape] = _Counts(terms, grower.known(left_level, grower.single, shape[-1], keys))
    return done


def _choices(words: int) -> list[list[int]]:
    """Every choice of words but none, in the order of `specific_interaction`."""
    return [[word for word in range(words) if mask >> word & 1] for mask in range(1, 2**words)]


def _moved(shape: Shape, chosen: list[int]) -> Shape:
    return tuple(shape[word] - shape[chosen[0]] for word in chosen)
