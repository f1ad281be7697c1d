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
    names = annotation.columns
    places = Places(annotation, text, parts, line)
    lines = text.split("\n")
    if not lines[-1]:
        lines.pop()
    width = len(names)
    fields = np.fromiter(map(str.count, lines, repeat("\t")), np.int64, len(lines)) + 1
    blank = np.array([not line for line in lines], bool)
    hashes = np.array([line.startswith("#") for line in lines], bool)
    if names[0] != "id" and width > 1:
        hashes &= fields != width
    words = ~(blank | hashes)
    _check_widths(places, fields, words, names, lines)
    places.words = np.flatnonzero(words)
    columns = _by_column(lines, words, names)
    others: dict[int, str] = {}
    if "id" in columns:
        numbers = [*map(NUMBERS.get, columns["id"])]
        if None in numbers:
            others = _not_words(places, columns["id"], numbers)
            plain = np.ones(len(numbers), bool)
            plain[[*others]] = False
            at = places.words
            words[at[~plain]] = False
            places.words = at[plain]
            others = {int(at[offset]): kind for offset, kind in others.items()}
            columns = _by_column(lines, words, names)
            numbers = [number for number in numbers if number is not None]
        ids = np.array(numbers, np.int64)
    # The sentence a line is in: how many blank lines stand before it.
    sentence = np.cumsum(blank)[places.words]
    begins = np.flatnonzero(np.diff(sentence, prepend=-1))
    positions = np.arange(len(sentence)) - np.repeat(begins, np.diff(begins, append=len(sentence))) + 1
    if "id" in columns:
        wrong = np.flatnonzero(ids != positions)
        if len(wrong):
            word = int(wrong[0])
            places.fail(f"ID {ids[word]} where {positions[word]} comes next: number words from 1", word=word)
    next_words = np.concatenate([[0], np.cumsum(words)])
    result = Lines(
        columns, begins, positions, next_words[places.part_lines], [], [], [], places, places.number(len(lines))
    )
    for number in np.flatnonzero(~(words | blank)).tolist():
        _keep(result, lines[number], others.get(number, ""), number, int(next_words[number]))
    return result


def _by_column(lines: list[str], words: NDArray[np.bool_], names: tuple[str, ...]) -> dict[str, list[str]]:
    # All fields in one list: a list a line would cost twice the time, most of it collecting garbage.
    chosen = [*compress(lines, words.tolist())]
    fields = "\t".join(chosen).split("\t") if chosen else []
    return {name: fields[at :: len(names)] for at, name in enumerate(names)}


def _check_widths(
    places: Places,
    fields: Int64Array,
    words: NDArray[np.bool_],
    names: tuple[str, ...],
    lines: list[str],
) -> None:
    wrong = np.flatnonzero(words & (fields != len(names)))
    if not len(wrong):
        return
    line = int(wrong[0])
    if fields[line] == 1 and not lines[line].strip():
        places.fail("a line of spaces: sentences end with an empty line", line=line)
    found = f"{fields[line]:,} column{'' if fields[line] == 1 else 's'}"
    places.fail(f"{found} where {len(names)} belong, divided by tabs ({', '.join(names)})", line=line)


def _not_words(places: Places, ids: Sequence[str], numbers: list[int | None]) -> dict[int, str]:
    """Kinds of the rows that are ranges or empty nodes, by offset; large numbers are put into ``numbers``."""
    found = {}
    for offset in [offset for offset, number in enumerate(numbers) if number is None]:
        text = ids[offset]
        if _INTEGER.fullmatch(text):
            numbers[offset] = int(text)
        elif _RANGE.fullmatch(text):
            found[offset] = "range"
        elif _EMPTY_NODE.fullmatch(text):
            found[offset] = "empty"
        else:
            places.fail(f"ID {text[:40]!r} is neither a number, a range such as 3-4, nor 5.1", word=offset)
    return found


def _keep(lines: Lines, text: str, kind: str, line: int, word: int) -> None:
    """File a line that is not a word."""
    if kind == "range":
        lines.ranges.append(_range(lines, text.split("\t"), line, word))
    if kind == "empty":
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
