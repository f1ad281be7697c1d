"""Types: numbered in order of first appearance, and carried on into every layer."""

from __future__ import annotations

from collections.abc import Sequence
from typing import cast

from colloc.errors import DataError
from colloc.records import UInt32Array
from colloc.store.connection import Store
from colloc.store.database import schema
from colloc.store.lexicon.frequencies import append_word_counts, has_word_counts, word_counts
from colloc.store.lexicon.layers import (
    LayerWriter,
    TypeKey,
    as_columns,
    detach_forms,
    ensure_layer,
    find_layer,
    layer_map,
    layer_names,
    number_texts,
    require_terms,
    rows_among,
    term_count,
    type_keys,
)
from colloc.store.lexicon.terms import brought_to, term_numbers, term_texts, terms_matching, terms_of_shape

__all__ = [
    "TypeKey",
    "TypeRegistry",
    "append_word_counts",
    "brought_to",
    "ensure_annotated_layers",
    "ensure_layer",
    "has_word_counts",
    "index_words",
    "layer_map",
    "layer_names",
    "require_terms",
    "term_count",
    "term_numbers",
    "term_texts",
    "terms_matching",
    "terms_of_shape",
    "type_count",
    "type_keys",
    "word_counts",
]

_LARGEST = 2**31 - 1
"""Type numbers stay below this, so that a pair key has room for a direction."""


def type_count(store: Store) -> int:
    """How many types the store has."""
    return find_layer(store, "form").types


def index_words(store: Store) -> None:
    """Make the indexes by which words are found, where they are not there yet: at the end of a first build."""
    for statement in schema.VOCABULARY_INDEXES:
        store.execute(statement)


def ensure_annotated_layers(store: Store) -> None:
    """Make the layers that annotation gives: ``lemma``, ``upos`` and ``lemma/upos``, as far as words carry them."""
    if find_layer(store, "form").same:
        return  # plain text only
    there = [column for column in ("lemma", "upos") if store.value(f"SELECT 1 FROM types WHERE {column} != '' LIMIT 1")]
    for name in [*there, "lemma/upos"] if len(there) == 2 else there:
        ensure_layer(store, name)


class TypeRegistry:
    """Looks types up and adds those that are new, in the order given.

    Must be used inside a transaction. The first ``limit`` types met are
    remembered (the first are the frequent ones), the others looked up in the
    store, so memory is bounded.

    Parameters
    ----------
    limit : int
        Types, and terms of each layer, to remember; about 150 bytes each.
    """

    def __init__(self, store: Store, limit: int = 2_000_000) -> None:
        self._store = store
        self._limit = limit
        self._known: dict[TypeKey, int] = {}
        self._count = type_count(store)
        self._complete = self._count == 0
        self._layers: dict[str, LayerWriter] = {}

    def __len__(self) -> int:
        """How many types the store has."""
        return self._count

    def number(self, keys: Sequence[TypeKey]) -> UInt32Array:
        """Type numbers of ``keys``, in their order: uint32 array, shape (len(keys),).

        A key is a form, or (form, lemma, upos); ``(form, "", "")`` is the same as the form.
        DataError where a word holds half a surrogate pair.
        """
        try:
            return self._numbers(keys)
        except UnicodeEncodeError as error:
            raise DataError(f"a word holds half a surrogate pair, which is no character: {error.object!a}") from error

    def _numbers(self, keys: Sequence[TypeKey]) -> UInt32Array:
        annotated = {*map(type, keys)} - {str}
        if annotated:
            keys = [key[0] if isinstance(key, tuple) and not key[1] and not key[2] else key for key in keys]
        known = self._known
        if not self._complete:
            if len(known) > 2 * self._limit:
                known.clear()
            self._look_up({key for key in keys if key not in known})
        found = number_texts(keys, known, self._count, self._limit)
        if found.fresh:
            self._add(found.fresh, bool(annotated))
            self._complete &= found.remembered
        return found.numbers

    def _add(self, keys: list[TypeKey], annotated: bool) -> None:
        first, stop = self._count, self._count + len(keys)
        if stop > _LARGEST:
            raise DataError(
                f"{self._store.path}: more than {_LARGEST} distinct words; split the text into several stores"
            )
        if annotated:
            columns = as_columns([key if isinstance(key, tuple) else (key, "", "") for key in keys])
        else:
            columns = cast(list[str], keys), [""] * len(keys), [""] * len(keys)
        self._store.insert_columns("types", [range(first, stop), *columns])
        self._count = stop
        for writer in self._writers(annotated):
            writer.extend(columns)

    def _writers(self, annotated: bool) -> list[LayerWriter]:
        for name in layer_names(self._store):
            if name not in self._layers:
                self._layers[name] = LayerWriter(self._store, find_layer(self._store, name), self._limit)
        forms = self._layers["form"].layer
        if annotated and forms.same:
            self._layers["form"] = detach_forms(self._store, forms, self._limit)
        return list(self._layers.values())

    def _look_up(self, keys: set[TypeKey]) -> None:
        """Learn the numbers of types that are in the store already, for this batch."""
        if keys:
            index_words(self._store)  # without the index each look-up would read the whole table
        self._known.update(
            rows_among(
                self._store,
                "SELECT form, id FROM types WHERE lemma = '' AND upos = '' AND form IN",
                (),
                [key for key in keys if isinstance(key, str)],
            )
        )
        for key in keys:
            if isinstance(key, tuple):
                row = self._store.row("SELECT id FROM types WHERE form = ? AND lemma = ? AND upos = ?", key)
                if row is not None:
                    self._known[key] = row[0]
