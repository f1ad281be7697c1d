"""Counts of every sequence in real text, against a plain count of the stored words.

The text is the open data where ``COLLOC_DATA`` names its folder, else the demo corpora.
"""

from __future__ import annotations

import gzip
import os
from collections import Counter
from itertools import islice, pairwise
from pathlib import Path

import pytest

import colloc
from colloc.counts.spans import unit_starts
from colloc.store.stream import block_heads, read_block
from colloc.store.vocabulary import layer_map, term_texts

CORPORA = Path(__file__).resolve().parents[3] / "corpora_demo"
DATA = os.environ.get("COLLOC_DATA")


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("real")
    sources = [str(CORPORA / "logbooks.jsonl"), str(CORPORA / "notices.jsonl")]
    if DATA is not None:
        some = folder / "addresses.jsonl"
        with gzip.open(Path(DATA) / "addresses.jsonl.gz", "rt", encoding="utf-8") as lines:
            some.write_text("".join(islice(lines, 25)), encoding="utf-8")
        sources = [str(some)]
    colloc.build(folder / "real.colloc", sources, jobs=1)
    return folder / "real.colloc"


def plain(path: Path, longest: int) -> Counter[tuple[str, ...]]:
    """Every sequence, by the words of each sentence."""
    found: Counter[tuple[str, ...]] = Counter()
    with colloc.open_store(path) as store:
        texts = term_texts(store, "fold")
        terms = layer_map(store, "fold")
        heads = block_heads(store)
        assert len(heads) == 1  # else sentences would have to be joined across blocks
        block = read_block(store, 0)
        starts = [0, *unit_starts(block, "sentence").tolist(), len(block.tokens)]
        for begin, stop in pairwise(sorted(set(starts))):
            words = [texts[terms[kind]] for kind in block.tokens[begin:stop].tolist()]
            for n in range(2, longest + 1):
                found.update(tuple(words[i : i + n]) for i in range(len(words) - n + 1))
    return found


def test_every_sequence_of_two_to_six_words(store: Path) -> None:
    answer = colloc.expressions(
        store, min_count=5, min_docs=0, names="keep", common="keep", fragments="keep", limit=0, jobs=2
    )
    expected = {" ".join(words): count for words, count in plain(store, 6).items() if count >= 5}
    assert dict(zip(answer["expression"], answer["count"].tolist(), strict=True)) == expected
    assert len(expected) > 100
