"""Pairs counted between two layers: words of one as rows, words of the other as their company.

One pass over the stored stream. The pairs are those of a tally of one layer: both layers are read from the same
tokens, and a token that is in only one of them is counted on that side only.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from colloc.counts.accumulating import BoolArray, Places
from colloc.counts.keys import Run, empty_run, merge, run_of_keys
from colloc.counts.placing import document_places
from colloc.counts.scanning.feeding import feed
from colloc.counts.selection import slice_selection
from colloc.counts.spans import apply_layer
from colloc.records import NO_TERM, Int64Array, UInt32Array, UInt64Array
from colloc.settings import TallySpec
from colloc.store.connection import Store
from colloc.store.vocabulary import layer_map, term_count, type_count

PENDING = 2**22
"""Pairs that come together before they are sorted: 8 bytes each, as much again while sorting."""
_ROW = np.uint64(32)


@dataclass(frozen=True, slots=True)
class Crossed:
    """Cells of a table with rows and columns of different layers, sorted by row, then by column.

    Attributes
    ----------
    run : Run
        Keys are row << 32 | column.
    first, second : int64 arrays, by term
        Row sums and column sums.
    """

    run: Run
    first: Int64Array
    second: Int64Array


def count_crossed(
    store: Store,
    spec: TallySpec,
    context_layer: str,
    *,
    directed: bool,
    pending: int = PENDING,
    progress: Callable[[float, int, str], None] | None = None,
) -> Crossed:
    """Count the cells [x, y]: x in the layer of the spec, y in ``context_layer``.

    Parameters
    ----------
    spec : TallySpec
        Of the kind window, span or relation.
    directed : bool
        Whether y follows x (depends on x); otherwise each pair of tokens counts in both roles.
    pending : int
        Memory is 16 bytes for each, and some 80 bytes for each cell of the result while runs are merged.
    """
    selection = slice_selection(store, spec.where)
    documents = document_places(store, selection)
    sink = _CrossedSink(store, spec.layer, context_layer, both=not directed, pending=pending)
    every_type = np.arange(type_count(store), dtype=np.uint32)
    done = 0
    for document in feed(store, spec, selection, documents, every_type, sink):
        done = max(done, document)
        if progress is not None:
            progress(done / max(len(documents), 1), done, "counting")
    return sink.finish()


class _CrossedSink:
    """Takes pairs of tokens by their types."""

    def __init__(self, store: Store, layer: str, context_layer: str, *, both: bool, pending: int) -> None:
        self._maps = layer_map(store, layer), layer_map(store, context_layer)
        self._sums = tuple(np.zeros(term_count(store, name), np.int64) for name in (layer, context_layer))
        self._both = both
        self._pending = pending
        self._keys: list[UInt64Array] = []
        self._n_keys = 0
        self._runs: list[Run] = []

    def place(self, documents: Int64Array, begin: int, stop: int, units: Int64Array) -> None:
        """Documents do not matter here."""

    def load(self, terms: UInt32Array) -> None:
        """Set the tokens that `pair` speaks of, by their types."""
        self._rows, self._columns = (apply_layer(layer, terms) for layer in self._maps)
        self._is_row, self._is_column = self._rows != NO_TERM, self._columns != NO_TERM

    def pair(self, first: Places, second: Places, valid: BoolArray | None = None) -> None:
        """Count the cell [first, second], and where both roles count [second, first]."""
        self._add(first, second, valid)
        if self._both:
            self._add(second, first, valid)

    def _add(self, first: Places, second: Places, valid: BoolArray | None) -> None:
        counted = self._is_row[first] & self._is_column[second]
        if valid is not None:
            counted &= valid
        rows, columns = self._rows[first][counted], self._columns[second][counted]
        for sums, terms in zip(self._sums, (rows, columns), strict=True):
            sums += np.bincount(terms, minlength=len(sums))
        self._keys.append(rows.astype(np.uint64) << _ROW | columns)
        self._n_keys += len(rows)
        if self._n_keys >= self._pending:
            self._sort()

    def _sort(self) -> None:
        run = run_of_keys(np.concatenate([np.zeros(0, np.uint64), *self._keys]))
        self._keys, self._n_keys = [], 0
        # Runs of like sizes are merged as they come, so that together they hold little more than the result.
        while self._runs and len(self._runs[-1]) < 2 * len(run):
            run = merge([self._runs.pop(), run])
        self._runs.append(run)

    def finish(self) -> Crossed:
        """All that was counted."""
        self._sort()
        return Crossed(merge([*self._runs, empty_run()]), *self._sums)
