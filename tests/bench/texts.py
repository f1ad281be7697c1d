"""Texts to measure on: real English where there is some, else a stream that behaves like text.

Every text is plain UTF-8 with one sentence a line, so that engines which know no sentences count the same windows.
"""

from __future__ import annotations

import gzip
import json
import os
import re
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import BinaryIO

import numpy as np

DICTIONARY = Path("/usr/share/dictd/gcide.dict.dz")
"""Debian's package ``dict-gcide``: a dictionary, 40 MB of English."""

SENTENCE_END = re.compile(r"(?<=[.!?])[\"'”’)]*\s+(?=[\"'“‘(]?[A-Z])")

EXPONENT, OFFSET = 1.35, 8.0
"""Of the rank-frequency law p(r) ~ (r + OFFSET)^-EXPONENT (Mandelbrot 1953): the first word makes 4 % of the text."""

CHUNK = 1_000_000
SENTENCE_LENGTH = 20
LETTERS = b"bcdfghjklmnprstv", b"aeio"
LARGEST_RANK = 64**5 - 1


def _syllables() -> np.ndarray:
    onsets, vowels = (np.frombuffer(letters, np.uint8) for letters in LETTERS)
    return np.stack([np.repeat(onsets, len(vowels)), np.tile(vowels, len(onsets))], axis=1)


def draw_ranks(rng: np.random.Generator, size: int) -> np.ndarray:
    """Ranks (0 is the most frequent word) of an unbounded Zipf-Mandelbrot law, int64, shape (size,).

    By inversion of the continuous law's survival function (OFFSET / (OFFSET + r))^(EXPONENT - 1), so the vocabulary
    never ends and grows with the text as N^(1 / EXPONENT).
    """
    survival = 1.0 - rng.random(size)
    ranks = OFFSET * (survival ** (-1.0 / (EXPONENT - 1.0)) - 1.0)
    return np.minimum(ranks, LARGEST_RANK).astype(np.int64)


def spell(ranks: np.ndarray, ends: np.ndarray) -> bytes:
    """Words written as syllables, short ones for frequent ranks; a sentence ends where ``ends`` is true."""
    syllables = _syllables()
    digits = np.stack([(ranks >> shift) & 63 for shift in range(24, -1, -6)], axis=1)
    used = np.maximum.accumulate(digits > 0, axis=1)
    used[:, -1] = True
    letters = np.zeros((len(ranks), 12), np.uint8)
    letters[:, :10] = np.where(used[..., None], syllables[digits], 0).reshape(len(ranks), 10)
    letters[:, 10] = np.where(ends, ord("."), ord(" "))
    letters[:, 11] = np.where(ends, ord("\n"), 0)
    return letters[letters > 0].tobytes()


def write_stream(out: BinaryIO, *, tokens: int, seed: int) -> None:
    """Write ``tokens`` words drawn one by one, in sentences of geometric length; the same seed writes the same."""
    rng = np.random.default_rng(seed)
    for start in range(0, tokens, CHUNK):
        size = min(CHUNK, tokens - start)
        ends = rng.random(size) < 1 / SENTENCE_LENGTH
        ends[-1] = True
        out.write(spell(draw_ranks(rng, size), ends))


def _paragraphs(path: Path) -> Iterator[str]:
    if path.name.endswith(".jsonl.gz"):
        with gzip.open(path, "rt", encoding="utf-8") as lines:
            for line in lines:
                yield from json.loads(line)["text"].split("\n")
    elif path == DICTIONARY:
        with gzip.open(path, "rt", encoding="utf-8", errors="replace") as text:
            for entry in text.read().split("\n\n"):
                yield " ".join(entry.split())
    else:
        with path.open(encoding="utf-8") as text:
            yield from text


def real_sources() -> list[Path]:
    """The open texts that are on this machine: novels in the folder COLLOC_DATA, and a dictionary."""
    folder = os.environ.get("COLLOC_DATA")
    places = [Path(folder) / "novels.jsonl.gz"] if folder else []
    return [place for place in [*places, DICTIONARY] if place.is_file()]


def write_real(out: BinaryIO, sources: Sequence[Path], *, tokens: int | None = None) -> int:
    """Write the sources, one sentence a line, up to ``tokens`` words between spaces; return the number written."""
    written = 0
    for source in sources:
        for paragraph in _paragraphs(source):
            sentences = SENTENCE_END.sub("\n", paragraph.strip())
            if not sentences:
                continue
            written += len(sentences.split())
            out.write(sentences.encode() + b"\n")
            if tokens is not None and written >= tokens:
                return written
    return written
