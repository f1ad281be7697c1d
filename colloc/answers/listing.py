"""What a store keeps, row by row: its documents and its tables."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import islice

import numpy as np

from colloc.answers.columns import Columns
from colloc.records import DocumentRow
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
        layer, kind, left, right, inside, where, relation, pairs (distinct), total.
    """
    entries = tallies.tally_list(store)
    found = [tally for entry in entries if (tally := tallies.find(store, entry.spec)) is not None]
    text = {
        name: np.array([getattr(tally.spec, name) for tally in found], dtype=object)
        for name in ("layer", "kind", "inside", "where", "relation")
    }
    numbers = {
        "left": [tally.spec.left for tally in found],
        "right": [tally.spec.right for tally in found],
        "pairs": [tally.n_pairs for tally in found],
        "total": [tally.total for tally in found],
    }
    columns = {**text, **{name: np.array(values, dtype=np.int64) for name, values in numbers.items()}}
    order = ("layer", "kind", "left", "right", "inside", "where", "relation", "pairs", "total")
    return Columns({name: columns[name] for name in order}, {"store": str(store.path)})
