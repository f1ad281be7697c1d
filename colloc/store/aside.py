"""A store beside the store: for tables that are counted where the store itself cannot be written."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager

from colloc.store.connection import Store
from colloc.store.opening import create
from colloc.store.scratch import place_for_readers, scratch_folder
from colloc.store.vocabulary import term_count


@contextmanager
def store_aside(store: Store, layer: str, temp: str | os.PathLike[str] | None = None) -> Iterator[Store]:
    """An empty store, open for writing, that knows how many terms a layer of ``store`` has; gone afterwards.

    Parameters
    ----------
    temp : path, optional
        Where it is made; when None, beside the store, or in the system's folder for temporary files where the
        store's own folder cannot be written.
    """
    place = place_for_readers(store.path, temp)
    with scratch_folder(store.path, place) as folder, create(folder / store.path.name, {}, "count aside") as aside:
        with aside.transaction():
            terms = term_count(store, layer)
            aside.execute(
                "INSERT INTO layers (name, terms, types, same) VALUES (?, ?, 0, 0) "
                "ON CONFLICT (name) DO UPDATE SET terms = excluded.terms",
                (layer, terms),
            )
        yield aside


@contextmanager
def stream_aside(store: Store, layer: str, temp: str | os.PathLike[str] | None = None) -> Iterator[Store]:
    """An empty store, open for writing, for another stream of a layer's terms: they are its types; gone afterwards.

    Parameters
    ----------
    temp : path, optional
        As for `store_aside`.
    """
    with store_aside(store, layer, temp) as aside:
        with aside.transaction():
            terms = term_count(store, layer)
            aside.execute("UPDATE layers SET terms = ?, types = ? WHERE name = 'form'", (terms, terms))
        yield aside
