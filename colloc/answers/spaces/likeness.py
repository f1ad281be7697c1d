"""Words alike: cosines between the rows of a matrix or between vectors, and the contexts that make them so."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.spaces.matrix import Matrix
from colloc.answers.spaces.vectors import Vectors
from colloc.answers.spelling import not_seen
from colloc.errors import NotSeenError
from colloc.records import FloatArray, Int64Array
from colloc.store import vocabulary
from colloc.store.connection import Store
from colloc.tokens.folding import fold

SHARED_SHOWN = 5


class Space:
    """Rows that words are compared by.

    Parameters
    ----------
    source : Matrix or Vectors
    """

    def __init__(self, source: Matrix | Vectors) -> None:
        self.words = source.words if isinstance(source, Vectors) else source.rows
        self.settings = source.settings
        self._rows: Any = source.values
        self._folds = source.settings.get("layer") in ("fold", "lemma_fold")

    @cached_property
    def _places(self) -> dict[str, int]:
        return {word: place for place, word in enumerate(self.words)}

    @cached_property
    def _units(self) -> Any:
        """Rows of length 1; rows of zeros stay."""
        if isinstance(self._rows, np.ndarray):
            lengths = np.linalg.norm(self._rows, axis=1)
            return self._rows / np.where(lengths > 0, lengths, 1.0)[:, np.newaxis]
        from scipy.sparse import csr_array

        rows = self._rows
        squares = np.concatenate([[0.0], np.cumsum(rows.data**2)])
        sums = squares[rows.indptr[1:]] - squares[rows.indptr[:-1]]
        lengths = np.sqrt(np.where(sums > 0, sums, 1.0))
        data = rows.data / np.repeat(lengths, np.diff(rows.indptr))
        return csr_array((data, rows.indices, rows.indptr), shape=rows.shape)

    def numbers(self, words: Sequence[str]) -> Int64Array:
        """Row numbers of the words, -1 where there is none; words are folded where the layer is."""
        return np.array([self._places.get(fold(word) if self._folds else word, -1) for word in words], dtype=np.int64)

    def cosines(self, first: Int64Array, second: Int64Array) -> FloatArray:
        """Cosine of each pair of rows, from -1 to 1; 0 where one of them is empty."""
        units = self._units
        if isinstance(units, np.ndarray):
            found: FloatArray = np.einsum("ij,ij->i", units[first], units[second])
            return found
        return np.asarray(units[first].multiply(units[second]).sum(axis=1)).ravel()

    def cosines_with(self, number: int) -> FloatArray:
        """Cosine of one row with every row."""
        units = self._units
        if isinstance(units, np.ndarray):
            dense: FloatArray = units @ units[number]
            return dense
        return np.asarray((units @ units[[number]].T).toarray()).ravel()


def similar(space: Space, words: Sequence[str], *, limit: int = 20, contexts: Matrix | None = None) -> Columns:
    """The nearest words of each word.

    Parameters
    ----------
    limit : int
        Rows for each word; 0 for all.
    contexts : Matrix, optional
        Where the contexts that two words share are looked up: those with the largest product of values.

    Returns
    -------
    Columns
        word, similar, cosine, shared (contexts that speak for it, strongest first; where ``contexts`` is given).
        Equal cosines stand by word.

    Raises
    ------
    NotSeenError
        When one of the words has no row.
    """
    numbers = space.numbers(words)
    for word, number in zip(words, numbers.tolist(), strict=True):
        if number < 0:
            raise NotSeenError(_no_row(word, space.settings))
    asked: list[str] = []
    found: list[str] = []
    scores: list[float] = []
    for number in numbers.tolist():
        cosines = space.cosines_with(number)
        for place in _nearest(space, cosines, number, limit):
            asked.append(space.words[number])
            found.append(space.words[place])
            scores.append(float(cosines[place]))
    columns: dict[str, Any] = {"word": asked, "similar": found, "cosine": np.array(scores)}
    if contexts is not None:
        columns["shared"] = _shared(contexts, asked, found)
    return Columns(columns, {**space.settings, "limit": limit})


def check_seen(store: Store, layer: str, words: Sequence[str]) -> None:
    """Raise NotSeenError, with near spellings, for the first word that never occurs in a layer."""
    for word, number in zip(words, vocabulary.term_numbers(store, layer, list(words)).tolist(), strict=True):
        if number < 0:
            raise NotSeenError(not_seen(store, layer, word))


def made_elsewhere(vectors: Vectors, store: Store) -> str | None:
    """Why the contexts of a store say nothing about these vectors; None where they were made from it."""
    source = vectors.settings.get("store")
    if source is not None and Path(source).resolve() == store.path.resolve():
        return None
    return f"left out: the vectors were made from {source or 'an unnamed store'}, not from {store.path}"


def _no_row(word: str, settings: Mapping[str, Any]) -> str:
    vectors = "dimensions" in settings
    lacking = f"{word!r} has no {'vector' if vectors else 'row'}"
    if not settings.get("rows"):
        return f"{lacking}: it meets no other word in what was counted"
    remedy = "make the vectors anew with a lower --min-row-count" if vectors else "lower --min-row-count"
    return f"{lacking}: compared are only words {settings['rows']}; {remedy}"


def _nearest(space: Space, cosines: FloatArray, number: int, limit: int) -> list[int]:
    """Places by cosine, highest first, then by word; without the word itself."""
    candidates = np.flatnonzero(np.arange(len(cosines)) != number)
    if limit and limit < len(candidates):
        kth = np.partition(cosines[candidates], len(candidates) - limit)[len(candidates) - limit]
        candidates = candidates[cosines[candidates] >= kth]
    order = sorted(candidates.tolist(), key=lambda place: (-cosines[place], space.words[place]))
    return order[:limit] if limit else order


def _shared(contexts: Matrix, first: Sequence[str], second: Sequence[str]) -> list[str]:
    places = {word: place for place, word in enumerate(contexts.rows)}
    texts = []
    for one, other in zip(first, second, strict=True):
        if one not in places or other not in places:
            texts.append("")
            continue
        product = contexts.values[[places[one]]].multiply(contexts.values[[places[other]]]).tocoo()
        best = sorted(zip(-product.data, (contexts.columns[place] for place in product.col), strict=True))
        texts.append(", ".join(word for _, word in best[:SHARED_SHOWN]))
    return texts
