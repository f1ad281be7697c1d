"""Texts as the mean of word vectors that were learnt from them."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any, Self

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array, csr_array
from sklearn.base import BaseEstimator, TransformerMixin
from sklearn.utils.validation import check_is_fitted

from colloc.answers.spaces.reducing import leading_vectors, powers
from colloc.errors import UsageError
from colloc.estimators.reading import TextReader, Tokens, as_terms, count_pairs
from colloc.measures.pmi import shifted_ppmi, smoothed_totals
from colloc.records import FloatArray, Int64Array


class PPMIVectors(TransformerMixin, BaseEstimator):  # type: ignore[misc] # scikit-learn has no types
    """The mean vector of the words of each text; words have the leading dimensions of the PPMI matrix.

    See Levy, Goldberg & Dagan (2015) for smoothing, shift and the power of the singular values.

    Parameters
    ----------
    dimensions : int
        Numbers in a vector.
    window : int
        Words of reach on both sides; no pair reaches beyond a sentence.
    min_count : int
        Words seen less often have no vector.
    shift, smoothing, power : float
        log2 shift is taken off PMI; power of the totals of contexts; power of the singular values.
    lowercase : bool
        Fold case.
    random_state : int
        Seed: equal seeds give equal vectors.

    Attributes
    ----------
    vocabulary_ : dict of str to int
        Row of each word in ``vectors_``.
    vectors_ : float64 array, shape (n_words, dimensions)
    """

    def __init__(
        self,
        dimensions: int = 100,
        *,
        window: int = 5,
        min_count: int = 5,
        shift: float = 1.0,
        smoothing: float = 0.75,
        power: float = 0.5,
        lowercase: bool = True,
        random_state: int = 0,
    ) -> None:
        self.dimensions = dimensions
        self.window = window
        self.min_count = min_count
        self.shift = shift
        self.smoothing = smoothing
        self.power = power
        self.lowercase = lowercase
        self.random_state = random_state

    def fit(self, X: Iterable[str], y: Any = None) -> Self:
        """Learn the vectors.

        Raises
        ------
        UsageError
            Where fewer words than dimensions are seen ``min_count`` times.
        """
        reader = TextReader(self.lowercase)
        tokens = reader.read(X)
        frequent = np.flatnonzero(np.bincount(tokens.terms, minlength=len(reader.vocabulary)) >= self.min_count)
        if len(frequent) < max(self.dimensions, 1):
            raise UsageError(
                f"{len(frequent)} words are seen {self.min_count} times, fewer than {self.dimensions} dimensions"
            )
        matrix = self._matrix(tokens, len(reader.vocabulary))[frequent][:, frequent]
        left, values, _ = leading_vectors(matrix, self.dimensions, seed=self.random_state)
        words = list(reader.vocabulary)
        self.vocabulary_ = {words[term]: row for row, term in enumerate(frequent.tolist())}
        self.vectors_ = left * powers(values, self.power)
        return self

    def _matrix(self, tokens: Tokens, n_terms: int) -> csr_array[np.float64]:
        counted = count_pairs(tokens, n_terms, self.window, directed=False)
        full = np.asarray(counted.maker.second_totals(), np.float64)
        share = smoothed_totals(full, self.smoothing) / np.where(full > 0, full, 1.0)

        def cells(first: Int64Array, second: Int64Array, joint: Int64Array) -> tuple[Any, Any, FloatArray]:
            table = counted.maker.counted(as_terms(first), as_terms(second), joint)
            second_total = table.second_total * share[second]
            return first, second, shifted_ppmi(table.joint, table.first_total, second_total, table.total, self.shift)

        off = counted.first != counted.second
        one = cells(counted.first, counted.second, counted.joint)
        other = cells(counted.second[off], counted.first[off], counted.joint[off])
        rows, columns, values = (np.concatenate(pair) for pair in zip(one, other, strict=True))
        stored = values > 0
        made = coo_array((values[stored], (rows[stored], columns[stored])), shape=(n_terms, n_terms))
        return made.tocsr()

    def transform(self, X: Iterable[str]) -> FloatArray:
        """Mean vectors: float64 array, shape (n_texts, dimensions); zeros where no word of a text has a vector."""
        check_is_fitted(self)
        tokens = TextReader(self.lowercase, self.vocabulary_).read(X)
        known = tokens.terms >= 0
        documents, terms = tokens.documents[known], tokens.terms[known]
        counts = coo_array(
            (np.ones(len(terms)), (documents, terms)), shape=(tokens.n_documents, len(self.vocabulary_))
        ).tocsr()
        lengths = np.bincount(documents, minlength=tokens.n_documents)
        means: FloatArray = (counts @ self.vectors_) / np.maximum(lengths, 1)[:, np.newaxis]
        return means

    def get_feature_names_out(self, input_features: Any = None) -> NDArray[np.object_]:
        """``ppmivectors0`` and so on, one for each dimension."""
        check_is_fitted(self)
        return np.array([f"ppmivectors{place}" for place in range(self.dimensions)], dtype=object)

    def __sklearn_tags__(self) -> Any:
        tags = super().__sklearn_tags__()
        tags.input_tags.string, tags.input_tags.two_d_array = True, False
        return tags
