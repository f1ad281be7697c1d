"""Rows apart by word class, where the layer tells it: ``upos``, or a layer joined with it such as ``lemma/upos``."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from colloc.answers.tables import PairTable
from colloc.answers.tagpatterns import compile_pattern
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
    found = classes_of_terms(store, layer)
    own = np.array(found, dtype=object)
    classes = {name: own == name for name in dict.fromkeys(upos)}
    missing = [name for name, mask in classes.items() if not np.any(mask)]
    if missing:
        raise UsageError(f"layer {layer!r} has no word class {missing[0]!r}, only {', '.join(sorted(set(found)))}")
    return classes


def classes_of_terms(store: Store, layer: str) -> list[str]:
    """The word class of each term of a layer.

    Raises
    ------
    UsageError
        The layer does not tell word classes.
    """
    parts = layer.split("/")
    if "upos" not in parts:
        raise UsageError(
            f"layer {layer!r} does not tell word classes: use one that does, such as lemma/upos, on annotated text"
        )
    texts = vocabulary.term_texts(store, layer)
    # a form may hold a slash, the word class none: count from its own end
    from_end = len(parts) - parts.index("upos")
    return [text.rsplit("/", len(parts) - 1)[-from_end] if len(parts) > 1 else text for text in texts]


class TwoWords:
    """Rows whose two words follow each other in a pattern of word classes.

    Parameters
    ----------
    pattern : str
        See `colloc.answers.tagpatterns`; only what it says of two words counts.

    Raises
    ------
    UsageError
        The layer does not tell word classes, or the pattern fits no two words.
    """

    def __init__(self, store: Store, layer: str, pattern: str) -> None:
        automaton = compile_pattern(pattern)
        numbers = {name: symbol for symbol, name in enumerate(automaton.classes, 1)}
        found = classes_of_terms(store, layer)
        missing = [name for name in automaton.classes if name not in {own.upper() for own in found}]
        if missing:
            raise UsageError(f"layer {layer!r} has no word class {missing[0]!r}, only {', '.join(sorted(set(found)))}")
        self._symbols = np.array([numbers.get(own.upper(), 0) for own in found], np.int64)
        self._fits = automaton.accepts[automaton.moves[automaton.moves[1]]]
        if not self._fits.any():
            raise UsageError(
                f"pattern {pattern!r} fits no two words: pairs have two, `colloc sequences` takes any number"
            )

    def mask(self, rows: PairTable) -> np.ndarray:
        """Which rows follow the pattern, ``first`` before ``second``."""
        fitting: np.ndarray = self._fits[self._symbols[rows.first], self._symbols[rows.second]]
        return fitting


def in_classes(rows: PairTable, classes: Classes) -> Iterator[tuple[str | None, PairTable]]:
    """The rows whose second word is of each class; all of them, without a name, where no class was asked for."""
    if not classes:
        yield None, rows
    for name, mask in classes.items():
        yield name, rows.take(mask[rows.second])
