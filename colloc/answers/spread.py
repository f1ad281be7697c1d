"""How given pairs are spread over documents: one pass over the token stream for all of them."""

from __future__ import annotations

import numpy as np

from colloc.answers.questions import Question
from colloc.counts.candidates import occurrences
from colloc.records import Int64Array, UInt32Array


def document_counts(question: Question, first: UInt32Array, second: UInt32Array) -> Int64Array:
    """Number of documents that hold each pair, counted as the question's tally counts.

    Parameters
    ----------
    first, second : uint32 arrays, shape (n,)
        Terms.

    Returns
    -------
    int64 array, shape (n,)
    """
    counts = np.zeros(len(first), dtype=np.int64)
    directed = question.reader.ordered
    for found in occurrences(question.store, question.spec, first, second, directed=directed):
        counts += np.bincount(found.pair, minlength=len(first))
    return counts
