"""What a store keeps, row by row: its documents and its tables."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from itertools import islice
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.answers.columns import Columns
from colloc.records import DocumentRow, Int64Array
from colloc.settings import told_reach
from colloc.store import documents, slices, tallies
from colloc.store.opening import Store

ROWS_A_PART = 1 << 14
OWN_COLUMNS = ("document", "tokens", "characters")


def document_rows(store: Store) -> Iterator[Columns]:
    """Documents by number, at most ``ROWS_A_PART`` at a time; an empty store gives one empty part.

    Returns
    -------
    iterator of Columns
        document (identifier), tokens, characters, then every metadata key as text; a
        key with the name of one of the first three has ``meta_`` before it.
    """
    keys = list(slices.metadata_keys(store))
    rows = iter(documents.iterate_documents(store))
    part = list(islice(rows, ROWS_A_PART))
    while True:
        yield _as_columns(part, keys, store)
        part = list(islice(rows, ROWS_A_PART))
        if not part:
            return


def _as_columns(rows: list[DocumentRow], keys: list[str], store: Store) -> Columns:
    metadata = {
        f"meta_{key}" if key in OWN_COLUMNS else key: np.array(
            [None if (value := row.metadata.get(key)) is None else str(value) for row in rows], dtype=object
        )
        for key in keys
    }
    return Columns(
        {
            "document": np.array([row.identifier for row in rows], dtype=object),
            "tokens": np.array([row.n_tokens for row in rows], dtype=np.int64),
            "characters": np.array([row.n_characters for row in rows], dtype=np.int64),
            **metadata,
        },
        {"store": str(store.path)},
    )


def kept_tallies(store: Store) -> Columns:
    """The tables a store keeps.

    Returns
    -------
    Columns
        layer, kind, window (the reach on both sides) or left and right where they differ, inside, where, relation,
        asked_for (by the build or
        ``colloc tally``; else a cache that makes room when needed), pairs (distinct), total, bytes.
    """
    entries = tallies.tally_list(store)
    counted = [tally for entry in entries if (tally := tallies.find(store, entry.spec)) is not None]

    def text(name: str) -> NDArray[Any]:
        return np.array([getattr(entry.spec, name) for entry in entries], dtype=object)

    reaches = [told_reach(entry.spec.kind, entry.spec.left, entry.spec.right) for entry in entries]

    def reach(name: str) -> NDArray[Any]:
        return np.array([told.get(name) for told in reaches], dtype=object)

    def numbers(values: Iterable[int]) -> Int64Array:
        return np.array(list(values), dtype=np.int64)

    return Columns(
        {
            "layer": text("layer"),
            "kind": text("kind"),
            "window": reach("window"),
            "left": reach("left"),
            "right": reach("right"),
            "inside": text("inside"),
            "where": text("where"),
            "relation": text("relation"),
            "asked_for": np.array([entry.kept for entry in entries], dtype=bool),
            "pairs": numbers(tally.n_pairs for tally in counted),
            "total": numbers(tally.total for tally in counted),
            "bytes": numbers(entry.n_bytes for entry in entries),
        },
        {"store": str(store.path)},
    )
