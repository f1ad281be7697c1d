"""In which order lines stand: as in the text, by document, by neighbouring words, or at random."""

from __future__ import annotations

from typing import Literal, get_args

import numpy as np

from colloc.answers.concordance.finding import Hits
from colloc.answers.concordance.passages import StreamReader
from colloc.counts.spans import apply_layer
from colloc.errors import UsageError
from colloc.records import NO_TERM, Int64Array, UInt32Array
from colloc.store import documents, vocabulary
from colloc.store.connection import Store

LineOrder = Literal["text", "document", "before", "after", "random"]

NEIGHBOURS = 5
"""Words that decide the order by what stands before or after, the nearest first."""


def ordered(
    store: Store, reader: StreamReader, hits: Hits, order: LineOrder, layer: str, seed: int, limit: int = 0
) -> Int64Array:
    """Row numbers of the hits in the order asked; ties stand as in the text.

    Parameters
    ----------
    limit : int
        How many are wanted; more may be given. 0 for all.

    Raises
    ------
    UsageError
        For an unknown order.
    """
    if order not in get_args(LineOrder):
        raise UsageError(f"sort must be one of {', '.join(get_args(LineOrder))}, not {order!r}")
    if order == "random":
        return np.random.default_rng(seed).permutation(len(hits))
    if order == "document":
        names = {row.number: row.identifier for row in documents.iterate_documents(store)}
        present = np.unique(hits.documents)
        ranks = {number: rank for rank, number in enumerate(sorted(present.tolist(), key=names.__getitem__))}
        return np.argsort([ranks[number] for number in hits.documents.tolist()], kind="stable")
    rows = np.arange(len(hits))
    if order == "text" or not len(hits):
        return rows
    steps = -1 - np.arange(NEIGHBOURS) if order == "before" else hits.length + np.arange(NEIGHBOURS)
    of_type = vocabulary.layer_map(store, layer)
    if 0 < limit < len(hits):
        # The nearest word alone tells which lines can be among the first.
        nearest = _text_ranks(store, layer, _neighbours(reader, hits, steps[:1], of_type))[:, 0]
        rows = np.flatnonzero(nearest <= np.partition(nearest, limit - 1)[limit - 1])
    ranks_of = _text_ranks(store, layer, _neighbours(reader, hits.take(rows), steps, of_type))
    return rows[np.lexsort(ranks_of.T[::-1])]


def _neighbours(reader: StreamReader, hits: Hits, steps: Int64Array, of_type: UInt32Array) -> UInt32Array:
    """Terms at some steps from each hit, shape (n_hits, n_steps); NO_TERM outside its document."""
    places = hits.places[:, None] + steps
    begins, stops = document_bounds(reader, hits.documents)
    outside = (places < begins[:, None]) | (places >= stops[:, None])
    types = reader.types_at(np.where(outside, hits.places[:, None], places).reshape(-1))
    return np.where(outside, NO_TERM, apply_layer(of_type, types).reshape(places.shape))


def document_bounds(reader: StreamReader, numbers: Int64Array) -> tuple[Int64Array, Int64Array]:
    """First token and the one after the last of the document of each hit."""
    distinct, place = np.unique(numbers, return_inverse=True)
    rows = [reader.document(number) for number in distinct.tolist()]
    begins = np.array([row.first_token for row in rows], np.int64)
    lengths = np.array([row.n_tokens for row in rows], np.int64)
    return begins[place], (begins + lengths)[place]


def first_of_each_document(documents_of_rows: Int64Array) -> Int64Array:
    """Row numbers, ascending, of the first row of each document."""
    return np.sort(np.unique(documents_of_rows, return_index=True)[1])


def _text_ranks(store: Store, layer: str, terms: UInt32Array) -> Int64Array:
    """The place of each term among those given, by text; what is no term comes first."""
    distinct, place = np.unique(terms, return_inverse=True)
    known = distinct[distinct != NO_TERM]
    texts = vocabulary.term_texts(store, layer, known.tolist())
    ranks = np.zeros(len(distinct), np.int64)
    ranks[sorted(range(len(texts)), key=texts.__getitem__)] = np.arange(1, len(texts) + 1)
    return ranks[place.reshape(terms.shape)]
