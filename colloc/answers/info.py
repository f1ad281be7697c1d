"""What is inside a store."""

from __future__ import annotations

import json
from typing import Any

from colloc.answers.columns import Columns
from colloc.answers.questions import built_margins, built_spec
from colloc.counts.words import slice_word_counts
from colloc.errors import UsageError
from colloc.settings import told_spec
from colloc.store import documents, facts, slices, tallies, vocabulary
from colloc.store.connection import Store
from colloc.store.inputs.sources import source_list


def describe(store: Store) -> dict[str, Any]:
    """Sizes, settings, sources and tallies, as plain values.

    Returns
    -------
    dict
        documents, tokens, sentences, types, layers (name -> terms), text kept or
        not, settings, sources, metadata keys, tallies.
    """
    spec = built_spec(store)
    counts = slice_word_counts(store, spec.layer, "")
    return {
        "store": str(store.path),
        "bytes": store.path.stat().st_size,
        "state": facts.get(store, "state"),
        "documents": documents.document_count(store),
        "tokens": int(counts.tokens.sum()),
        "sentences": int(facts.get(store, "sentences", "0")),
        "types": vocabulary.type_count(store),
        "layers": {name: vocabulary.term_count(store, name) for name in vocabulary.layer_names(store)},
        "text": "kept" if facts.get(store, "keep_text", "1") == "1" else "not kept",
        "metadata": slices.metadata_keys(store),
        "settings": {
            "read": json.loads(facts.get(store, "read_settings")),
            "segment": json.loads(facts.get(store, "segment_settings")),
            "tally": told_spec(spec),
            "margins": built_margins(store),
        },
        "versions": json.loads(facts.get(store, "versions")),
        "left_out": {
            "overlong_tokens": int(facts.get(store, "dropped_tokens", "0")),
            "undecodable_bytes": int(facts.get(store, "replaced_bytes", "0")),
            "repeated_documents": int(facts.get(store, "repeated_documents", "0")),
            "repeated_paragraphs": int(facts.get(store, "repeated_paragraphs", "0")),
        },
        "sources": [
            {
                "name": source.info.name,
                "bytes": source.info.size,
                "digest": source.digest,
                "documents": source.records,
                "finished": source.finished,
                **({"detected_encoding": source.encoding} if source.encoding is not None else {}),
            }
            for source in source_list(store)
        ],
        "tallies": [
            {**told_spec(entry.spec), "kept": entry.kept, "bytes": entry.n_bytes} for entry in tallies.tally_list(store)
        ],
    }


def by_key(store: Store, key: str) -> Columns:
    """Documents, tokens and types for each value of a metadata key.

    Raises
    ------
    UsageError
        When no document has the key; the message lists those that are there.
    """
    values = slices.values_of(store, key)
    if not values:
        known = ", ".join(slices.metadata_keys(store)) or "none"
        raise UsageError(f"{store.path}: no document has the key {key!r}; keys: {known}")
    layer = built_spec(store).layer
    rows = []
    for value, n_documents in values.items():
        counts = slice_word_counts(store, layer, slices.canonical([f"{key}={slices.quoted(value)}"]))
        rows.append((value, n_documents, int(counts.tokens.sum()), int((counts.tokens > 0).sum())))
    return Columns(
        {
            key: [str(row[0]) for row in rows],
            "documents": [row[1] for row in rows],
            "tokens": [row[2] for row in rows],
            "types": [row[3] for row in rows],
        },
        {"store": str(store.path), "by": key, "layer": layer},
    )
