"""The table behind a matrix whose rows and contexts are words of different layers."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np

from colloc.answers.questions import PairOptions, resolve_spec, settings_of
from colloc.answers.spaces.choosing import Words
from colloc.answers.spaces.rows import Counts, MatrixTable, RowCells
from colloc.answers.spaces.weighting import Weighting, nested_specs
from colloc.answers.tables import Convention, Sums, TableMaker
from colloc.counts.scanning.crossing import Crossed, count_crossed
from colloc.counts.words import slice_word_counts
from colloc.errors import UsageError
from colloc.records import FloatArray, Int64Array
from colloc.store import vocabulary
from colloc.store.connection import Store
from colloc.store.opening import open_for_writing
from colloc.store.slices import fitting

_CELLS = 1 << 18
"""Cells of a stretch."""


def crossed_table(
    store: Store, options: PairOptions, context_layer: str, weighting: Weighting, *, progress: Any = None
) -> MatrixTable:
    """Rows of the layer of the options, columns of another, counted in one pass over the stream.

    Margins are the row and column sums of this table: x and y are two tokens, whatever the layers call them. Nothing
    is halved: a word of one layer is never the same as a word of another.

    Raises
    ------
    UsageError
        Where pairs are not windows or relations, or margins not those of pairs; or a layer is not to be had.
    """
    spec, margins = resolve_spec(store, options)
    if spec.kind not in ("window", "span", "relation") or margins != "pairs":
        raise UsageError(
            "rows and contexts of different layers are counted by window or relation, with margins pairs: "
            "leave out unit and other margins"
        )
    for layer in (spec.layer, context_layer):
        _require_layer(store, layer)
    fitting(store, spec.where)
    convention = Convention(margins=margins, directed=options.directed)
    ordered = options.directed or spec.kind != "window"
    specs = [(spec, 1.0)] if weighting == "flat" else nested_specs(spec, weighting)
    parts = [
        (count_crossed(store, part, context_layer, directed=ordered, progress=progress), weight)
        for part, weight in specs
    ]
    first, second = (_summed([getattr(part, side) for part, _ in parts], parts) for side in ("first", "second"))
    widest, _ = parts[0]
    rows, columns = (
        Words(store, name, slice_word_counts(store, name, spec.where).tokens) for name in (spec.layer, context_layer)
    )
    return MatrixTable(
        _stretches(widest, _weighted(parts)),
        len(widest.run),
        # Both roles of a pair were counted, so the table is read as it stands.
        TableMaker(Sums(spec, first.sum(), first, second), Convention(margins=margins, directed=True)),
        rows,
        columns,
        {**settings_of(store, spec, convention), "context_layer": context_layer},
    )


def _require_layer(store: Store, layer: str) -> None:
    """Make the layer where the store does not have it yet."""
    if layer in vocabulary.layer_names(store):
        return
    if store.writable:
        vocabulary.ensure_layer(store, layer)
        return
    with open_for_writing(store.path, "layer") as writer:
        vocabulary.ensure_layer(writer, layer)
    store.refresh()


Parts = Sequence[tuple[Crossed, float]]


def _summed(values: Sequence[Int64Array], parts: Parts) -> Counts:
    """The weighted sum; counts stay whole where there is one part."""
    if len(parts) == 1:
        return values[0]
    total: FloatArray = np.sum([weight * value for value, (_, weight) in zip(values, parts, strict=True)], axis=0)
    return total


def _weighted(parts: Parts) -> Counts:
    """The weighted sum of the cells, in the order of the first part, which has all of them."""
    widest = parts[0][0].run
    if len(parts) == 1:
        return widest.counts
    joint = np.zeros(len(widest))
    for crossed, weight in parts:
        joint[np.searchsorted(widest.keys, crossed.run.keys)] += weight * crossed.run.counts
    return joint


def _stretches(crossed: Crossed, joint: Counts) -> Iterator[RowCells]:
    for start in range(0, len(joint), _CELLS):
        part = slice(start, start + _CELLS)
        keys = crossed.run.keys[part]
        yield RowCells((keys >> np.uint64(32)).astype(np.uint32), keys.astype(np.uint32), joint[part])
