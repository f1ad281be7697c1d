"""Small stores made by the tests, with the lists of numbers that they hold."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path

import numpy as np

from colloc.records import NO_TERM, Anchors, DocumentRow, Int64Array, UInt32Array
from colloc.store import documents, stream, visibility, vocabulary
from colloc.store.connection import Store
from colloc.store.opening import create

NOTHING = np.empty(0, np.int64)


@dataclass(frozen=True)
class Text:
    """A corpus as numbers: types of the stream, and the places where units begin."""

    types: UInt32Array
    sentences: Int64Array
    paragraphs: Int64Array
    documents: Int64Array
    n_types: int

    def starts(self, inside: str) -> list[int]:
        """Places where units begin."""
        units = {"sentence": self.sentences, "paragraph": self.paragraphs, "document": NOTHING}[inside]
        return sorted({*units.tolist(), *self.documents.tolist()})

    def document_bounds(self) -> list[tuple[int, int]]:
        """First token and the one after the last, document by document."""
        return list(zip(self.documents.tolist(), [*self.documents[1:].tolist(), len(self.types)], strict=False))


def random_text(seed: int, tokens: int, types: int, n_documents: int, sentence: float = 12.0) -> Text:
    """Zipf-like words in sentences, paragraphs and documents of random length; each document begins a paragraph."""
    rng = np.random.default_rng(seed)
    words = (rng.zipf(1.3, tokens) - 1) % types
    starts = np.unique(np.concatenate([[0], np.sort(rng.choice(tokens, n_documents - 1, replace=False))]))
    sentences = np.flatnonzero(rng.random(tokens) < 1 / sentence)
    sentences = np.union1d(sentences, starts)
    paragraphs = np.union1d(sentences[rng.random(len(sentences)) < 0.2], starts)
    return Text(words.astype(np.uint32), sentences, paragraphs, starts, types)


def make_store(path: Path, text: Text, blocks: Sequence[int] = ()) -> Store:
    """A store of this text, cut into blocks at the places given; documents alternate between halves ``a`` and ``b``.

    The types are ``T0``, ``t0``, ``T1``, ``t1`` and so on, so that ``fold`` makes one term of two.
    """
    forms = [f"{'Tt'[i % 2]}{i // 2}" for i in range(text.n_types)]
    store = create(path, {})
    with store.transaction():
        registry = vocabulary.TypeRegistry(store)
        vocabulary.ensure_layer(store, "fold")
        registry.number(forms)
        append(store, text, blocks)
        visibility.show_all(store)
    return store


def append(store: Store, text: Text, blocks: Sequence[int] = ()) -> None:
    """Add the documents of a text behind what the store holds, in a transaction of the caller's."""
    first = stream.token_count(store)
    number = documents.next_document(store)
    rows = [
        DocumentRow(number + i, f"d{number + i}", 0, i, first + begin, stop - begin, 0, 0, {"half": "ab"[i % 2]})
        for i, (begin, stop) in enumerate(text.document_bounds())
    ]
    documents.append_documents(store, rows)
    edges = [0, *sorted({cut for cut in blocks if 0 < cut < len(text.types)}), len(text.types)]
    begins = text.documents
    for i, (begin, stop) in enumerate(pairwise(edges)):
        inner = [places[(places >= begin) & (places < stop)] - begin for places in (text.sentences, text.paragraphs)]
        here = np.flatnonzero((begins >= begin) & (begins < stop))
        block = stream.Block(
            stream.block_count(store),
            first + begin,
            text.types[begin:stop],
            *inner,
            begins[here] - begin,
            here + number,
            i > 0 and 0 not in inner[0],
            Anchors(NOTHING, NOTHING),
        )
        stream.append_block(store, block)


def folded(text: Text) -> list[int]:
    """The terms that the layer ``fold`` gives the types of `make_store`: two types each."""
    return [int(kind) // 2 if kind != NO_TERM else int(NO_TERM) for kind in text.types]
