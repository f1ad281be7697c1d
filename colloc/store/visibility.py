"""How far the documents are counted: what readers see, and what an interrupted change left behind.

Documents are committed as they are read, and counted afterwards in one
transaction that also moves this mark. Until then readers see the state before.
"""

from __future__ import annotations

import json

import numpy as np

from colloc.records import Int64Array
from colloc.store import documents, facts, stream, texts, vocabulary
from colloc.store.connection import Store
from colloc.store.inputs import sources

MARK = "counted"
TOTALS = ("sentences", "dropped_tokens", "replaced_bytes", "repeated_documents", "repeated_paragraphs")
"""Facts that grow while documents are read."""


def uncounted(store: Store) -> Int64Array:
    """Numbers of the documents behind the mark, ascending."""
    rows = store.rows("SELECT id FROM documents WHERE id >= ? ORDER BY id", (documents.visible_end(store),))
    return np.array([number for (number,) in rows], dtype=np.int64)


def show_all(store: Store) -> None:
    """Move the mark behind everything that is in the store, inside the caller's transaction."""
    mark = {
        "documents": documents.next_document(store),
        "blocks": stream.block_count(store),
        "sources": len(sources.source_list(store)),
        "characters": texts.next_character(store),
        "totals": {key: facts.get(store, key, "0") for key in TOTALS},
    }
    facts.put(store, MARK, json.dumps(mark))
    facts.next_generation(store)
    vocabulary.index_words(store)


def drop_uncounted(store: Store) -> None:
    """Take everything behind the mark out again, inside the caller's transaction.

    Types that it brought stay, with a frequency of zero.
    """
    mark = json.loads(facts.get(store, MARK, "{}"))
    first = mark.get("documents", 0)
    store.execute("DELETE FROM documents WHERE id >= ?", (first,))
    # Their numbers were never seen by anyone, so they are given again and the result is that of an undisturbed run.
    store.execute("UPDATE sqlite_sequence SET seq = ? WHERE name = 'documents'", (first - 1,))
    store.execute("DELETE FROM content_hashes WHERE document >= ?", (first,))
    store.execute("DELETE FROM blocks WHERE id >= ?", (mark.get("blocks", 0),))
    store.execute("DELETE FROM block_columns WHERE block >= ?", (mark.get("blocks", 0),))
    store.execute("DELETE FROM annotation_rests WHERE block >= ?", (mark.get("blocks", 0),))
    store.execute("DELETE FROM text_blocks WHERE first_character >= ?", (mark.get("characters", 0),))
    store.execute("DELETE FROM sources WHERE id >= ?", (mark.get("sources", 0),))
    sources.forget_encodings(store)
    for key, value in mark.get("totals", {}).items():
        facts.put(store, key, value)
