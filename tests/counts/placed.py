"""A store with a given stream in blocks of any size, and what its documents hold, for brute-force counts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from colloc.records import Anchors, DocumentRow, SourceInfo
from colloc.settings import TallySpec
from colloc.store import documents, stream, visibility
from colloc.store.inputs import sources
from colloc.store.opening import create
from colloc.store.vocabulary import TypeKey, TypeRegistry, ensure_layer


@dataclass(frozen=True)
class Placed:
    """One document: terms, and the offsets where its sentences begin (0 among them)."""

    terms: list[int]
    sentences: list[int]
    genre: str


def random_documents(seed: int, n: int, n_terms: int, longest: int) -> list[Placed]:
    """Documents of uneven length, some of them empty; low terms are frequent."""
    rng = np.random.default_rng(seed)
    made = []
    for number in range(n):
        length = int(rng.integers(0, longest)) if number % 7 else 0
        terms = np.minimum(rng.geometric(0.15, length) - 1, n_terms - 1).tolist()
        sentences = np.flatnonzero(rng.random(length) < 0.1)
        made.append(Placed(terms, sorted({0, *sentences.tolist()} if length else set()), "ab"[number % 2]))
    return made


def write_store(
    path: Path,
    made: list[Placed],
    n_terms: int,
    block: int,
    removed: tuple[int, ...] = (),
    types: Sequence[TypeKey] | None = None,
    layer: str = "fold",
) -> None:
    """Keep documents in blocks of ``block`` tokens, cut anywhere; then remove some.

    ``types`` are what the terms stand for, w000, w001, ... when not given.
    """
    firsts = np.cumsum([0, *[len(document.terms) for document in made]])
    tokens = np.array([term for document in made for term in document.terms], np.uint32)
    starts = [first + s for first, document in zip(firsts, made, strict=False) for s in document.sentences]
    sentences = np.array(starts, np.int64)
    asked = {"default_tally": TallySpec(layer=layer).to_json(), "default_margins": "pairs", "state": "complete"}
    with create(path, asked) as store, store.transaction():
        TypeRegistry(store).number(types or [f"w{term:03}" for term in range(n_terms)])
        ensure_layer(store, layer)
        source = sources.add_source(store, SourceInfo("made", 0, 0.0))
        rows = [
            DocumentRow(i, f"d{i}", source, i, int(firsts[i]), len(d.terms), 0, 0, {"genre": d.genre})
            for i, d in enumerate(made)
        ]
        documents.append_documents(store, rows)
        for number, begin in enumerate(range(0, len(tokens), block)):
            stop = min(begin + block, len(tokens))
            inside = sentences[(sentences >= begin) & (sentences < stop)] - begin
            begun = [i for i in range(len(made)) if begin <= firsts[i] < stop]
            none = np.empty(0, np.int64)
            stream.append_block(
                store,
                stream.Block(
                    number,
                    begin,
                    tokens[begin:stop],
                    inside,
                    none,
                    firsts[begun] - begin,
                    np.array(begun, np.int64),
                    continues=not len(inside) or inside[0] > 0,
                    anchors=Anchors(none, none),
                ),
            )
        visibility.show_all(store)
        for number in removed:
            documents.remove_document(store, number)
