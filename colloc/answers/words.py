"""The word list of a store."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal, get_args

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.questions import built_spec
from colloc.answers.spelling import near_spellings
from colloc.counts.words import slice_dispersion, slice_word_counts
from colloc.errors import UsageError
from colloc.records import Int64Array
from colloc.store import slices, vocabulary
from colloc.store.connection import Store

WordOrder = Literal["count", "documents", "word", "dp_norm"]


def words(
    store: Store,
    *,
    layer: str | None = None,
    where: Sequence[str] = (),
    pattern: str | None = None,
    min_count: int = 1,
    min_docs: int = 1,
    sort: WordOrder = "count",
    limit: int = 50,
) -> Columns:
    """Words with frequency, rate, documents and dispersion.

    Parameters
    ----------
    pattern : str
        ``*`` stands for any characters.
    sort : {"count", "documents", "word", "dp_norm"}
        Highest first; words alphabetically, DPnorm most even first.
    limit : int
        Rows; 0 for all.

    Returns
    -------
    Columns
        word, count, per_million, documents, dp, dp_norm (Gries 2008; Lijffijt &
        Gries 2012: 0 evenly spread over the documents, 1 as clumped as can be).
    """
    layer = layer or built_spec(store).layer
    slice_text = slices.canonical(where)
    counts = slice_word_counts(store, layer, slice_text)
    keep = (counts.tokens >= max(min_count, 1)) & (counts.documents >= min_docs)
    if pattern is not None:
        matching = np.zeros(len(keep), dtype=bool)
        matching[vocabulary.terms_matching(store, layer, pattern)] = True
        keep &= matching
    numbers = np.flatnonzero(keep)
    dp, dp_norm = slice_dispersion(store, layer, slice_text)
    numbers, texts = _ordered(store, layer, numbers, counts.tokens, counts.documents, dp_norm, sort, limit)
    tokens = int(counts.tokens.sum())
    near = near_spellings(store, layer, pattern) if pattern and not len(numbers) and "*" not in pattern else []
    return Columns(
        {
            "word": texts,
            "count": counts.tokens[numbers],
            "per_million": counts.tokens[numbers] * (1e6 / max(tokens, 1)),
            "documents": counts.documents[numbers],
            "dp": dp[numbers],
            "dp_norm": dp_norm[numbers],
        },
        {
            "store": str(store.path),
            "layer": layer,
            "where": slice_text,
            "pattern": pattern,
            "min_count": min_count,
            "min_docs": min_docs,
            "sort": sort,
            "limit": limit,
            "tokens": tokens,
            **({"near": {pattern: near}} if near else {}),
        },
    )


def _ordered(
    store: Store,
    layer: str,
    numbers: Int64Array,
    tokens: Int64Array,
    documents: Int64Array,
    dp_norm: np.ndarray,
    sort: str,
    limit: int,
) -> tuple[Int64Array, list[str]]:
    """Term numbers in the order asked for, ties by count and then by word, with their texts."""
    if sort not in get_args(WordOrder):
        raise UsageError(f"sort must be one of {', '.join(get_args(WordOrder))}, not {sort!r}")
    level = np.zeros(len(numbers))
    by_count = -tokens[numbers] if sort != "word" else level
    key = {"documents": -documents[numbers], "dp_norm": dp_norm[numbers]}.get(sort, by_count)
    if limit and limit < len(numbers) and sort != "word":
        # Only what can reach the list needs its text: all ties of the last place included.
        order = np.lexsort((by_count, key))
        last = order[limit - 1]
        reach = np.flatnonzero((key < key[last]) | ((key == key[last]) & (by_count <= by_count[last])))
        numbers, key, by_count = numbers[reach], key[reach], by_count[reach]
    texts = vocabulary.term_texts(store, layer, numbers)
    order_list = sorted(range(len(texts)), key=lambda row: (key[row], by_count[row], texts[row]))
    order_list = order_list[: limit or None]
    return numbers[order_list], [texts[row] for row in order_list]
