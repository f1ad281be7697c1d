"""Time and memory of the contrast of two halves of twelve million words, from a fresh process (the project's bound)."""

from __future__ import annotations

import json
import resource
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

import colloc

WORDS = 12_000_000
SECONDS, BYTES = 15.0, 2 * 2**30


@pytest.mark.bench
def test_two_halves_of_twelve_million_words(tmp_path: Path) -> None:
    random = np.random.default_rng(1)
    # A hundred documents; frequencies fall as ranks grow, as in running text; twenty words a sentence.
    ranks = np.minimum(random.zipf(1.2, size=(100, WORDS // 100)), 60_000)
    with (tmp_path / "w.jsonl").open("w", encoding="utf-8") as stream:
        for number, row in enumerate(ranks):
            words = [f"w{rank:x}" for rank in row]
            text = ". ".join(" ".join(words[at : at + 20]).capitalize() for at in range(0, len(words), 20))
            half = "a" if number % 2 else "b"
            stream.write(json.dumps({"id": f"d{number}", "half": half, "text": f"{text}."}) + "\n")
    store = tmp_path / "w.colloc"
    colloc.build(store, [str(tmp_path / "w.jsonl")])
    begin = time.perf_counter()
    asked = [sys.executable, "-m", "colloc", "contrast", str(store), "--pairs", "--this", "half=a", "--min-count", "5"]
    subprocess.run(asked, check=True, capture_output=True)
    took = time.perf_counter() - begin
    peak = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss * 1024
    assert peak < BYTES
    assert took < SECONDS, f"{took:.1f} s"
