"""Lines of annotated text told apart: words, what ends sentences, and everything else."""

from __future__ import annotations

import re
from bisect import bisect_right
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import compress, repeat
from typing import NoReturn

import numpy as np
from numpy.typing import NDArray

from colloc.errors import DataError
from colloc.records import Annotation, Int64Array

COMMENT, RANGE, EMPTY = "comment", "range", "empty node"
"""Kinds of lines that are not words."""
_SMALL = 2**10
NUMBERS = {str(number): number for number in range(1, _SMALL)}
"""Numbers as they are written, without zeros in front; those of longer sentences are read one by one."""
_INTEGER = re.compile(r"[1-9][0-9]{0,8}")
_RANGE = re.compile(r"([1-9][0-9]{0,8})-([1-9][0-9]{0,8})")
_EMPTY_NODE = re.compile(r"(0|[1-9][0-9]{0,8})\.([1-9][0-9]{0,8})")


@dataclass(frozen=True, slots=True)
class Part:
    """A document, or a part of one, in the text to be read."""

    start: int
    """Code point of the text."""
    line: int
    """Number of its first line in its source."""
    last: bool = True
    """Whether its document ends with it."""


@dataclass(frozen=True, slots=True)
class Range:
    """A multiword token: one surface token over several words."""

    first: int
    """Offset of its first word."""
    length: int
    fields: Sequence[str]


@dataclass(frozen=True, slots=True)
class Lines:
    """Text taken apart by lines.

    Attributes
    ----------
    columns : dict of lists of str
        Fields of the words, by the name of the column.
    sentences : int64 array
        Offsets of the words that begin a sentence, ascending.
    positions : int64 array
        1-based place of each word in its sentence.
    part_words : int64 array
        First word of each part.
    ranges : list of Range
    before, after : list of (int, str)
        Lines that are not words, whole, each with the word (offset) before or
        after which it stands; comments, ranges and empty nodes.
    """

    columns: dict[str, list[str]]
    sentences: Int64Array
    positions: Int64Array
    part_words: Int64Array
    ranges: list[Range]
    before: list[tuple[int, str]]
    after: list[tuple[int, str]]
    places: Places
    next_line: int

    def __len__(self) -> int:
        return len(self.positions)


class Places:
    """Where words stand in their source: for messages."""

    def __init__(self, annotation: Annotation, text: str, parts: Sequence[Part], line: int) -> None:
        self._annotation = annotation
        self._numbers = [line, *(part.line for part in parts)]
        self._first_lines = [0]
        before = 0
        for part in parts:
            self._first_lines.append(self._first_lines[-1] + text.count("\n", before, part.start))
            before = part.start
        self.part_lines = np.array(self._first_lines[1:], np.int64)
        self.words: Int64Array = np.zeros(0, np.int64)
        """Line (of the text, from 0) of each word."""

    def fail(self, message: str, *, line: int | None = None, word: int | None = None) -> NoReturn:
        """Raise a DataError that names the source and the line."""
        at = int(self.words[word]) if word is not None else int(line or 0)
        raise DataError(f"{self._annotation.source}:{self.number(at)}: {message}")

    def number(self, line: int) -> int:
        """What a line of the text is called in its source."""
        part = bisect_right(self._first_lines, line) - 1
        return self._numbers[part] + line - self._first_lines[part]


def split_lines(text: str, parts: Sequence[Part], annotation: Annotation, line: int) -> Lines:
    """Take whole sentences apart.

    Parameters
    ----------
    parts : sequence of Part
        Those that begin in ``text``.
    line : int
        Number of the first line in its source, where no part begins there.

    Raises
    ------
    DataError
        ``source:line: ...`` for a wrong number of columns, or identifiers that are out of order.
    """
    places = Places(annotation, text, parts, line)
    lines = text.split("\n")
    if not lines[-1]:
        lines.pop()
    words, blank, others = _kinds(places, lines, annotation.columns)
    places.words = np.flatnonzero(words)
    columns = _by_column(lines, words, annotation.columns)
    ids = None
    if "id" in columns:
        ids, columns, more = _numbered(places, columns)
        words[[*more]] = False
        others |= more
    # The sentence a line is in: how many blank lines stand before it.
    sentence = np.cumsum(blank)[places.words]
    begins = np.flatnonzero(np.diff(sentence, prepend=-1))
    positions = np.arange(len(sentence)) - np.repeat(begins, np.diff(begins, append=len(sentence))) + 1
    if ids is not None and (ids != positions).any():
        word = int(np.flatnonzero(ids != positions)[0])
        places.fail(f"ID {ids[word]} where {positions[word]} comes next: number words from 1", word=word)
    next_words = np.concatenate([[0], np.cumsum(words)])
    result = Lines(
        columns, begins, positions, next_words[places.part_lines], [], [], [], places, places.number(len(lines))
    )
    numbers = sorted(others)
    for number, word in zip(numbers, next_words[numbers].tolist(), strict=True):
        if others[number] == COMMENT:
            result.before.append((word, lines[number]))
        else:
            _keep(result, lines[number], others[number], number, word)
    return result


def _kinds(
    places: Places, lines: list[str], names: tuple[str, ...]
) -> tuple[NDArray[np.bool_], NDArray[np.bool_], dict[int, str]]:
    """Which lines are words, which are blank, and what the others are."""
    width = len(names)
    fields = np.fromiter(map(str.count, lines, repeat("\t")), np.int64, len(lines)) + 1
    words = fields == width
    if width == 1:
        words &= np.array([line != "" and not line.startswith("#") for line in lines], bool)
    blank = np.zeros(len(lines), bool)
    others = {}
    for number in np.flatnonzero(~words).tolist():
        line = lines[number]
        if not line:
            blank[number] = True
        elif line[0] == "#":
            others[number] = COMMENT
        elif line.isspace() and "\t" not in line:
            places.fail("a line of spaces: sentences end with an empty line", line=number)
        else:
            found = f"{fields[number]:,} column{'' if fields[number] == 1 else 's'}"
            places.fail(f"{found} where {width} belong, divided by tabs ({', '.join(names)})", line=number)
    return words, blank, others


def _by_column(lines: list[str], words: NDArray[np.bool_], names: tuple[str, ...]) -> dict[str, list[str]]:
    # All fields in one list: a list a line would cost twice the time, most of it collecting garbage.
    chosen = [*compress(lines, words.tolist())]
    fields = "\t".join(chosen).split("\t") if chosen else []
    return {name: fields[at :: len(names)] for at, name in enumerate(names)}


def _numbered(places: Places, columns: dict[str, list[str]]) -> tuple[Int64Array, dict[str, list[str]], dict[int, str]]:
    """Numbers of the words, their columns without the rows that are no words, and what those are, by line."""
    numbers = [*map(NUMBERS.get, columns["id"])]
    more: dict[int, str] = {}
    if None in numbers:
        found = _not_words(places, columns["id"], numbers)
        more = {int(places.words[offset]): kind for offset, kind in found.items()}
        if found:
            plain = [number is not None for number in numbers]
            columns = {name: [*compress(column, plain)] for name, column in columns.items()}
            numbers = [number for number in numbers if number is not None]
            places.words = places.words[plain]
    return np.array(numbers, np.int64), columns, more


def _not_words(places: Places, ids: Sequence[str], numbers: list[int | None]) -> dict[int, str]:
    """Kinds of the rows that are no words, by offset; large numbers are put into ``numbers``."""
    found = {}
    for offset in [offset for offset, number in enumerate(numbers) if number is None]:
        text = ids[offset]
        if _INTEGER.fullmatch(text):
            numbers[offset] = int(text)
        elif _RANGE.fullmatch(text):
            found[offset] = RANGE
        elif _EMPTY_NODE.fullmatch(text):
            found[offset] = EMPTY
        elif text.startswith("#"):
            found[offset] = COMMENT  # that happens to hold as many tabs as a word
        else:
            places.fail(f"ID {text[:40]!r} is neither a number, a range such as 3-4, nor 5.1", word=offset)
    return found


def _keep(lines: Lines, text: str, kind: str, line: int, word: int) -> None:
    """File a range or an empty node."""
    if kind == RANGE:
        lines.ranges.append(_range(lines, text.split("\t"), line, word))
    if kind == EMPTY:
        name = text.partition("\t")[0]
        node = _EMPTY_NODE.fullmatch(name)
        assert node is not None
        follows = int(node[1])
        at = int(lines.positions[word - 1]) if follows and word else 0
        if follows != at:
            lines.places.fail(f"empty node {name} does not stand after word {follows}", line=line)
        if follows:
            lines.after.append((word - 1, text))
            return
    lines.before.append((word, text))


def _range(lines: Lines, fields: list[str], line: int, word: int) -> Range:
    match = _RANGE.fullmatch(fields[0])
    assert match is not None
    first, last = int(match[1]), int(match[2])
    length = last - first + 1
    stop = word + length
    there = word < len(lines) and lines.positions[word] == first
    if length < 1 or not there or stop > len(lines) or lines.positions[stop - 1] != last:
        lines.places.fail(f"range {fields[0]} does not stand before its words in the same sentence", line=line)
    if lines.ranges and lines.ranges[-1].first + lines.ranges[-1].length > word:
        lines.places.fail(f"range {fields[0]} overlaps the one before it", line=line)
    return Range(word, length, fields)


def comments(lines: Lines) -> Iterator[tuple[int, str]]:
    """Comments, each with the offset of the word that follows."""
    return ((word, line) for word, line in lines.before if line.startswith("#"))
