"""What the formats say alike: sources in words, numbers in words, language tags checked."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator

from colloc.answers.judging.entries import Entries, Entry, Line
from colloc.answers.judging.matters import OPEN
from colloc.errors import UsageError

LANGUAGE = re.compile(
    r"(?:[A-Za-z]{2,3}(?:-[A-Za-z]{3}){0,3}|[A-Za-z]{4}|[A-Za-z]{5,8})(?:-[A-Za-z]{4})?(?:-(?:[A-Za-z]{2}|\d{3}))?"
    r"(?:-(?:[A-Za-z0-9]{5,8}|\d[A-Za-z0-9]{3}))*(?:-[0-9A-WY-Za-wy-z](?:-[A-Za-z0-9]{2,8})+)*"
    r"(?:-[Xx](?:-[A-Za-z0-9]{1,8})+)?|[Xx](?:-[A-Za-z0-9]{1,8})+"
)
"""The grammar of RFC 5646, 2.1, without the grandfathered tags."""


def check_language(tag: str) -> None:
    """Raise UsageError for what is no language tag (BCP 47)."""
    if not LANGUAGE.fullmatch(tag):
        raise UsageError(f"{tag!r} is no language tag: write en, de-CH, sr-Latn, or und where it is not known")


def source_in_words(line: Line) -> str:
    """Metadata of the document of an example, in the order of the metadata; the identifier is given apart."""
    return "; ".join(f"{key}: {value}" for key, value in line.metadata.items() if value is not None)


def figures_in_words(entry: Entry) -> str:
    """Counts and scores of an entry on one line; the scores to their last digit."""
    figures = entry.figures
    words = ", ".join(
        f"{word} {count}" for word, count in zip(entry.matter.words, figures.word_counts, strict=True) if count
    )
    parts = [f"joint {figures.joint}", f"documents {figures.documents}", f"frequencies {words}" if words else ""]
    parts += [f"{name} {value!r}" for name, value in figures.scores.items()]
    return "; ".join(part for part in parts if part)


def finite_scores(entry: Entry) -> Iterator[tuple[str, float]]:
    """Scores that every format can write."""
    yield from ((name, value) for name, value in entry.figures.scores.items() if math.isfinite(value))


def words_of(entries: Entries) -> dict[tuple[str, str], int]:
    """Every word of the entries, by layer and text, with its frequency; open places left out."""
    found: dict[tuple[str, str], int] = {}
    for entry in entries.entries:
        for word, count in zip(entry.matter.words, entry.figures.word_counts, strict=True):
            if word != OPEN:
                found[entry.matter.layer, word] = count
    return found
