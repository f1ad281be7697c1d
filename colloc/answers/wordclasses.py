"""Rows apart by word class, where the layer tells it: ``upos``, or a layer joined with it such as ``lemma/upos``."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from colloc.answers.tables import PairTable
from colloc.errors import UsageError
from colloc.store import vocabulary
from colloc.store.connection import Store

Classes = dict[str, np.ndarray]
"""For each word class asked for, which terms are of it."""


def word_classes(store: Store, layer: str, upos: Sequence[str]) -> Classes:
    """Which terms of a layer are of the word classes asked for.

    Raises
    ------
    UsageError
        The layer does not tell word classes, or has none of this name.
    """
    if not upos:
        return {}
    parts = layer.split("/")
    if "upos" not in parts:
        raise UsageError(
            f"layer {layer!r} does not tell word classes: use one that does, such as lemma/upos, on annotated text"
        )
    place = parts.index("upos")
    texts = vocabulary.term_texts(store, layer)
    # a form may hold a slash, the word class none: count from its own end
    from_end = len(parts) - place
    found = [text.rsplit("/", len(parts) - 1)[-from_end] if len(parts) > 1 else text for text in texts]
    own = np.array(found, dtype=object)
    classes = {name: own == name for name in dict.fromkeys(upos)}
    missing = [name for name, mask in classes.items() if not np.any(mask)]
    if missing:
        raise UsageError(f"layer {layer!r} has no word class {missing[0]!r}, only {', '.join(sorted(set(found)))}")
    return classes


def in_classes(rows: PairTable, classes: Classes) -> Iterator[tuple[str | None, PairTable]]:
    """The rows whose second word is of each class; all of them, without a name, where no class was asked for."""
    if not classes:
        yield None, rows
    for name, mask in classes.items():
        yield name, rows.take(mask[rows.second])
