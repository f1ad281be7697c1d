"""Lines of annotated text told apart: words, what ends sentences, and everything else."""

from __future__ import annotations

import re
from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import dataclass
from typing import NoReturn

import numpy as np
from numpy.typing import NDArray

from colloc.errors import DataError
from colloc.records import Annotation, Int64Array
from colloc.tokens.annotated.buffer import Buffer, Slices, dividers, whole_numbers

NOTHING = "_"
"""CoNLL-U's word for a field that is not specified."""
LONGEST = 2**16
"""Code points of one field."""
INTEGER = re.compile(r"[1-9][0-9]{0,8}")
_RANGE = re.compile(rb"([1-9][0-9]{0,8})-([1-9][0-9]{0,8})")
_EMPTY_NODE = re.compile(rb"(0|[1-9][0-9]{0,8})\.[1-9][0-9]{0,8}")
_CHECKED_APART = ("id", "head")
"""Columns whose empty fields are no numbers."""


@dataclass(frozen=True, slots=True)
class Part:
    """A document, or a part of one, in the text to be read."""

    start: int
    """Byte of the text."""
    line: int
    """Number of its first line in its source."""
    last: bool = True
    """Whether its document ends with it."""


@dataclass(frozen=True, slots=True)
class Ranges:
    """Multiword tokens: one surface token over several words. Arrays of shape (n_ranges,).

    Attributes
    ----------
    words, lengths : int64 arrays
        Offset of the first word, and how many there are.
    columns : dict of Slices
        The fields of their lines.
    """

    words: Int64Array
    lengths: Int64Array
    columns: dict[str, Slices]


@dataclass(frozen=True, slots=True)
class Others:
    """Lines that are not words, whole, in order, each with the word (offset) beside which it stands."""

    words: Int64Array
    lines: Slices


@dataclass(frozen=True, slots=True)
class Lines:
    """Text taken apart by lines.

    Attributes
    ----------
    columns : dict of Slices
        Fields of the words, by the name of the column; none is empty, but for those of ID and HEAD.
    sentences : int64 array
        Offsets of the words that begin a sentence, ascending.
    positions : int64 array
        1-based place of each word in its sentence.
    part_words : int64 array
        First word of each part.
    ranges : Ranges
    before, after : Others
        Lines that stand before a word (comments, ranges and some empty nodes), and behind one (empty nodes).
    """

    buffer: Buffer
    columns: dict[str, Slices]
    sentences: Int64Array
    positions: Int64Array
    part_words: Int64Array
    ranges: Ranges
    before: Others
    after: Others
    places: Places

    def __len__(self) -> int:
        return len(self.positions)

    def field(self, name: str, word: int) -> str:
        """What stands in a column of a word."""
        column = self.columns[name]
        start = int(column.starts[word])
        return self.buffer.text(start, start + int(column.lengths[word]))


class Places:
    """Where lines and words stand in their source: for messages."""

    def __init__(self, annotation: Annotation, part_lines: Int64Array, numbers: list[int]) -> None:
        self._annotation = annotation
        self._part_lines = part_lines.tolist()
        self._numbers = numbers
        self.words: Int64Array = np.zeros(0, np.int64)
        """Line (of the text, from 0) of each word."""

    def fail(self, message: str, *, line: int | None = None, word: int | None = None) -> NoReturn:
        """Raise a DataError that names the source and the line."""
        at = int(self.words[word]) if word is not None else int(line or 0)
        part = bisect_right(self._part_lines, at) - 1
        number = self._numbers[part] + at - self._part_lines[part]
        raise DataError(f"{self._annotation.source}:{number}: {message}")


def split_lines(text: bytes, parts: Sequence[Part], annotation: Annotation) -> Lines:
    """Take whole sentences apart.

    Parameters
    ----------
    text : bytes
        UTF-8; every line is ended by LF.
    parts : sequence of Part
        The first begins with the text.

    Raises
    ------
    DataError
        ``source:line: ...`` for a wrong number of columns, identifiers that are out of order, or empty fields.
    """
    return _Splitting(text, parts, annotation).lines()


class _Splitting:
    """One text being taken apart."""

    def __init__(self, text: bytes, parts: Sequence[Part], annotation: Annotation) -> None:
        self._names = annotation.columns
        self._buffer = Buffer(text)
        self._dividers, self._ends = dividers(self._buffer.bytes)
        """Of the dividers, those that end a line."""
        stops = self._dividers[self._ends]
        starts = np.zeros_like(stops)
        starts[1:] = stops[:-1] + 1
        self._all = Slices(starts, stops - starts)
        part_lines = np.searchsorted(stops, np.array([part.start for part in parts], np.int64))
        self._part_lines = part_lines
        self._places = Places(annotation, part_lines, [part.line for part in parts])
        self._range_ids: list[tuple[int, int, int]] = []
        """Line, first and last word of ranges."""
        self._node_ids: list[tuple[int, int]] = []
        """Line of empty nodes, and the word behind which they stand."""

    def lines(self) -> Lines:
        """All that is in the text."""
        places = self._places
        words, blank = self._kinds()
        others = ~(words | blank)
        ids = None
        if "id" in self._names:
            ids = self._numbered(words)
            others = ~(words | blank)
        places.words = np.flatnonzero(words)
        columns = self._columns(places.words)
        _check_fields(self._buffer, columns, places)
        # The sentence a line is in: how many blank lines stand before it.
        sentence = np.cumsum(blank)[places.words]
        begins = np.flatnonzero(np.diff(sentence, prepend=-1))
        positions = np.arange(1, len(sentence) + 1) - np.repeat(begins, np.diff(begins, append=len(sentence)))
        if ids is not None and (ids != positions).any():
            word = int(np.flatnonzero(ids != positions)[0])
            places.fail(f"ID {ids[word]} where {positions[word]} comes next: number words from 1", word=word)
        next_words = np.zeros(len(words) + 1, np.int64)
        np.cumsum(words, out=next_words[1:])
        after = self._after(next_words, positions)
        others[after] = False
        before = np.flatnonzero(others)
        return Lines(
            self._buffer,
            columns,
            begins,
            positions,
            next_words[self._part_lines],
            self._ranges(next_words, positions),
            Others(next_words[before], self._all.only(before)),
            Others(next_words[after] - 1, self._all.only(after)),
            places,
        )

    def _kinds(self) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """Which lines have as many columns as a word, and which are blank; all others must be comments."""
        names, width = self._names, len(self._names)
        comments = self._buffer.bytes[self._all.starts] == ord("#")
        blank = self._all.lengths == 0
        fields = np.diff(self._ends, prepend=-1)
        words = fields == width
        if width == 1:
            words &= ~(blank | comments)
        wrong = np.flatnonzero(~(words | comments | blank))
        if len(wrong):
            line = int(wrong[0])
            text = self._line(line)
            if text.isspace() and "\t" not in text:
                self._places.fail("a line of spaces: sentences end with an empty line", line=line)
            found = f"{fields[line]:,} column{'' if fields[line] == 1 else 's'}"
            self._places.fail(f"{found} where {width} belong, divided by tabs ({', '.join(names)})", line=line)
        return words, blank

    def _line(self, line: int) -> str:
        start = int(self._all.starts[line])
        return self._buffer.text(start, start + int(self._all.lengths[line]))

    def _columns(self, lines: Int64Array) -> dict[str, Slices]:
        """Fields of lines that have as many as there are columns."""
        first = self._ends[lines] - (len(self._names) - 1)
        starts = self._all.starts[lines]
        columns = {}
        for at, name in enumerate(self._names):
            stops = self._dividers[first + at]
            columns[name] = Slices(starts, stops - starts)
            starts = stops + 1
        return columns

    def _numbered(self, words: NDArray[np.bool_]) -> Int64Array:
        """Numbers of the words; ranges and empty nodes are taken from the ``words`` and kept apart."""
        lines = np.flatnonzero(words)
        at = self._names.index("id")
        first = self._ends[lines] - (len(self._names) - 1) + at
        starts = self._dividers[first - 1] + 1 if at else self._all.starts[lines]
        column = Slices(starts, self._dividers[first] - starts)
        numbers, other = whole_numbers(self._buffer, column)
        other |= numbers == 0
        rows = np.flatnonzero(other)
        starts, stops = column.starts[rows], (column.starts + column.lengths)[rows]
        data = self._buffer.data
        for row, line, start, stop in zip(*(one.tolist() for one in (rows, lines[rows], starts, stops)), strict=True):
            if match := _RANGE.fullmatch(data, start, stop):
                self._range_ids.append((line, int(match[1]), int(match[2])))
            elif match := _EMPTY_NODE.fullmatch(data, start, stop):
                self._node_ids.append((line, int(match[1])))
            elif INTEGER.fullmatch(text := self._buffer.text(start, stop)):
                numbers[row], other[row] = int(text), False
            elif not text.startswith("#"):  # else a comment that happens to hold as many tabs as a word
                self._places.fail(f"ID {text[:40]!r} is neither a number, a range such as 3-4, nor 5.1", line=line)
        words[lines[other]] = False
        return numbers[~other]

    def _after(self, next_words: Int64Array, positions: Int64Array) -> Int64Array:
        """Lines of the empty nodes that stand behind a word; the others stand at a sentence's beginning."""
        after = []
        for line, follows in self._node_ids:
            word = int(next_words[line])
            if follows != (int(positions[word - 1]) if follows and word else 0):
                name = self._line(line).split("\t")[self._names.index("id")]
                self._places.fail(f"empty node {name} does not stand after word {follows}", line=line)
            if follows:
                after.append(line)
        return np.array(after, np.int64)

    def _ranges(self, next_words: Int64Array, positions: Int64Array) -> Ranges:
        lines, first, last = np.array(self._range_ids, np.int64).reshape(-1, 3).T
        columns = self._columns(lines)
        words = next_words[lines]
        lengths = last - first + 1
        n = len(positions)
        padded = np.append(positions, -1)
        last_words = np.clip(words + lengths - 1, 0, n)
        misplaced = (lengths < 1) | (padded[words] != first) | (padded[last_words] != last)
        overlapping = np.zeros(len(lines), bool)
        overlapping[1:] = words[:-1] + lengths[:-1] > words[1:]
        for row in np.flatnonzero(misplaced | overlapping)[:1].tolist():
            wrong = "overlaps the one before it"
            if misplaced[row]:
                wrong = "does not stand before its words in the same sentence"
            self._places.fail(f"range {first[row]}-{last[row]} {wrong}", line=int(lines[row]))
        return Ranges(words, lengths, columns)


def _check_fields(buffer: Buffer, columns: dict[str, Slices], places: Places) -> None:
    """Raise DataError for a field that is empty or too long."""
    for name, column in columns.items():
        if name not in _CHECKED_APART and len(column) and not column.lengths.all():
            word = int(np.flatnonzero(column.lengths == 0)[0])
            places.fail(f"{name.upper()} is empty: write {NOTHING} where there is nothing to say", word=word)
        if column.lengths.max(initial=0) > LONGEST:
            for word in np.flatnonzero(column.lengths > LONGEST).tolist():
                start = int(column.starts[word])
                length = len(buffer.text(start, start + int(column.lengths[word])))
                if length > LONGEST:
                    places.fail(f"{name.upper()} has {length:,} characters, more than {LONGEST:,}", word=word)
