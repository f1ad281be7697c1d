"""Sequences of adjacent words that follow a pattern of word classes, with how often they occur."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.answers.columns import Columns
from colloc.answers.concordance.passages import StreamReader
from colloc.answers.patterns import matches
from colloc.answers.tagpatterns import compile_pattern
from colloc.records import NO_TERM, Int64Array, UInt32Array
from colloc.store import slices, vocabulary
from colloc.store.connection import Store

_PENDING = 2**22
"""Words of sequences gathered before they are added up."""


def sequences(
    store: Store,
    pattern: str,
    *,
    layer: str = "lemma",
    where: str = "",
    longest: bool = False,
    min_count: int = 1,
    limit: int = 50,
) -> Columns:
    """Sequences that follow a pattern, the most frequent first.

    Parameters
    ----------
    pattern : str
        See `colloc.answers.tagpatterns`.
    layer : str
        What words count as the same; not necessarily one that tells word classes.
    where : str
        Canonical slice; empty for all documents.
    longest : bool
        Only the longest match at each word; otherwise all of them.
    min_count : int
        Least count shown.
    limit : int
        Rows; 0 for all.

    Returns
    -------
    Columns
        sequence, length (words), joint (how often it occurs). Ties stand by text.

    Raises
    ------
    UsageError
        The pattern cannot be read, or the store does not tell word classes.
    """
    automaton = compile_pattern(pattern)
    slices.fitting(store, where)  # raises where the slice means nothing or no document
    terms = vocabulary.layer_map(store, layer)
    reader = StreamReader(store)
    counters: dict[int, _Counter] = {}
    for starts, lengths in matches(store, automaton, where, longest=longest):
        for length in np.unique(lengths).tolist():
            own = starts[lengths == length]
            found = terms[reader.types_at((own[:, None] + np.arange(length)).reshape(-1))].reshape(-1, length)
            counters.setdefault(length, _Counter(length)).add(found[(found != NO_TERM).all(axis=1)])
    rows: list[tuple[int, str, int]] = []
    for length, counter in sorted(counters.items()):
        keys, counts = counter.finish(max(min_count, 1), limit)
        texts = vocabulary.term_texts(store, layer, keys.reshape(-1))
        spelled = [" ".join(texts[row * length : (row + 1) * length]) for row in range(len(keys))]
        rows += zip((-counts).tolist(), spelled, [length] * len(keys), strict=True)
    rows.sort()
    rows = rows[: limit or None]
    settings: dict[str, Any] = {
        "store": str(store.path),
        "layer": layer,
        "where": where,
        "upos": pattern,
        "longest": longest,
        "min_count": min_count,
        "limit": limit,
    }
    return Columns(
        {
            "sequence": [text for _, text, _ in rows],
            "length": np.array([length for _, _, length in rows], np.int64),
            "joint": np.array([-count for count, _, _ in rows], np.int64),
        },
        settings,
    )


@dataclass(slots=True)
class _Counter:
    """Counts sequences of one length: 4 bytes a word and 8 for the count of each different one."""

    length: int
    _keys: list[UInt32Array] = field(default_factory=list)
    _counts: list[Int64Array] = field(default_factory=list)
    _pending: int = 0

    def add(self, found: UInt32Array) -> None:
        """Count rows of terms, shape (n, length)."""
        self._keys.append(found)
        self._counts.append(np.ones(len(found), np.int64))
        self._pending += found.size
        if self._pending > _PENDING + 2 * self._keys[0].size:
            self._add_up()

    def _add_up(self) -> None:
        keys = np.ascontiguousarray(np.concatenate(self._keys)).astype(np.uint32)
        counts = np.concatenate(self._counts)
        whole: NDArray[Any] = keys.view(np.dtype((np.void, 4 * self.length))).reshape(-1)
        _, places, inverse = np.unique(whole, return_index=True, return_inverse=True)
        sums = np.bincount(inverse, weights=counts, minlength=len(places)).astype(np.int64)
        self._keys, self._counts, self._pending = [keys[places]], [sums], keys[places].size

    def finish(self, least: int, most: int) -> tuple[UInt32Array, Int64Array]:
        """Sequences that occur at least so often, and how often; not many more than ``most`` of them."""
        self._add_up()
        keys, counts = self._keys[0], self._counts[0]
        if 0 < most < len(counts):
            # all that tie with the last one stay: texts decide
            least = max(least, int(np.partition(counts, len(counts) - most)[len(counts) - most]))
        keep = counts >= least
        return keys[keep], counts[keep]
