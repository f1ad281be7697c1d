"""Pairs of words as features of texts."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any, Self

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_matrix
from sklearn.base import BaseEstimator, TransformerMixin
from sklearn.utils.validation import check_is_fitted

from colloc.errors import UsageError
from colloc.estimators.reading import TextReader, as_terms, count_pairs, near_pairs, pair_keys
from colloc.measures.catalogue import find_ranking
from colloc.records import Int64Array


class PairFeatures(TransformerMixin, BaseEstimator):  # type: ignore[misc] # scikit-learn has no types
    """Counts, in each text, of the pairs of words that hold together most in the texts it was fitted on.

    Parameters
    ----------
    measure : str
        Ranks the pairs; a name of the catalogue. Only pairs met more often than expected are taken.
    window : int
        Words of reach; no pair reaches beyond a sentence.
    directed : bool
        Only the second after the first.
    min_count : int
        Least joint count of a pair.
    max_features : int or None
        So many pairs; all when None.
    binary : bool
        1 for present instead of counts.
    lowercase : bool
        Fold case.

    Attributes
    ----------
    vocabulary_ : dict of str to int
    pairs_ : list of (str, str)
        The features, strongest first; ties by joint count, then by word.
    scores_ : float64 array, shape (n_features,)
    """

    def __init__(
        self,
        measure: str = "npmi",
        *,
        window: int = 5,
        directed: bool = False,
        min_count: int = 5,
        max_features: int | None = 1000,
        binary: bool = False,
        lowercase: bool = True,
    ) -> None:
        self.measure = measure
        self.window = window
        self.directed = directed
        self.min_count = min_count
        self.max_features = max_features
        self.binary = binary
        self.lowercase = lowercase

    def fit(self, X: Iterable[str], y: Any = None) -> Self:
        """Choose the pairs.

        Raises
        ------
        UsageError
            Where no pair passes the thresholds.
        """
        chosen = find_ranking(self.measure)
        reader = TextReader(self.lowercase)
        tokens = reader.read(X)
        counted = count_pairs(tokens, len(reader.vocabulary), self.window, self.directed)
        enough = counted.joint >= self.min_count
        first, second, joint = counted.first[enough], counted.second[enough], counted.joint[enough]
        table = counted.maker.counted(as_terms(first), as_terms(second), joint)
        product = np.asarray(table.first_total, np.float64) * table.second_total
        attracted = table.joint * np.asarray(table.total, np.float64) > product
        values = chosen.compute(*table.arguments)
        scores = -values if chosen.strongest == "lowest" else values
        rows = np.flatnonzero(attracted & ~np.isnan(scores))
        if not len(rows):
            raise UsageError(f"no pair of words is met {self.min_count} times and more often than expected")
        words = list(reader.vocabulary)
        order = sorted(
            rows.tolist(), key=lambda row: (-scores[row], -joint[row], words[first[row]], words[second[row]])
        )[: self.max_features]
        self.vocabulary_ = reader.vocabulary
        self.pairs_ = [(words[first[row]], words[second[row]]) for row in order]
        self.scores_ = values[order]
        return self

    def transform(self, X: Iterable[str]) -> csr_matrix[Any]:
        """Counts of the pairs in each text: sparse matrix, int64, shape (n_texts, n_features)."""
        check_is_fitted(self)
        n_terms = len(self.vocabulary_)
        numbers = np.array([[self.vocabulary_[word] for word in pair] for pair in self.pairs_])
        keys = pair_keys(numbers[:, 0], numbers[:, 1], n_terms, self.directed)
        by_key = np.argsort(keys)
        tokens = TextReader(self.lowercase, self.vocabulary_).read(X)
        rows: list[Int64Array] = [np.zeros(0, np.int64)]
        columns: list[Int64Array] = [np.zeros(0, np.int64)]
        for earlier, later in near_pairs(tokens, self.window):
            here = pair_keys(tokens.terms[earlier], tokens.terms[later], n_terms, self.directed)
            places = np.minimum(np.searchsorted(keys, here, sorter=by_key), len(keys) - 1)
            known = keys[by_key[places]] == here
            rows.append(tokens.documents[earlier[known]])
            columns.append(by_key[places[known]])
        row, column = np.concatenate(rows), np.concatenate(columns)
        counts: csr_matrix[Any] = csr_matrix(
            (np.ones(len(row), np.int64), (row, column)), shape=(tokens.n_documents, len(self.pairs_))
        )
        if self.binary:
            counts.data[:] = 1
        return counts

    def get_feature_names_out(self, input_features: Any = None) -> NDArray[np.object_]:
        """The pairs, each as its two words with a space between."""
        check_is_fitted(self)
        return np.array([" ".join(pair) for pair in self.pairs_], dtype=object)

    def __sklearn_tags__(self) -> Any:
        tags = super().__sklearn_tags__()
        tags.input_tags.string, tags.input_tags.two_d_array = True, False
        return tags
