"""Small stores and tables for the tests, made in the plainest way."""

from __future__ import annotations

import functools
import tempfile
import uuid
from collections import Counter
from pathlib import Path

import numpy as np

from colloc.records import Anchors, DocumentRow, PairBlock, SourceInfo
from colloc.settings import TallySpec
from colloc.store import documents, stream, tallies, texts, visibility, vocabulary
from colloc.store.inputs import sources
from colloc.store.opening import Store, create, open_for_writing
from colloc.store.pages import ORDERS, Order, encode_page, head_of
from colloc.store.tallies import TallyWriter

Cells = dict[tuple[int, int], int]
"""A table: (x, y) -> count."""

WINDOW = TallySpec(layer="fold", right=2, inside="document")
DOCUMENTS = {
    "log-1": ("The lamp burns; the Lamp is trimmed and the oil is good", {"genre": "log", "year": 1881}),
    "log-2": ("Fog at dawn, the horn sounds and the lamp burns again", {"genre": "log", "year": 1882}),
    "notice-1": ("The ferry Åsa sails at dawn; ÅSA waits for no fog", {"genre": "notice", "year": 1882, "paid": True}),
}


def block_of(cells: Cells, order: Order = "low") -> PairBlock:
    """A table as unordered pairs, sorted."""
    pairs = {(min(x, y), max(x, y)) for (x, y), count in cells.items() if count}
    by_order = sorted(pairs, key=(lambda pair: pair) if order == "low" else (lambda pair: pair[::-1]))
    return PairBlock(
        np.array([low for low, _ in by_order], dtype=np.uint32),
        np.array([high for _, high in by_order], dtype=np.uint32),
        np.array([cells.get((low, high), 0) for low, high in by_order], dtype=np.int64),
        np.array([cells.get((high, low), 0) if low != high else 0 for low, high in by_order], dtype=np.int64),
    )


def cells_of(block: PairBlock) -> Cells:
    """The table that unordered pairs stand for."""
    cells: Cells = {}
    for low, high, forward, backward in zip(*(getattr(block, name).tolist() for name in block.__slots__), strict=True):
        if forward:
            cells[low, high] = forward
        if backward:
            cells[high, low] = backward
    return cells


def part(block: PairBlock, start: int, stop: int) -> PairBlock:
    """Some rows of a block."""
    return PairBlock(*(getattr(block, name)[start:stop] for name in block.__slots__))


def write_tally(
    store: Store, spec: TallySpec, cells: Cells, *, delta: bool = False, kept: bool = True, pairs_a_page: int = 7
) -> None:
    """Write a table with small pages, so that few pairs make many of them."""
    with store.transaction():
        writer = TallyWriter(store, spec, delta, kept=kept)
        for order in ORDERS:
            block = block_of(cells, order)
            for start in range(0, len(block), pairs_a_page):
                page = part(block, start, start + pairs_a_page)
                data = encode_page(page, order)
                writer.add_page(order, head_of(data, page, order), data)
        first, second = margins_of(cells)
        terms = sorted(first.keys() | second.keys())
        writer.add_margins(
            np.array(terms, dtype=np.uint32),
            np.array([first[term] for term in terms], dtype=np.int64),
            np.array([second[term] for term in terms], dtype=np.int64),
        )
        writer.finish(sum(cells.values()))


def margins_of(cells: Cells) -> tuple[Counter[int], Counter[int]]:
    """Row and column sums."""
    first: Counter[int] = Counter()
    second: Counter[int] = Counter()
    for (x, y), count in cells.items():
        first[x] += count
        second[y] += count
    return first, second


@functools.cache
def _empty_file() -> bytes:
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "empty"
        create(path, {}).close()
        return path.read_bytes()


def empty_store(folder: Path) -> Store:
    """A new store open for writing; copied, since laying one out takes a tenth of a second."""
    path = folder / f"{uuid.uuid4().hex}.colloc"
    path.write_bytes(_empty_file())
    return open_for_writing(path, "test")


def store_of_terms(folder: Path, terms: int) -> Store:
    """A store whose layer ``form`` has so many terms, and nothing else."""
    store = empty_store(folder)
    with store.transaction():
        vocabulary.TypeRegistry(store).number([f"w{number}" for number in range(terms)])
    return store


def words_of(text: str) -> list[str]:
    """Words between spaces and marks: enough for texts of our own."""
    return text.replace(";", " ").replace(",", " ").split()


def window_cells(sequences: list[list[int]], window: int) -> Cells:
    """How often y follows x within the window, by the definition."""
    cells: Counter[tuple[int, int]] = Counter()
    for terms in sequences:
        for i, x in enumerate(terms):
            for y in terms[i + 1 : i + 1 + window]:
                cells[x, y] += 1
    return dict(cells)


def small_store(path: Path) -> Store:
    """A complete, sound store of three documents in two blocks, open for writing."""
    store = create(path, {"made": "for a test"})
    vocabulary.ensure_layer(store, "fold")
    with store.transaction():
        registry = vocabulary.TypeRegistry(store)
        source = sources.add_source(store, SourceInfo("texts/*.txt", 150, 0.0))
        token = character = 0
        sequences = []
        for number, (identifier, (text, metadata)) in enumerate(DOCUMENTS.items()):
            tokens = registry.number(words_of(text))
            sequences.append(vocabulary.layer_map(store, "fold")[tokens].tolist())
            start = np.zeros(1, dtype=np.int64)
            anchors = Anchors(start, start + character)
            numbers = np.array([number], dtype=np.int64)
            stream.append_block(
                store, stream.Block(number, token, tokens, start, start, start, numbers, False, anchors)
            )
            texts.append_text(store, character, text)
            place = (token, len(tokens), character, len(text))
            documents.append_documents(store, [DocumentRow(number, identifier, source, number, *place, metadata)])
            token, character = token + len(tokens), character + len(text)
        sources.note_records(store, source, len(DOCUMENTS))
        visibility.show_all(store)
        tokens_of = Counter(term for terms in sequences for term in terms)
        documents_of = Counter(term for terms in sequences for term in set(terms))
        terms = np.arange(vocabulary.term_count(store, "fold"), dtype=np.uint32)
        frequencies = (np.array([counts[int(term)] for term in terms]) for counts in (tokens_of, documents_of))
        vocabulary.append_word_counts(store, "fold", terms, *frequencies)
    write_tally(store, WINDOW, window_cells(sequences, 2))
    return store


def table_of(store: Store, spec: TallySpec) -> Cells:
    """A stored table, read through."""
    tally = tallies.find(store, spec)
    assert tally is not None
    cells: Cells = {}
    for block in tally.blocks():
        cells |= cells_of(block)
    return cells
