"""Layers: what a type is called once case, lemma or word class decides.

A layer is a function of (form, lemma, upos); its map type -> term is kept as
packed parts of 65,536 types and applied with one ``take``. Terms are numbered
in order of first appearance. While a store holds plain text only, the layer
``form`` is the identity and keeps neither map nor texts of its own.
"""

from __future__ import annotations

import operator
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from itertools import compress, count, islice, repeat
from typing import Generic, TypeVar

import numpy as np
from numpy.typing import NDArray

from colloc.errors import StoreDamagedError, UsageError
from colloc.records import NO_TERM, UInt32Array
from colloc.store.connection import Store
from colloc.store.database import packing
from colloc.store.lexicon.forms import Forms, store_forms

TypeKey = str | tuple[str, str, str]
"""A form, or (form, lemma, upos); texts are NFC already."""

Key = TypeVar("Key", str, TypeKey)

PART = 65_536
_BATCH = 65_536
_TEXTS_AT_ONCE = 500
"""Parameters of one statement; some builds of SQLite take no more than 999."""

Columns = tuple[Sequence[str], Sequence[str], Sequence[str]]
"""Forms, lemmas and word classes of a stretch of types."""

_COMPONENTS: dict[str, Callable[[Columns, Forms], list[str]]] = {
    "form": lambda columns, forms: list(columns[0]),
    "fold": lambda columns, forms: forms.folded(columns[0]),
    "lemma": lambda columns, forms: forms.lemmas(columns[0], columns[1]),
    "lemma_fold": lambda columns, forms: forms.folded(forms.lemmas(columns[0], columns[1])),
    "upos": lambda columns, forms: list(columns[2]),
}


@dataclass(slots=True)
class Layer:
    """One row of ``layers``."""

    number: int
    name: str
    terms: int
    types: int
    same: bool


def layer_function(name: str, forms: Forms) -> Callable[[Columns], list[str]]:
    """What a layer calls types; empty where a type has no such thing.

    Parameters
    ----------
    name : str
        ``form``, ``fold``, ``lemma``, ``lemma_fold``, ``upos``, or several of
        them joined by ``/``, as in ``lemma/upos``.
    forms : Forms
        How the store folds, and where it has lemmas from.
    """
    parts = name.split("/")
    unknown = [part for part in parts if part not in _COMPONENTS]
    if unknown or len(set(parts)) != len(parts):
        raise UsageError(
            f"no layer {name!r}: a layer is one of {', '.join(_COMPONENTS)}, or several joined by / (lemma/upos)"
        )
    functions = [_COMPONENTS[part] for part in parts]
    if len(functions) == 1:
        return lambda columns: functions[0](columns, forms)

    def joined(columns: Columns) -> list[str]:
        parts = zip(*(function(columns, forms) for function in functions), strict=True)
        return ["/".join(texts) if all(texts) else "" for texts in parts]

    return joined


def layer_names(store: Store) -> list[str]:
    """Layers of the store, in the order in which they were made."""
    return [row[0] for row in store.rows("SELECT name FROM layers ORDER BY id")]


def find_layer(store: Store, name: str) -> Layer:
    """The layer's row; UsageError where the store does not have it."""
    row = store.row("SELECT id, name, terms, types, same FROM layers WHERE name = ?", (name,))
    if row is None:
        layer_function(name, store_forms(store))
        raise UsageError(f"{store.path}: has no layer {name!r} yet, only {', '.join(layer_names(store))}")
    return Layer(row[0], row[1], row[2], row[3], bool(row[4]))


def term_count(store: Store, layer: str) -> int:
    """How many terms a layer has."""
    return find_layer(store, layer).terms


def layer_map(store: Store, name: str) -> UInt32Array:
    """Term of each type: uint32 array, shape (number of types,); NO_TERM where a type is not in the layer."""
    layer = find_layer(store, name)
    if layer.same:
        return np.arange(layer.types, dtype=np.uint32)
    parts = [_read_part(store, layer, part) for part in range(-(-layer.types // PART))]
    terms = np.concatenate([np.empty(0, dtype=np.uint32), *parts])
    if len(terms) != layer.types or (terms[terms != NO_TERM] >= layer.terms).any():
        raise StoreDamagedError(f"{store.path}: the map of layer {name} does not fit its types and terms")
    return terms


def _read_part(store: Store, layer: Layer, part: int) -> UInt32Array:
    data = store.value("SELECT data FROM layer_maps WHERE layer = ? AND part = ?", (layer.number, part))
    return packing.unpack_as(data, np.uint32, f"{store.path}: map of layer {layer.name}, part {part}")


@dataclass(frozen=True, slots=True)
class Numbered(Generic[Key]):
    """Texts with numbers.

    Attributes
    ----------
    numbers : uint32 array
        One a text; NO_TERM for the empty text.
    fresh : list
        Those that were new, in order of appearance: the numbers after the last one.
    remembered : bool
        Whether all of them are among the known ones from now on.
    """

    numbers: UInt32Array
    fresh: list[Key]
    remembered: bool


def number_texts(texts: Sequence[Key], known: dict[Key, int], first: int, limit: int) -> Numbered[Key]:
    """Number texts as they are known, new ones from ``first`` on; these become known as far as ``limit`` allows."""
    if "" in texts or len(known) + len(texts) > limit:
        return _number_some(texts, known, first, limit)
    # One look at the dictionary for each text. A new one gets `first` and its place in the list: in order, with gaps.
    raw = np.fromiter(map(known.setdefault, texts, count(first)), np.int64, len(texts))
    new: NDArray[np.bool_] = raw == np.arange(first, first + len(texts))
    fresh: list[Key] = list(compress(texts, new.tolist()))
    if len(fresh) == len(texts):
        return Numbered(raw.astype(np.uint32), fresh, True)
    places = np.flatnonzero(new)
    recent = raw >= first
    raw[recent] = first + np.searchsorted(places, raw[recent] - first)
    known.update(zip(fresh, range(first, first + len(fresh)), strict=True))
    return Numbered(raw.astype(np.uint32), fresh, True)


def _number_some(texts: Sequence[Key], known: dict[Key, int], first: int, limit: int) -> Numbered[Key]:
    """`number_texts` where not all can be remembered, or a text is empty."""
    numbers = [*map(known.get, texts)]
    unknown = dict.fromkeys(compress(texts, map(operator.is_, numbers, repeat(None))))
    empty = "" in unknown
    if empty:
        del unknown[""]
    added: dict[Key, int] = dict(zip(unknown, range(first, first + len(unknown)), strict=True))
    given = added | {"": int(NO_TERM)} if empty else added
    found = np.fromiter(map(given.get, texts, numbers), dtype=np.uint32, count=len(texts))
    room = max(limit - len(known), 0)
    known.update(added if len(added) <= room else islice(added.items(), room))
    return Numbered(found, list(added), len(added) <= room)


class LayerWriter:
    """Extends one layer as types are added.

    Parameters
    ----------
    limit : int
        How many texts are remembered; the others are looked up in the store.
    """

    def __init__(self, store: Store, layer: Layer, limit: int) -> None:
        self._store = store
        self._limit = limit
        self._known: dict[str, int] = {}
        self._complete = layer.terms == 0
        self._function = layer_function(layer.name, store_forms(store))
        self.layer = layer

    def extend(self, columns: Columns) -> None:
        """Map new types, which follow the last one mapped."""
        layer = self.layer
        if layer.same:
            layer.types += len(columns[0])
            layer.terms = layer.types
        else:
            self._append_map(self._numbers(self._function(columns)))
            layer.types += len(columns[0])
        self._store.execute(
            "UPDATE layers SET terms = ?, types = ?, same = ? WHERE id = ?",
            (layer.terms, layer.types, layer.same, layer.number),
        )

    def _numbers(self, texts: list[str]) -> UInt32Array:
        known = self._known
        if not self._complete:
            if len(known) > 2 * self._limit:
                known.clear()
            wanted = {text for text in texts if text and text not in known}
            known.update(look_up_terms(self._store, self.layer.number, wanted))
        first = self.layer.terms
        found = number_texts(texts, known, first, self._limit)
        fresh = found.fresh
        self._store.insert_columns("terms", [[self.layer.number] * len(fresh), range(first, first + len(fresh)), fresh])
        self.layer.terms += len(fresh)
        self._complete &= found.remembered
        return found.numbers

    def _append_map(self, terms: UInt32Array) -> None:
        part, filled = divmod(self.layer.types, PART)
        if filled:
            terms = np.concatenate([_read_part(self._store, self.layer, part), terms])
        for start in range(0, len(terms), PART):
            self._store.execute(
                "INSERT OR REPLACE INTO layer_maps VALUES (?, ?, ?)",
                (self.layer.number, part + start // PART, packing.pack(terms[start : start + PART])),
            )


def look_up_terms(store: Store, layer: int, texts: set[str]) -> dict[str, int]:
    """Numbers of those texts that are terms of a layer which keeps its own texts."""
    return dict(rows_among(store, "SELECT text, id FROM terms WHERE layer = ? AND text IN", (layer,), list(texts)))


def rows_among(store: Store, sql: str, parameters: Sequence[int], texts: list[str]) -> Iterator[tuple[str, int]]:
    """Rows of a query that ends in ``IN`` and lacks its list: many texts at a time, which takes a third of the time."""
    # In the order of the index, so that neighbours are found on the same page.
    texts.sort()
    for start in range(0, len(texts), _TEXTS_AT_ONCE):
        some = texts[start : start + _TEXTS_AT_ONCE]
        yield from store.rows(f"{sql} ({', '.join('?' * len(some))})", (*parameters, *some))


def type_keys(store: Store, first: int, stop: int) -> list[tuple[str, str, str]]:
    """(form, lemma, upos) of the types numbered first..stop-1, as far as there are any."""
    stop = min(stop, find_layer(store, "form").types)
    rows = store.rows("SELECT form, lemma, upos FROM types WHERE id >= ? AND id < ? ORDER BY id", (first, stop))
    if len(rows) != max(stop - first, 0):
        raise StoreDamagedError(f"{store.path}: types {first} to {stop - 1} are not all there")
    return rows


def as_columns(keys: Sequence[tuple[str, str, str]]) -> Columns:
    """Forms, lemmas and word classes of some types."""
    forms, lemmas, classes = zip(*keys, strict=True) if keys else ((), (), ())
    return forms, lemmas, classes


def ensure_layer(store: Store, name: str, limit: int = 2_000_000) -> None:
    """Make a layer where it is not there yet, and keep it from now on.

    Raises
    ------
    UsageError
        No such layer, or no type of the store has what it needs.
    """
    layer_function(name, store_forms(store))
    if name in layer_names(store):
        return
    types = find_layer(store, "form").types
    with store.transaction():
        store.execute("INSERT INTO layers (name, terms, types, same) VALUES (?, 0, 0, 0)", (name,))
        writer = LayerWriter(store, find_layer(store, name), limit)
        for first in range(0, types, _BATCH):
            writer.extend(as_columns(type_keys(store, first, first + _BATCH)))
        require_terms(store, name)


def require_terms(store: Store, name: str) -> None:
    """Raise UsageError where the store has types, but none of them is in the layer."""
    layer = find_layer(store, name)
    if layer.types and not layer.terms:
        raise UsageError(
            f"{store.path}: its words carry nothing for the layer {name!r}; build it from annotated text"
            + (", or with --lemma" if "lemma" in name else "")
        )


def detach_forms(store: Store, layer: Layer, limit: int) -> LayerWriter:
    """Give the layer ``form`` a map and texts of its own, as annotated types arrive."""
    types, layer.terms, layer.types, layer.same = layer.types, 0, 0, False
    writer = LayerWriter(store, layer, limit)
    for first in range(0, types, _BATCH):
        writer.extend(as_columns(type_keys(store, first, first + _BATCH)))
    return writer
