"""Texts to build stores of, and the content of a store in a form that can be compared."""

from __future__ import annotations

import json
import random
from collections import Counter
from pathlib import Path
from typing import Any

import numpy as np

from colloc.settings import TallySpec
from colloc.store import documents, stream, tallies, vocabulary
from colloc.store.opening import open_for_reading

WORDS = [
    "sea",
    "Sea",
    "fog",
    "bell",
    "naïve",
    "Straße",
    "well-known",
    "3.5",
    "it's",
    "ΣΟΦΟΣ",
    "σοφος",
    "lamp",
    "oil",
    "x",
]


def make_text(rng: random.Random, sentences: int) -> str:
    """Sentences of 1 to 12 words, with paragraph ends strewn in."""
    parts = []
    for _ in range(sentences):
        words = [
            rng.choice(WORDS) if rng.random() < 0.9 else f"w{rng.randrange(400)}" for _ in range(rng.randint(1, 12))
        ]
        parts.append(" ".join(words).capitalize() + rng.choice([". ", "! ", "? ", ".\n"]))
    return "".join(parts)


def write_corpus(
    path: Path, seed: int, n_documents: int, sentences: int = 20, prefix: str = "d"
) -> list[dict[str, Any]]:
    """A JSON Lines file of random documents; returns what was written."""
    rng = random.Random(seed)
    rows = [
        {"id": f"{prefix}{number}", "year": 1900 + number % 7, "text": make_text(rng, sentences)}
        for number in range(n_documents)
    ]
    path.write_text("".join(json.dumps(row, ensure_ascii=False) + "\n" for row in rows), encoding="utf-8")
    return rows


def content(path: Path, *, by_text: bool = False) -> dict[str, Any]:
    """What a store holds, without times and page layout.

    ``by_text`` names words instead of numbering them and leaves out words that
    no longer occur, so that stores with other type numbers can be compared.
    """
    with open_for_reading(path) as store:
        rows = list(documents.iterate_documents(store))
        result: dict[str, Any] = {
            "documents": [(row.identifier, row.n_tokens, row.n_characters, dict(row.metadata)) for row in rows],
        }
        for entry in tallies.tally_list(store):
            if entry.kept:
                result[entry.spec.to_json()] = _table(store, entry.spec, by_text)
        counts = vocabulary.word_counts(store, "fold")
        texts = vocabulary.term_texts(store, "fold")
        if by_text:
            result["words"] = {
                text: (int(tokens), int(docs))
                for text, tokens, docs in zip(texts, counts.tokens, counts.documents, strict=True)
                if tokens
            }
        else:
            result["words"] = list(zip(texts, counts.tokens.tolist(), counts.documents.tolist(), strict=True))
            result["stream"] = [
                (head.first_token, stream.read_block(store, head.number).tokens.tolist())
                for head in stream.block_heads(store)
            ]
    return result


def _table(store: Any, spec: TallySpec, by_text: bool) -> Any:
    tally = tallies.find(store, spec)
    assert tally is not None
    texts = vocabulary.term_texts(store, spec.layer)
    cells: Counter[tuple[Any, Any]] = Counter()
    for block in tally.blocks():
        for low, high, forward, backward in zip(
            block.low.tolist(), block.high.tolist(), block.forward.tolist(), block.backward.tolist(), strict=True
        ):
            first, second = (texts[low], texts[high]) if by_text else (low, high)
            cells[first, second] += forward
            cells[second, first] += backward
    margins = [
        {(texts[number] if by_text else number): int(side[number]) for number in np.flatnonzero(side).tolist()}
        for side in (tally.first, tally.second)
    ]
    return {pair: count for pair, count in cells.items() if count}, margins, tally.total
