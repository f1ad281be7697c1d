"""Numbers of given expressions, however rare: the same as those of the ranking, where it has them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.expressions.gathering import Gathered, gather
from colloc.answers.expressions.interaction import interactions
from colloc.answers.expressions.judging import judge
from colloc.answers.expressions.measures import MEASURES
from colloc.answers.expressions.ranking import looked_up, scores_of
from colloc.answers.expressions.settings import CONTIGUOUS_ONLY, Asked, ExpressionOptions, resolve
from colloc.counts.sequences.growing import Grower
from colloc.counts.sequences.levels import Level
from colloc.counts.sequences.sharing import MOST_WORDS
from colloc.records import FloatArray, Int64Array, UInt64Array
from colloc.settings import DEFAULT_MEMORY
from colloc.store.connection import Store

OPEN_TERM = -1
"""Stands for an open slot among the terms of an expression."""
LONGEST_GIVEN = MOST_WORDS - 1
"""Places that an expression that is looked up can reach over."""
Shape = tuple[int, ...]


def given_expressions(
    store: Store,
    sequences: Sequence[Sequence[int]],
    options: ExpressionOptions,
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """All measures of some expressions.

    The sequences that are frequent by ``options`` are grown as for the ranking, and those given, with all their parts,
    beside them; so C-value and what is folded together know the same longer and shorter ones. Expressions with open
    slots are counted alone.

    Parameters
    ----------
    sequences : sequence of sequences of int
        Terms of the layer, `OPEN_TERM` for an open slot between words: at least two words over at most `LONGEST_GIVEN`
        places.

    Returns
    -------
    Columns
        A row for each: ``words`` (places that are not open) and `colloc.answers.expressions.measures.MEASURES`; nan
        where a measure is not defined (for frames C-value, the count in any order and strength, which goes by what is
        folded) or the expression never occurs.
    """
    asked = resolve(store, options)
    columns: dict[str, FloatArray] = {name: np.full(len(sequences), np.nan) for name in MEASURES}
    columns["count"], columns["documents"] = np.zeros(len(sequences)), np.zeros(len(sequences))
    shapes = [_shape(terms) for terms in sequences]
    framed = np.array([shape[-1] >= len(shape) for shape in shapes], np.bool_)
    with asked.growing(store, jobs, memory) as grower:
        for frames in (False, True):
            chosen = np.flatnonzero(framed == frames)
            if not len(chosen):
                continue
            wanted = _Wanted([sequences[place] for place in chosen.tolist()])
            table = _framed(grower, wanted) if frames else _grown(grower, wanted, options.max_words, progress)
            rows = wanted.rows(table)
            there = table.counts[rows] > 0
            found = _measured(grower, table, asked, rows[there], frames)
            for name, values in found.items():
                columns[name][chosen[there]] = values
    whole = {name: columns[name].astype(np.int64) for name in ("count", "documents")}
    words = np.array([len(shape) for shape in shapes], np.int64)
    return Columns({"words": words, **columns, **whole}, {**asked.settings(store), "given": len(sequences)})


def _measured(
    grower: Grower, table: Gathered, asked: Asked, rows: Int64Array, frames: bool
) -> dict[str, FloatArray | Int64Array]:
    judged, here = judge(table, asked), rows - table.edges[1]
    columns: dict[str, Any] = {name: values[here] for name, values in scores_of(table, judged).items()}
    columns["dp_norm"], columns["completeness"] = table.spread.dp_norm[here], judged.completeness[here]
    columns["specific_interaction"] = interactions(grower, table, rows)
    columns |= looked_up(grower, table, judged, rows, tuple(MEASURES))
    left_out = ("strength", *CONTIGUOUS_ONLY) if frames else ()
    return {name: values for name, values in columns.items() if name not in left_out}


def _shape(terms: Sequence[int]) -> Shape:
    """Offsets of the words."""
    return tuple(place for place, term in enumerate(terms) if term != OPEN_TERM)


class _Wanted:
    """The sequences that are wanted, with all the parts that they are grown from, by shape."""

    def __init__(self, sequences: Sequence[Sequence[int]]) -> None:
        self._of_shape: dict[Shape, set[tuple[int, ...]]] = {}
        self._sequences = [(_shape(terms), tuple(term for term in terms if term != OPEN_TERM)) for terms in sequences]
        for shape, words in self._sequences:
            self._add(shape, words)
        self._number: dict[tuple[Shape, tuple[int, ...]], int] = {}

    def _add(self, shape: Shape, words: tuple[int, ...]) -> None:
        known = self._of_shape.setdefault(shape, set())
        if words in known:
            return
        known.add(words)
        if len(shape) > 1:
            self._add(shape[:-1], words[:-1])
            self._add(_rest(shape), words[1:])

    @property
    def shapes(self) -> list[Shape]:
        """All of two words and more, shorter ones first."""
        return sorted((shape for shape in self._of_shape if len(shape) > 1), key=lambda shape: (len(shape), shape))

    def keys(self, shape: Shape) -> UInt64Array:
        """Keys of the sequences of a shape, once their parts are numbered; none for a shape nobody wants."""
        pairs = [self._key(shape, words) for words in self._of_shape.get(shape, ())]
        return np.array(sorted(pairs), np.uint64)

    def number(self, shape: Shape, level: Level) -> None:
        """Note which number each sequence of a shape has in its level."""
        for words in self._of_shape.get(shape, ()):
            place = int(np.searchsorted(level.keys, np.uint64(self._key(shape, words))))
            self._number[shape, words] = place

    def _key(self, shape: Shape, words: tuple[int, ...]) -> int:
        return self._numbered(shape[:-1], words[:-1]) << 32 | self._numbered(_rest(shape), words[1:])

    def _numbered(self, shape: Shape, words: tuple[int, ...]) -> int:
        return words[0] if len(shape) == 1 else self._number[shape, words]

    def rows(self, table: Gathered) -> Int64Array:
        """Row in the table of each sequence, as they were given."""
        begins = {level.words: int(begin) for level, begin in zip(table.levels, table.begins, strict=True)}
        return np.array([begins[shape] + self._number[shape, words] for shape, words in self._sequences], np.int64)


def _rest(shape: Shape) -> Shape:
    return tuple(word - shape[1] for word in shape[1:])


def _grown(grower: Grower, wanted: _Wanted, max_words: int, progress: Any) -> Gathered:
    """All that is frequent, and what is wanted."""
    levels = [grower.single]
    longest = max(max_words + 1, max(len(shape) for shape in wanted.shapes))
    for words in range(2, longest + 1):
        if progress is not None:
            progress((words - 2) / longest, grower.total, f"sequences of {words} words")
        shape = tuple(range(words))
        levels.append(grower.join(levels[-1], levels[-1], 1, also=wanted.keys(shape)))
        wanted.number(shape, levels[-1])
    return gather(levels, grower.total, grower.units)


def _framed(grower: Grower, wanted: _Wanted) -> Gathered:
    """Only what is wanted."""
    levels: dict[Shape, Level] = {(0,): grower.single}
    for shape in wanted.shapes:
        level = grower.known(levels[shape[:-1]], levels[_rest(shape)], shape[1], wanted.keys(shape), spread=True)
        wanted.number(shape, level)
        levels[shape] = level
    return gather(list(levels.values()), grower.total, grower.units)
