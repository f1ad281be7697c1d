"""Heads and dependents of annotated text, read from the columns of the stored stream."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colloc.counts.selection import Selection
from colloc.counts.spans import apply_layer, slices_in
from colloc.errors import NotSeenError, StoreDamagedError, UsageError
from colloc.records import Int64Array, UInt32Array
from colloc.store.annotation import HEAD, NOTHING, RELATION, values_of
from colloc.store.connection import Store
from colloc.store.stream import block_heads, column_names, read_block, read_column

WITH_SUBTYPES = ":*"
"""At the end of a name: the relation and all its subtypes."""


@dataclass(frozen=True, slots=True)
class Dependents:
    """Pairs of consecutive tokens of a selection.

    Attributes
    ----------
    first : int
        Place of the first token in the selection.
    terms : uint32 array
    heads, dependents : int64 arrays, shape (n_pairs,)
        Offsets in ``terms``.
    relations : int64 array, shape (n_pairs,)
        Numbers of the column ``relation``.
    """

    first: int
    terms: UInt32Array
    heads: Int64Array
    dependents: Int64Array
    relations: Int64Array


def relation_names(store: Store) -> list[str]:
    """Relations that the store has met between words, in order of first appearance."""
    return [name for name in values_of(store, RELATION) if name not in (NOTHING, "root")]


def chosen_relations(store: Store, relation: str) -> NDArray[np.bool_]:
    """Which of the numbers of the column ``relation`` a name means.

    Parameters
    ----------
    relation : str
        One relation, as it is written (``nmod`` is not ``nmod:poss``); with ``:*`` behind it together with its
        subtypes; empty for all.

    Raises
    ------
    UsageError
        The store holds no text with relations.
    NotSeenError
        No relation is called so.
    """
    known = values_of(store, RELATION)
    if not known:
        raise UsageError(f"{store.path}: relations are counted in annotated text, and this store holds none")
    base = relation.removesuffix(WITH_SUBTYPES)
    subtypes = relation.endswith(WITH_SUBTYPES)
    chosen = [not relation or name == base or (subtypes and name.startswith(f"{base}:")) for name in known]
    if not any(chosen):
        listed = ", ".join(sorted(relation_names(store)))
        raise NotSeenError(f"{store.path}: no relation {relation!r}, only {listed}; {base}:* takes subtypes too")
    return np.array(chosen, np.bool_)


def read_dependents(
    store: Store, layer: UInt32Array, selection: Selection, relation: str, begin: int = 0, stop: int | None = None
) -> Iterator[Dependents]:
    """Pairs whose dependent is at the places ``begin`` to ``stop`` of a selection, a block at a time.

    Blocks of plain text, and those that hold nothing of the selection, are passed over.
    """
    chosen = chosen_relations(store, relation)
    stop = len(selection) if stop is None else stop
    for head in block_heads(store):
        first, parts = slices_in(selection, head)
        if not parts or first >= stop or not {HEAD, RELATION} <= {*column_names(store, head.number)}:
            continue
        block = read_block(store, head.number)
        types, heads, relations = (
            np.concatenate([column[part] for part in parts])
            for column in (
                block.tokens,
                read_column(store, head.number, HEAD),
                read_column(store, head.number, RELATION),
            )
        )
        if len(relations) and int(relations.max()) >= len(chosen):
            raise StoreDamagedError(f"{store.path}: block {head.number} holds relations without a name")
        wanted = chosen[relations] & (heads != 0)
        dependents = np.flatnonzero(wanted)
        dependents = dependents[(dependents >= begin - first) & (dependents < stop - first)]
        governors = dependents + heads[dependents]
        if len(governors) and not 0 <= governors.min() <= governors.max() < len(types):
            raise StoreDamagedError(f"{store.path}: block {head.number} holds heads outside their documents")
        terms = apply_layer(layer, types)
        yield Dependents(first, terms, governors, dependents, relations[dependents].astype(np.int64))
