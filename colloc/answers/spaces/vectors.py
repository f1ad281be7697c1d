"""Word vectors: the leading dimensions of a matrix of association."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from colloc.answers.questions import PairOptions
from colloc.answers.spaces.matrix import Matrix, MatrixOptions, matrix
from colloc.answers.spaces.reducing import leading_vectors, powers
from colloc.errors import UsageError
from colloc.records import FloatArray
from colloc.settings import DEFAULT_MEMORY
from colloc.store.connection import Store

DEFAULT_DIMENSIONS = 300
DEFAULT_SMOOTHING = 0.75
DEFAULT_POWER = 0.5


@dataclass(frozen=True, slots=True, kw_only=True)
class VectorOptions:
    """How a matrix becomes vectors.

    Parameters
    ----------
    dimensions : int
    power : float
        Power p of the singular values in U S^p (Levy, Goldberg & Dagan 2015, section 3.3): 1 keeps the distances of
        the matrix, 0.5 and 0 give the small dimensions more weight.
    join_contexts : bool
        Add to each word's vector the vector of the same word as a context, "w + c" in the same paper, section 3.3.
    seed : int
    """

    dimensions: int = DEFAULT_DIMENSIONS
    power: float = DEFAULT_POWER
    join_contexts: bool = False
    seed: int = 0

    def __post_init__(self) -> None:
        if self.dimensions < 1:
            raise UsageError(f"dimensions must be at least 1, not {self.dimensions}")
        if not 0 <= self.power <= 1:
            raise UsageError(f"power must be between 0 and 1, not {self.power}")


@dataclass(frozen=True, slots=True)
class Vectors:
    """A vector for each word.

    Attributes
    ----------
    values : float64 array, shape (n, dimensions)
    words : list of str, length n
    singular : float64 array, shape (dimensions,)
        Singular values, descending.
    settings : dict
    """

    values: FloatArray
    words: list[str]
    singular: FloatArray
    settings: dict[str, Any]

    def __len__(self) -> int:
        return len(self.words)

    def __getitem__(self, word: str) -> FloatArray:
        """The vector of a word; KeyError where it has none."""
        try:
            vector: FloatArray = self.values[self.words.index(word)]
        except ValueError as error:
            raise KeyError(word) from error
        return vector


def vectors(
    store: Store,
    *,
    options: PairOptions | None = None,
    chosen: MatrixOptions | None = None,
    shape: VectorOptions | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Vectors:
    """Vectors of the words of a store.

    Raises
    ------
    UsageError
        For options that contradict each other, or more dimensions than there are words.
    """
    made = matrix(
        store,
        options=options,
        chosen=chosen or MatrixOptions(smoothing=DEFAULT_SMOOTHING),
        jobs=jobs,
        memory=memory,
        progress=progress,
    )
    return reduced(made, shape or VectorOptions())


def reduced(made: Matrix, shape: VectorOptions) -> Vectors:
    """The rows of a matrix in fewer dimensions.

    Raises
    ------
    UsageError
        More dimensions than rows or columns; ``join_contexts`` where a row is not among the contexts.
    """
    left, singular, right = leading_vectors(made.values, shape.dimensions, seed=shape.seed)
    weights = powers(singular, shape.power)
    values: FloatArray = left * weights
    if shape.join_contexts:
        values = values + (right.T * weights)[_context_places(made)]
    settings = {
        **made.settings,
        "dimensions": shape.dimensions,
        "power": shape.power,
        "join_contexts": shape.join_contexts,
        "seed": shape.seed,
    }
    return Vectors(values, made.rows, singular, settings)


def _context_places(made: Matrix) -> np.ndarray:
    places = {word: place for place, word in enumerate(made.columns)}
    missing = [word for word in made.rows if word not in places]
    if missing:
        raise UsageError(f"join contexts: {missing[0]!r} is a row but no context; choose the same words for both")
    return np.array([places[word] for word in made.rows])
