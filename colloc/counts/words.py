"""Words of a layer from the stored stream: frequencies, documents, dispersion over documents."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from colloc.counts.selection import Selection, slice_selection
from colloc.counts.spans import Stretch, apply_layer, read_stretches
from colloc.kernels import pairs
from colloc.kernels.switch import compiled
from colloc.records import NO_TERM, FloatArray, Int64Array, UInt32Array, WordCounts
from colloc.store.connection import Store
from colloc.store.vocabulary import (
    append_word_counts,
    has_word_counts,
    layer_map,
    layer_names,
    term_count,
    type_count,
    word_counts,
)

_TERM_BITS = np.uint64(32)
_TERM_MASK = np.uint64(0xFFFFFFFF)
_SPARSEST = 16
"""Documents whose tokens are at least a sixteenth of all terms are counted in a table: sorting would take longer."""


@dataclass(frozen=True, slots=True)
class DocumentWords:
    """How often each term occurs in each of some documents.

    Attributes
    ----------
    documents : int64 array, shape (n,)
        Index into ``sizes``.
    terms : uint32 array, shape (n,)
    counts : int64 array, shape (n,)
    sizes : int64 array
        Tokens of each document that are in the layer.
    """

    documents: Int64Array
    terms: UInt32Array
    counts: Int64Array
    sizes: Int64Array


def slice_word_counts(store: Store, layer: str, where: str = "") -> WordCounts:
    """Frequencies of a layer's terms in a slice (canonical text; empty: all documents)."""
    if not where and has_word_counts(store, layer):
        return word_counts(store, layer)
    return count_words(store, layer, slice_selection(store, where))


def count_words(store: Store, layer: str, selection: Selection) -> WordCounts:
    """Frequencies of a layer's terms in a selection, from the stream: tokens, and documents that hold the term."""
    n_terms = term_count(store, layer)
    tokens, documents = np.zeros(n_terms, np.int64), np.zeros(n_terms, np.int64)
    if compiled():
        return _count_in_a_loop(store, [layer], selection)[0]
    for batch in document_words(store, layer, selection):
        # a term comes once for each document of a batch
        np.add.at(tokens, batch.terms, batch.counts)
        documents += np.bincount(batch.terms, minlength=n_terms)
    return WordCounts(tokens, documents)


def change_word_counts(store: Store, selection: Selection, sign: int) -> None:
    """Add the words of a selection to the frequencies of every layer of the store, or take them away (sign -1)."""
    layers = layer_names(store)
    if compiled():
        changes = _count_in_a_loop(store, layers, selection)
    else:
        changes = [count_words(store, layer, selection) for layer in layers]
    for layer, change in zip(layers, changes, strict=True):
        there = np.flatnonzero(change.tokens)
        append_word_counts(
            store, layer, there.astype(np.uint32), sign * change.tokens[there], sign * change.documents[there]
        )


def _count_in_a_loop(store: Store, layers: Sequence[str], selection: Selection) -> list[WordCounts]:
    """`count_words` for several layers in one pass, by a compiled loop."""
    maps = [layer_map(store, layer) for layer in layers]
    sizes = [term_count(store, layer) for layer in layers]
    counts = [WordCounts(np.zeros(size, np.int64), np.zeros(size, np.int64)) for size in sizes]
    seen = [np.full(size, -1, np.int64) for size in sizes]
    document = 0
    types = np.arange(type_count(store), dtype=np.uint32)
    for stretch in read_stretches(store, types, selection, "document"):
        starts = stretch.units - stretch.first
        for terms, found, last in zip(maps, counts, seen, strict=True):
            pairs.count_words(apply_layer(terms, stretch.terms), starts, document, found.tokens, found.documents, last)
        document += len(starts)
    return counts


def slice_dispersion(store: Store, layer: str, where: str = "") -> tuple[FloatArray, FloatArray]:
    """How unevenly each term is spread over the documents of a slice.

    Returns
    -------
    dp, dp_norm : float64 arrays, shape (n_terms,)
        DP = 0.5 * sum over documents of abs(share of the term - share of all words), from 0 (as the words in
        general) towards 1 (Gries 2008, doi:10.1075/ijcl.13.4.02gri); DPnorm = DP / (1 - smallest share), which
        reaches 1 (Lijffijt & Gries 2012, doi:10.1075/ijcl.17.1.08lij). NaN for terms that do not occur, and DPnorm
        where there is only one document.
    """
    selection = slice_selection(store, where)
    frequencies = slice_word_counts(store, layer, where).tokens
    total = int(frequencies.sum())
    # where a term does not occur its document adds its share: begin with 1 and correct where it does
    distance = np.ones(len(frequencies))
    smallest = 1.0
    for batch in document_words(store, layer, selection):
        shares = batch.sizes / total
        smallest = min(smallest, float(shares.min()))
        share = shares[batch.documents]
        np.add.at(distance, batch.terms, np.abs(batch.counts / frequencies[batch.terms] - share) - share)
    dp = np.where(frequencies > 0, distance / 2, np.nan)
    # sums of shares leave rounding errors of a few units in the last place around 0
    dp = np.maximum(dp, 0.0)
    dp_norm: FloatArray = dp / (1 - smallest) if smallest < 1 else np.full(len(dp), np.nan)
    return dp, dp_norm


def document_words(store: Store, layer: str, selection: Selection) -> Iterator[DocumentWords]:
    """The terms of every document of a selection, some whole documents at a time; empty documents are left out."""
    stretches = read_stretches(store, layer_map(store, layer), selection, "document")
    n_terms = term_count(store, layer)
    pending: DocumentWords | None = None
    for stretch in stretches:
        batch = _count_documents(stretch, n_terms)
        if pending is not None and not _begins_document(stretch):
            batch = _continued(pending, batch)
        elif pending is not None:
            yield from _filled(pending)
        whole, pending = _split_last(batch)
        yield from _filled(whole)
    if pending is not None:
        yield from _filled(pending)


def _begins_document(stretch: Stretch) -> bool:
    return len(stretch.units) > 0 and int(stretch.units[0]) == stretch.first


def _count_documents(stretch: Stretch, n_terms: int) -> DocumentWords:
    """Documents of a stretch, numbered from 0; the first may go on from before, the last may go on."""
    inner = stretch.units[stretch.units > stretch.first] - stretch.first
    starts = np.concatenate([[0], inner])
    if len(stretch.terms) * _SPARSEST >= len(starts) * n_terms:
        return _by_tables(stretch.terms, starts, n_terms)
    return _by_sorting(stretch.terms, starts)


def _by_tables(terms: UInt32Array, starts: Int64Array, n_terms: int) -> DocumentWords:
    """For long documents: a table of all terms for each."""
    found, counts, sizes = [], [], []
    for part in np.split(terms, starts[1:]):
        table = np.bincount(part[part != NO_TERM], minlength=n_terms)
        there = np.flatnonzero(table)
        found.append(there.astype(np.uint32))
        counts.append(table[there])
        sizes.append(int(table.sum()))
    documents = np.repeat(np.arange(len(starts)), [len(part) for part in found])
    return DocumentWords(documents, np.concatenate(found), np.concatenate(counts), np.array(sizes, np.int64))


def _by_sorting(terms: UInt32Array, starts: Int64Array) -> DocumentWords:
    """For short documents: (document, term) sorted."""
    lengths = np.diff(starts, append=len(terms))
    keys = np.repeat(np.arange(len(starts), dtype=np.uint64) << _TERM_BITS, lengths)
    keys |= terms
    keys = keys[terms != NO_TERM]
    keys.sort()
    fresh = np.flatnonzero(np.concatenate([[True], keys[1:] != keys[:-1]])) if len(keys) else np.empty(0, np.int64)
    counts = np.diff(fresh, append=len(keys))
    keys = keys[fresh]
    documents = (keys >> _TERM_BITS).astype(np.int64)
    sizes = np.zeros(len(starts), np.int64)
    np.add.at(sizes, documents, counts)
    return DocumentWords(documents, (keys & _TERM_MASK).astype(np.uint32), counts, sizes)


def _continued(pending: DocumentWords, batch: DocumentWords) -> DocumentWords:
    """``batch`` with the words of ``pending`` added to its first document."""
    end = int(np.searchsorted(batch.documents, 1))
    terms = np.concatenate([pending.terms, batch.terms[:end]])
    distinct, place = np.unique(terms, return_inverse=True)
    counts = np.zeros(len(distinct), np.int64)
    np.add.at(counts, place, np.concatenate([pending.counts, batch.counts[:end]]))
    sizes = batch.sizes.copy()
    sizes[0] += pending.sizes[0]
    return DocumentWords(
        np.concatenate([np.zeros(len(distinct), np.int64), batch.documents[end:]]),
        np.concatenate([distinct, batch.terms[end:]]),
        np.concatenate([counts, batch.counts[end:]]),
        sizes,
    )


def _split_last(batch: DocumentWords) -> tuple[DocumentWords, DocumentWords]:
    last = len(batch.sizes) - 1
    end = int(np.searchsorted(batch.documents, last))
    return (
        DocumentWords(batch.documents[:end], batch.terms[:end], batch.counts[:end], batch.sizes[:last]),
        DocumentWords(batch.documents[end:] - last, batch.terms[end:], batch.counts[end:], batch.sizes[last:]),
    )


def _filled(batch: DocumentWords) -> Iterator[DocumentWords]:
    """The batch without empty documents, where anything is left."""
    there = batch.sizes > 0
    if there.any():
        numbers = np.cumsum(there) - 1
        yield DocumentWords(numbers[batch.documents], batch.terms, batch.counts, batch.sizes[there])
