"""`pairs` with all columns of sureness on 12 million tokens; run with ``-m bench``."""

from __future__ import annotations

import os
from pathlib import Path
from time import perf_counter

import numpy as np
import pytest

import colloc
from tests.sureness.simulating import Topical

TOKENS = 12_000_000
SECONDS = 10.0


def novels(folder: Path) -> Path:
    """The open data where there are some, otherwise text that clusters by topic with a long tail of words."""
    data = os.environ.get("COLLOC_DATA")
    if data and (found := Path(data) / "novels.jsonl.gz").is_file():
        return found
    topical = Topical(topics=60, words=60_000)
    path = folder / "made.txt"
    with path.open("w", encoding="utf-8") as file:
        written, seed = 0, 0
        while written < TOKENS:
            corpus = topical.corpus(seed, 20, longest=40_000)
            for words in np.split(corpus.terms, corpus.sentences[1:]):
                lines = [" ".join(f"w{word}" for word in part) for part in np.split(words, range(20, len(words), 20))]
                file.write(".\n".join(lines) + ".\n\n")
            written, seed = written + len(corpus.terms), seed + 1
    return path


@pytest.mark.bench
def test_ten_thousand_candidates(tmp_path: Path) -> None:
    store = tmp_path / "large.colloc"
    colloc.build(store, str(novels(tmp_path)))
    colloc.floors(store)
    for measure in ("npmi", "g2"):
        times = []
        for _ in range(3):
            begun = perf_counter()
            answer = colloc.pairs(store, measure=measure, sure=True, limit=10_000)
            times.append(perf_counter() - begun)
            assert len(answer) == 10_000
        print(f"\npairs, {measure}, all columns of sureness for 10,000 candidates: {min(times):.1f} s")
        assert min(times) < SECONDS
