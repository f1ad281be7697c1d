"""Frames: expressions with open slots of one word, and what fills the slots."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.answers.expressions.gathering import Gathered
from colloc.answers.expressions.settings import Asked
from colloc.counts.sequences.growing import Grower
from colloc.counts.sequences.levels import Level
from colloc.counts.sequences.sharing import MOST_WORDS
from colloc.measures.multivariate import entropy
from colloc.records import Int64Array
from colloc.store.connection import Store
from colloc.store.vocabulary import term_texts

Shape = tuple[int, ...]

DOMINATED = 0.5
"""Share of one filler beyond which a slot is not open: the frame is an expression with a word left out."""
_LISTED = 5
"""Fillers named for each slot."""
_AT_A_TIME = 4
"""Frames looked into for each one wanted: many turn out to have no open slot."""


def frame_shapes(min_words: int, max_words: int, slots: int) -> list[Shape]:
    """Offsets of the words of all frames with 1 to ``slots`` open slots between the words."""
    shapes = []
    for words in range(min_words, max_words + 1):
        for span in range(words + 1, min(words + slots, MOST_WORDS) + 1):
            shapes += [(0, *inner, span - 1) for inner in combinations(range(1, span - 1), words - 2)]
    return shapes


def grown_frames(grower: Grower, shapes: Sequence[Shape], tell: Callable[[float, int, str], None]) -> list[Level]:
    """Levels of the shapes, and of all the shorter ones that they are grown from."""
    levels: dict[Shape, Level] = {(0,): grower.single}

    def level(shape: Shape) -> Level:
        if shape not in levels:
            rest = tuple(word - shape[1] for word in shape[1:])
            levels[shape] = grower.join(level(shape[:-1]), level(rest), shape[1])
        return levels[shape]

    for done, shape in enumerate(shapes):
        tell(done / len(shapes), grower.total, f"frames of {len(shape)} words")
        level(shape)
    return list(levels.values())


def with_fillers(
    store: Store, asked: Asked, grower: Grower, table: Gathered, rows: Int64Array, score: NDArray[Any], limit: int
) -> tuple[Int64Array, dict[str, dict[int, Any]]]:
    """The frames among the best ``limit`` whose slots are open, and what fills them.

    Returns
    -------
    rows : int64 array
    columns : dict
        ``fillers`` (the most frequent with counts, slots divided by ``|``), ``filler_kinds`` and ``filler_entropy``
        (bits; both of the slot where they are smallest), by row.
    """
    columns: dict[str, dict[int, Any]] = {"fillers": {}, "filler_kinds": {}, "filler_entropy": {}}
    kept: list[int] = []
    order = _best_first(table, rows, score)
    step = limit * _AT_A_TIME or len(order) or 1
    for begin in range(0, len(order), step):
        batch = np.sort(order[begin : begin + step])
        kept += _filled(store, asked, grower, table, batch, columns)
        if limit and len(kept) >= limit:
            break
    return np.array(kept, np.int64), columns


def _best_first(table: Gathered, rows: Int64Array, score: NDArray[Any]) -> Int64Array:
    values = score[rows - table.edges[1]]
    return rows[np.lexsort((-table.counts[rows], -values))]


def _filled(
    store: Store, asked: Asked, grower: Grower, table: Gathered, rows: Int64Array, columns: dict[str, dict[int, Any]]
) -> list[int]:
    """Fill in the columns for those of the rows whose slots are all open; returns these rows."""
    kept: list[int] = []
    level = table.level_of(rows)
    for index in np.unique(level).tolist():
        here, shape = rows[level == index], table.levels[index].words
        slots = [offset for offset in range(shape[-1]) if offset not in shape]
        numbers = here - int(table.begins[index])
        found = [grower.fillers(table.levels[index], numbers, slot) for slot in slots]
        for place, row in enumerate(here.tolist()):
            own = [(term[index == place], count[index == place]) for index, term, count in found]
            if asked.options.fragments == "fold" and any(_dominated(count) for _, count in own):
                continue
            kept.append(row)
            columns["fillers"][row] = " | ".join(_named(store, asked.layer, term, count) for term, count in own)
            columns["filler_kinds"][row] = min(len(term) for term, _ in own)
            columns["filler_entropy"][row] = min(float(entropy(count)) for _, count in own)
    return kept


def _dominated(count: Int64Array) -> bool:
    return not len(count) or int(count.max()) > DOMINATED * int(count.sum())


def _named(store: Store, layer: str, term: Int64Array, count: Int64Array) -> str:
    # ties go by the word, so all that tie with the last place need their text
    least = np.sort(count)[-_LISTED:][0]
    reach = count >= least
    names = term_texts(store, layer, term[reach])
    best = sorted(zip(-count[reach], names, strict=True))[:_LISTED]
    return ", ".join(f"{name} {-n}" for n, name in best)
