"""What tells many slices apart: words by the information they give about the slice."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Literal, get_args

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.contrasts.gathering import word_counts_by_document
from colloc.answers.contrasts.grouped import groups_by_value
from colloc.answers.contrasts.saying import HOLDS, NO_FINDING, SURE, UNEVEN
from colloc.answers.questions import built_spec
from colloc.counts.words import slice_word_counts
from colloc.errors import NotSeenError, UsageError
from colloc.measures.discoveries import log_q_values
from colloc.measures.subcorpora.documents import groups_test
from colloc.measures.subcorpora.information import presence_information
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT
from colloc.store import slices, vocabulary
from colloc.store.connection import Store

ApartOrder = Literal["bits", "documents"]


def tell_apart(
    store: Store,
    *,
    by: str,
    where: Sequence[str] = (),
    layer: str | None = None,
    min_count: int = DEFAULT_MIN_COUNT,
    sort: ApartOrder = "bits",
    limit: int = 50,
    memory: int = DEFAULT_MEMORY,
) -> Columns:
    """Words ranked by the mutual information of the slice a token stands in and whether it is the word.

    Parameters
    ----------
    by : str
        The metadata key whose values make the slices.
    min_count : int
        Least count in all slices together; all such words are tested.
    sort : {"bits", "documents"}
        By mutual information, or by the test over documents.

    Returns
    -------
    Columns
        word, count, bits (mutual information a million tokens: what the word tells of the slice, summed over a
        million tokens), g2, q (k - 1 degrees of freedom), document_h and document_q (Kruskal-Wallis over the
        documents' relative frequencies), most_in (the slice with the highest rate), most_ratio (log2 of that rate to
        the rate of all), least_in, least_ratio, says.
    """
    if sort not in get_args(ApartOrder):
        raise UsageError(f"many slices are sorted by one of {', '.join(get_args(ApartOrder))}, not {sort!r}")
    groups = groups_by_value(store, by, where)
    layer = layer or built_spec(store).layer
    sides = [slices.canonical([f"{slices.quoted(by)}={slices.quoted(name)}", *where]) for name in groups.names]
    frequencies = [slice_word_counts(store, layer, side) for side in sides]
    counts = np.stack([one.tokens for one in frequencies])
    totals = counts.sum(axis=1)
    terms = np.flatnonzero(counts.sum(axis=0) >= max(min_count, 1))
    if not len(terms):
        raise NotSeenError(f"{store.path}: no word occurs {min_count} times in these documents; lower --min-count")
    counts = counts[:, terms]
    told = presence_information(counts.T, totals)
    held = np.stack([one.documents for one in frequencies]).sum(axis=0)[terms]
    h, document_log_p = np.zeros(len(terms)), np.full(len(terms), np.nan)
    for lot, found in word_counts_by_document(store, layer, sides, terms, held, memory):
        tested = groups_test(found.rates, found.side)
        h[lot], document_log_p[lot] = tested.h, tested.log_p
    log_q, document_log_q = log_q_values(told.log_p), log_q_values(document_log_p)
    first = -told.bits if sort == "bits" else np.nan_to_num(document_log_p, nan=0.0)
    order = np.lexsort((terms, -counts.sum(axis=0), -told.bits, first))[: limit or None]
    with np.errstate(divide="ignore"):
        ratio = np.log2((counts / totals[:, np.newaxis]) / (counts.sum(axis=0) / totals.sum()))[:, order]
    most, least = ratio.argmax(axis=0), ratio.argmin(axis=0)
    row = np.arange(len(order))
    columns: dict[str, Any] = {
        "word": vocabulary.term_texts(store, layer, terms[order]),
        "count": counts.sum(axis=0)[order],
        "bits": told.bits[order] * 1e6,
        "g2": told.g2[order],
        "q": np.exp(log_q[order]),
        "document_h": h[order],
        "document_q": np.exp(document_log_q[order]),
        "most_in": [groups.names[place] for place in most],
        "most_ratio": ratio[most, row],
        "least_in": [groups.names[place] for place in least],
        "least_ratio": ratio[least, row],
        "says": [
            HOLDS if document <= SURE else NO_FINDING if pooled > SURE else UNEVEN
            for document, pooled in zip(np.exp(document_log_q[order]), np.exp(log_q[order]), strict=True)
        ],
    }
    settings = {
        "store": str(store.path),
        "layer": layer,
        "where": slices.canonical(where),
        "by": by,
        "slices": len(groups),
        "min_count": min_count,
        "sort": sort,
        "limit": limit,
        "tested": len(terms),
        "tokens": int(totals.sum()),
    }
    return Columns(columns, settings)
