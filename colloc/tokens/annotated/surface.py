"""The text that annotated words were written as: readable, with the place of every word."""

from __future__ import annotations

import re
from dataclasses import dataclass
from itertools import chain

import numpy as np
from numpy.typing import NDArray

from colloc.records import Int64Array
from colloc.tokens.annotated.lines import Lines, comments

_BEGINS = re.compile(r"#[ \t]*new(?:par|doc)\b")
PARAGRAPH_END = "\n\n"
"""Stands between paragraphs and between documents."""


@dataclass(frozen=True, slots=True)
class Surface:
    """Readable text of some words.

    Attributes
    ----------
    text : str
        Up to the last word's end.
    gap : str
        What follows it, unless a paragraph begins.
    starts, widths : int64 arrays, shape (n_words,)
        Code points; the words of a multiword token that are not spelled out one after the other all have its place.
    """

    text: str
    gap: str
    starts: Int64Array
    widths: Int64Array


def paragraph_starts(lines: Lines) -> Int64Array:
    """Words that begin a paragraph: ``# newpar`` or ``# newdoc`` before their sentence, or ``NewPar=Yes`` in MISC."""
    marked = {word for word, line in comments(lines) if line[1:].split(maxsplit=1)[:1] in (["newpar"], ["newdoc"])} - {
        len(lines)
    }
    misc = lines.columns.get("misc", [])
    found = {value for value in set(misc) if "NewPar=Yes" in value.split("|")}
    if found:
        marked.update(offset for offset, value in enumerate(misc) if value in found)
    return np.union1d(np.array(sorted(marked), np.int64), lines.part_words[lines.part_words < len(lines)])


def surface(lines: Lines, paragraphs: Int64Array) -> Surface:
    """The words as they were written: a space behind each, unless ``SpaceAfter=No``.

    Multiword tokens stand in place of their words.
    """
    written = list(lines.columns["form"])
    misc = lines.columns.get("misc")
    gaps = [" "] * len(written)
    if misc is not None:
        close = {value for value in set(misc) if "SpaceAfter=No" in value.split("|")}
        gaps = ["" if value in close else " " for value in misc]
    shared = _place_ranges(lines, written, gaps)
    for word in paragraphs.tolist():
        if word:
            gaps[word - 1] = PARAGRAPH_END
    gap = ""
    if gaps:
        gap, gaps[-1] = gaps[-1], ""
    widths = np.fromiter(map(len, written), np.int64, len(written))
    steps = widths + np.fromiter(map(len, gaps), np.int64, len(gaps))
    starts = np.cumsum(steps) - steps
    text = "".join(chain.from_iterable(zip(written, gaps, strict=True)))
    for word, length in shared:
        starts[word : word + length], widths[word : word + length] = starts[word], widths[word]
    return Surface(text, gap, starts, widths)


def _place_ranges(lines: Lines, written: list[str], gaps: list[str]) -> list[tuple[int, int]]:
    """Write multiword tokens in place of their words; tells those whose words share one place."""
    form, misc = _index(lines, "form"), _index(lines, "misc")
    shared = []
    for one in lines.ranges:
        first, stop = one.first, one.first + one.length
        spelled = one.fields[form]
        if "".join(written[first:stop]) != spelled:
            written[first:stop] = [spelled, *[""] * (one.length - 1)]
            shared.append((first, one.length))
        no_space = misc >= 0 and "SpaceAfter=No" in one.fields[misc].split("|")
        gaps[first:stop] = [""] * (one.length - 1) + ["" if no_space else " "]
    return shared


def _index(lines: Lines, name: str) -> int:
    names = list(lines.columns)
    return names.index(name) if name in names else -1


def step_column(starts: Int64Array) -> NDArray[np.int32]:
    """Code points from each word's start to the next one's: what packs well; the first is 0."""
    return np.diff(starts, prepend=starts[:1]).astype(np.int32)
