"""Settings and state of a store as key -> text."""

from __future__ import annotations

from enum import Enum
from typing import overload

from colloc.errors import StoreDamagedError
from colloc.store.connection import Store

GENERATION = "generation"


class _Required(Enum):
    REQUIRED = 0


@overload
def get(store: Store, key: str) -> str: ...
@overload
def get(store: Store, key: str, default: str) -> str: ...
@overload
def get(store: Store, key: str, default: None) -> str | None: ...
def get(store: Store, key: str, default: str | _Required | None = _Required.REQUIRED) -> str | None:
    """The text kept under ``key``; where there is none, ``default``, or StoreDamagedError if none was given."""
    value = store.value("SELECT value FROM facts WHERE key = ?", (key,))
    if value is not None:
        return str(value)
    if isinstance(default, _Required):
        raise StoreDamagedError(f"{store.path}: does not say its {key!r}; build the store again")
    return default


def put(store: Store, key: str, value: str) -> None:
    """Keep a text under ``key``, instead of what was there."""
    store.execute("INSERT OR REPLACE INTO facts VALUES (?, ?)", (key, value))


def remove(store: Store, key: str) -> None:
    """Keep nothing under ``key``."""
    store.execute("DELETE FROM facts WHERE key = ?", (key,))


def every(store: Store) -> dict[str, str]:
    """All facts, by key."""
    return dict(store.rows("SELECT key, value FROM facts ORDER BY key"))


def generation(store: Store) -> int:
    """How often the documents have changed: 0 for a new store."""
    return int(get(store, GENERATION, "0"))


def next_generation(store: Store) -> int:
    """Count one change of documents; returns the new number."""
    number = generation(store) + 1
    put(store, GENERATION, str(number))
    return number
