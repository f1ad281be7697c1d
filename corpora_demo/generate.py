"""Writes, or checks, the demo corpora: ``python corpora_demo/generate.py [--check]``.

As a module, `documents` yields any number of documents of the same language, for
simulations, and `truths` tells what is true of that language.
"""

from __future__ import annotations

import argparse
import json
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

if not __package__:  # run as a script: the package's parent must be on the path
    sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

import numpy as np

from corpora_demo.contexts import BODY_SENTENCES, FIRST_YEAR, GENRES, YEARS, authors_of
from corpora_demo.items import truths
from corpora_demo.model import BURST_ROOT, ROOTS, model
from corpora_demo.table import with_table
from corpora_demo.vocabulary import AUTHORS, HABIT_AUTHOR, TOPICS

HERE = Path(__file__).resolve().parent
SEED = 1871
N_DOCUMENTS = 600
BURST_SENTENCES = 40
"""Sentences with the repeated phrase that the talkative document has besides its own."""
BATCH = 512
README = "README.md"
FILES = {"log": "logbooks.jsonl", "notice": "notices.jsonl"}

STATION_OF = {author.name: author.station for author in AUTHORS}


def talkative_number(n_documents: int) -> int:
    """Number (from 0) of the talkative document: the log in the middle of the corpus."""
    return n_documents // 2 // len(GENRES) * len(GENRES)


def identifier(number: int) -> str:
    """Identifier of a document: its genre, and its number in the genre from 1."""
    return f"{GENRES[number % len(GENRES)]}-{number // len(GENRES) + 1:04d}"


def documents(seed: int, n_documents: int, bursty: bool = True) -> Iterator[dict[str, str | int]]:
    """Yield documents with the keys id, genre, year, author, station, text, in order of time, genres taking turns.

    The same arguments always give the same documents. Years are dealt evenly. With
    `bursty`, the log in the middle of the corpus is the talkative one. Memory stays
    bounded, whatever `n_documents`.
    """
    random = np.random.default_rng(seed)
    talkative = talkative_number(n_documents) if bursty else -1
    for start in range(0, n_documents, BATCH):
        yield from _batch(random, range(start, min(start + BATCH, n_documents)), n_documents, talkative)


def _batch(
    random: np.random.Generator, numbers: range, n_documents: int, talkative: int
) -> Iterator[dict[str, str | int]]:
    language = model()
    rows: list[dict[str, str | int]] = []
    roots: list[int] = []
    contexts, stations, lengths = [], [], []
    draws = random.random((len(numbers), 3))
    for number, (of_author, of_topic, of_length) in zip(numbers, draws.tolist(), strict=True):
        genre = GENRES[number % len(GENRES)]
        year = FIRST_YEAR + number * len(YEARS) // n_documents
        names = authors_of(genre, year)
        author = names[int(of_author * len(names))]
        topic = int(of_topic * len(TOPICS[genre]))
        least, largest = BODY_SENTENCES[genre]
        body = least + int(of_length * (largest - least + 1))
        opening, middle, closing = (language.sampler.names[name] for name in ROOTS[genre])
        burst = [language.sampler.names[BURST_ROOT]] * (BURST_SENTENCES if number == talkative else 0)
        sentences = [opening, *[middle] * body, *burst, closing]
        roots += sentences
        lengths.append(len(sentences))
        contexts.append(language.contexts.number(genre, year, topic, author == HABIT_AUTHOR))
        stations.append(language.sampler.word_numbers[STATION_OF[author]])
        rows.append(
            {
                "id": identifier(number),
                "genre": genre,
                "year": year,
                "author": author,
                "station": STATION_OF[author],
            }
        )
    counts = np.array(lengths)
    of_sentence = np.repeat(np.array(contexts), counts)
    words, sentence = language.sampler.sample(random, np.array(roots), of_sentence)
    # A new paragraph begins with the first sentence, the second, the last, and a quarter of those between.
    paragraphs = random.random(len(roots)) < 0.25
    ends = np.cumsum(counts)
    for place in (ends - counts, ends - counts + 1, ends - 1):
        paragraphs[place] = True
    pieces = language.sampler.write(words, sentence, np.repeat(np.array(stations), counts), paragraphs)
    stops = np.searchsorted(sentence, ends).tolist()
    begin = 0
    for row, stop in zip(rows, stops, strict=True):
        row["text"] = "".join(pieces[begin:stop])[1:]
        begin = stop
        yield row


def made_files() -> dict[str, str]:
    """Names and contents of the committed files (of the README, only the table is made)."""
    lines: dict[str, list[str]] = {genre: [] for genre in GENRES}
    for document in documents(SEED, N_DOCUMENTS):
        lines[str(document["genre"])].append(json.dumps(document, ensure_ascii=False) + "\n")
    made = {FILES[genre]: "".join(lines[genre]) for genre in GENRES}
    talkative = identifier(talkative_number(N_DOCUMENTS))
    committed = {"seed": SEED, "documents": N_DOCUMENTS, "talkative_document": talkative}
    true: dict[str, Any] = {"committed": committed, **truths()}
    made["truths.json"] = json.dumps(true, indent=1, ensure_ascii=False) + "\n"
    made[README] = with_table((HERE / README).read_text(encoding="utf-8"), true["items"])
    return made


def different_files(folder: Path = HERE) -> list[str]:
    """Names of committed files that are missing or not exactly what the generator makes."""
    made = made_files()
    return [
        name
        for name, content in made.items()
        if not (folder / name).is_file() or (folder / name).read_bytes() != content.encode()
    ]


def main(arguments: list[str] | None = None) -> int:
    """Write the files, or with ``--check`` only compare; returns the exit code."""
    parser = argparse.ArgumentParser(description="Write the demo corpora and their truths.")
    parser.add_argument("--check", action="store_true", help="only say whether the files are what this program makes")
    options = parser.parse_args(arguments)
    if not options.check:
        for name, content in made_files().items():
            (HERE / name).write_bytes(content.encode())
            print(f"{name}: written")
        return 0
    wrong = different_files()
    for name in wrong:
        print(f"{name}: differs from what generate.py makes; run it without --check")
    if not wrong:
        print("all files are what generate.py makes")
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main())
