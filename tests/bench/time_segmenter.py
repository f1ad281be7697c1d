"""How many tokens a second segmenting and numbering do, each alone, on one core.

    python tests/bench/time_segmenter.py FILE.jsonl.gz [MILLIONS_OF_CHARACTERS]

FILE holds JSON Lines with a ``text`` column. Times are the smallest processor
time of three rounds; numbering begins anew in each.
"""

from __future__ import annotations

import gzip
import json
import sys
import time
from collections.abc import Callable

from colloc.settings import SegmentSettings
from colloc.tokens.classes import code_points, kinds_of
from colloc.tokens.numbering import TypeNumberer
from colloc.tokens.segmenter import Segmenter
from colloc.tokens.sentences import sentence_breaks
from colloc.tokens.words import word_tokens

STRETCH = 1 << 20
ROUNDS = 3


def stretches(path: str, characters: int) -> list[str]:
    """Up to so many characters of text, in stretches of about a million."""
    found: list[str] = []
    with gzip.open(path, "rt", encoding="utf-8") as lines:
        for line in lines:
            text = json.loads(line)["text"]
            found += [text[start : start + STRETCH] for start in range(0, len(text), STRETCH)]
            if sum(map(len, found)) >= characters:
                break
    return found


def fastest(work: Callable[[], object]) -> float:
    """Smallest processor time in seconds."""
    times = []
    for _ in range(ROUNDS):
        began = time.process_time()
        work()
        times.append(time.process_time() - began)
    return min(times)


def main(path: str, millions: str = "20") -> None:
    texts = stretches(path, int(float(millions) * 1e6))
    segmenter = Segmenter(SegmentSettings())
    segments = [segmenter.segment(text) for text in texts]
    prepared = [(kinds_of(points), points) for points in map(code_points, texts)]
    tokens = sum(map(len, segments))

    def number() -> None:
        numberer = TypeNumberer()
        for part in segments:
            numberer.number(part)

    print(f"{sum(map(len, texts)):,} characters, {tokens:,} tokens")
    for name, work in {
        "code points and kinds": lambda: [kinds_of(code_points(text)) for text in texts],
        "words alone": lambda: [word_tokens(kinds) for kinds, _ in prepared],
        "sentences alone": lambda: [sentence_breaks(kinds, points, abbreviations=True) for kinds, points in prepared],
        "segment (all of it)": lambda: [segmenter.segment(text) for text in texts],
        "number": number,
    }.items():
        seconds = fastest(work)
        print(
            f"{name:22} {seconds / tokens * 1e6:6.3f} s a million tokens {tokens / seconds / 1e6:6.1f} million tokens/s"
        )


if __name__ == "__main__":
    main(*sys.argv[1:])
