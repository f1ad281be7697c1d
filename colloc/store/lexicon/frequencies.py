"""Word and document frequencies of a layer: signed sparse runs that a reader adds up."""

from __future__ import annotations

import numpy as np

from colloc.errors import StoreDamagedError, UsageError
from colloc.records import Int64Array, UInt32Array, WordCounts
from colloc.store.connection import Store
from colloc.store.database import packing
from colloc.store.lexicon.layers import Layer, find_layer

_MOST_RUNS = 32
_SHARE = 4
"""Runs are joined when there are more than this many, or the changes outgrow a quarter of the first."""


def has_word_counts(store: Store, layer: str) -> bool:
    """Whether the words of a layer have been counted."""
    number = find_layer(store, layer).number
    return store.value("SELECT 1 FROM word_counts WHERE layer = ? LIMIT 1", (number,)) is not None


def word_counts(store: Store, layer: str) -> WordCounts:
    """Frequencies by term: tokens, and documents that hold it; arrays of shape (number of terms,).

    Raises
    ------
    UsageError
        The words of this layer were not counted; see :func:`has_word_counts`.
    """
    row = find_layer(store, layer)
    if not has_word_counts(store, layer):
        raise UsageError(f"{store.path}: the words of layer {layer!r} have not been counted")
    tokens, documents = _summed(store, row)
    if (tokens < 0).any() or (documents < 0).any():
        raise StoreDamagedError(f"{store.path}: word counts of layer {layer} fall below zero")
    return WordCounts(tokens, documents)


def append_word_counts(
    store: Store, layer: str, numbers: UInt32Array, tokens: Int64Array, documents: Int64Array
) -> None:
    """Add a signed change of the frequencies.

    Parameters
    ----------
    numbers : uint32 array, shape (n,)
        Terms, strictly ascending.
    tokens, documents : int64 arrays, shape (n,)
    """
    row = find_layer(store, layer)
    _insert(store, row, numbers, tokens, documents)
    runs = [n for (n,) in store.rows("SELECT n FROM word_counts WHERE layer = ? ORDER BY id", (row.number,))]
    if len(runs) > 1 and (len(runs) > _MOST_RUNS or sum(runs[1:]) * _SHARE > max(runs[0], 1)):
        all_tokens, all_documents = _summed(store, row)
        store.execute("DELETE FROM word_counts WHERE layer = ?", (row.number,))
        there = np.flatnonzero((all_tokens != 0) | (all_documents != 0))
        _insert(store, row, there.astype(np.uint32), all_tokens[there], all_documents[there])


def _insert(store: Store, row: Layer, numbers: UInt32Array, tokens: Int64Array, documents: Int64Array) -> None:
    store.execute(
        "INSERT INTO word_counts (layer, n, numbers, tokens, documents) VALUES (?, ?, ?, ?, ?)",
        (
            row.number,
            len(numbers),
            packing.pack(numbers.astype(np.uint32, copy=False), ascending=True),
            packing.pack(tokens.astype(np.int64, copy=False), compress=True),
            packing.pack(documents.astype(np.int64, copy=False), compress=True),
        ),
    )


def _summed(store: Store, row: Layer) -> tuple[Int64Array, Int64Array]:
    sums = np.zeros(row.terms, dtype=np.int64), np.zeros(row.terms, dtype=np.int64)
    what = f"{store.path}: word counts of layer {row.name}"
    sql = "SELECT numbers, tokens, documents FROM word_counts WHERE layer = ? ORDER BY id"
    for packed, *columns in store.rows(sql, (row.number,)):
        numbers = packing.unpack_as(packed, np.uint32, what)
        if len(numbers) and (numbers[-1] >= row.terms or (numbers[1:] <= numbers[:-1]).any()):
            raise StoreDamagedError(f"{what}: terms out of range or order")
        for total, column in zip(sums, columns, strict=True):
            values = packing.unpack_as(column, np.int64, what)
            if len(values) != len(numbers):
                raise StoreDamagedError(f"{what}: columns of different length")
            total[numbers] += values  # the numbers of one run are distinct
    return sums
