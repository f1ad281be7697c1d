"""Stores built apart into one: types renumbered, documents and text carried over, counts added."""

from __future__ import annotations

import json
import time
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from colloc.build.annotating import narrow
from colloc.build.building import BuildReport, report, resources
from colloc.build.changing import require_complete
from colloc.build.counting import count_new_documents
from colloc.build.differing import differences
from colloc.build.reading import Progress, Read, registry_limit
from colloc.errors import CollocError, UsageError
from colloc.records import NO_TERM, Anchors, UInt32Array
from colloc.settings import DEFAULT_MEMORY
from colloc.store import annotation, decisions, documents, facts, stream, texts, visibility, vocabulary
from colloc.store.connection import Store
from colloc.store.inputs.sources import copy_source, source_list
from colloc.store.opening import open_for_reading, open_for_writing
from colloc.store.vocabulary import TypeRegistry

_MUST_AGREE = ("segment_settings", "keep_text")


def merge(
    path: str | Path,
    others: Sequence[str | Path],
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: Progress | None = None,
) -> BuildReport:
    """Join the documents and counts of ``others`` into the store at ``path``.

    The result is what one build over all documents, in this order, would be. A
    merge that fails or is killed leaves the store as it was for readers; running
    it again starts it anew.

    Raises
    ------
    UsageError
        When the stores were segmented differently, or are the same file.
    DataError
        When both hold a document of the same identifier.
    """
    began = time.perf_counter()
    limits = resources(jobs, memory, temp)
    with open_for_writing(Path(path), "merge") as store:
        pending = json.dumps([str(other) for other in others])
        if facts.get(store, "state") != "merging" or facts.get(store, "pending_inputs") != pending:
            require_complete(store)
        with store.transaction():
            visibility.drop_uncounted(store)
            facts.put(store, "state", "merging")
            facts.put(store, "pending_inputs", pending)
        before = documents.document_count(store)
        try:
            for other in others:
                with open_for_reading(Path(other)) as source:
                    _check(store, source)
                    _copy(store, source, registry_limit(limits.memory))
            count_new_documents(store, limits, progress)
        except CollocError:
            with store.transaction():
                visibility.drop_uncounted(store)
                facts.put(store, "state", "complete")
            raise
        with store.transaction():
            facts.put(store, "state", "complete")
        store.make_durable()
        return report(store, Read(documents.document_count(store) - before, 0, 0, 0, 0, 0), began)


def _check(store: Store, other: Store) -> None:
    if store.path.samefile(other.path):
        raise UsageError(f"{other.path} cannot be merged into itself")
    if facts.get(other, "state") != "complete":
        raise UsageError(f"{other.path} is not complete: finish its build or change first")
    one, two = ({key: facts.get(opened, key) for key in _MUST_AGREE} for opened in (store, other))
    differs = differences(one, two, says="{option} is {kept} there and {wanted} here")
    if differs:
        raise UsageError(
            f"{other.path} cannot be merged into {store.path}: {'; '.join(differs)}; build them alike to merge them"
        )


def _copy(store: Store, other: Store, limit: int) -> None:
    """Append everything of ``other``, in one transaction: documents never stand there without their words and text."""
    with store.transaction():
        _append_all(store, other, limit)


def _append_all(store: Store, other: Store, limit: int) -> None:
    registry = TypeRegistry(store, limit=limit)
    token_shift = stream.token_count(store)
    character_shift = texts.next_character(store)
    sources: dict[int, int] = {}
    for source in source_list(other):
        sources[source.number] = copy_source(store, source)
    numbers: dict[int, int] = {}
    next_number = documents.next_document(store)
    rows = []
    for row in documents.iterate_documents(other):
        numbers[row.number] = next_number
        rows.append(
            replace(
                row,
                number=next_number,
                source=sources[row.source],
                first_token=row.first_token + token_shift,
                first_character=row.first_character + character_shift,
            )
        )
        next_number += 1
    documents.append_documents(store, rows)
    mapping = _type_map(store, other, registry)
    values = {
        name: annotation.number_values(store, name, annotation.values_of(other, name)) for name in annotation.VALUED
    }
    for head in stream.block_heads(other):
        _copy_block(store, other, head.number, mapping, values, numbers, character_shift)
    texts.append_packed(store, character_shift, list(texts.packed_blocks(other)))
    # A merge that begins again finds those that it has copied already, and leaves them out.
    decisions.append(store, (decision for _, decision in decisions.iterate(other)))


_TYPES_AT_ONCE = 65_536


def _type_map(store: Store, other: Store, registry: TypeRegistry) -> UInt32Array:
    """Type number in ``other`` -> type number in ``store``, new types in the order of ``other``."""
    parts = [np.zeros(0, dtype=np.uint32)]
    for start in range(0, vocabulary.type_count(other), _TYPES_AT_ONCE):
        keys = vocabulary.type_keys(other, start, start + _TYPES_AT_ONCE)
        parts.append(registry.number(keys))
    return np.concatenate(parts)


def _copy_block(
    store: Store,
    other: Store,
    number: int,
    mapping: UInt32Array,
    values: dict[str, UInt32Array],
    numbers: dict[int, int],
    character_shift: int,
) -> None:
    block = stream.read_block(other, number)
    tokens = np.full(len(block.tokens), NO_TERM, dtype=np.uint32)
    there = block.tokens != NO_TERM
    tokens[there] = mapping[block.tokens[there]]
    next_block = stream.block_count(store)
    copied = replace(
        block,
        number=next_block,
        first_token=stream.token_count(store),
        tokens=tokens,
        document_numbers=np.array([numbers.get(int(old), -1) for old in block.document_numbers], dtype=np.int64),
        anchors=Anchors(block.anchors.tokens, block.anchors.characters + character_shift),
    )
    stream.append_block(store, copied, np.sort(mapping[stream.block_types(other, number)]))
    for name in stream.column_names(other, number):
        column = stream.read_column(other, number, name)
        if name in values:
            column = narrow(values[name][column])
        stream.append_column(store, next_block, name, column)
    annotation.copy_rests(store, other, number, next_block, numbers)
