"""Sentences of annotated text as arrays: types, columns of annotation, readable text, and what fits in no column."""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from operator import itemgetter
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from colloc.records import Annotation, Int64Array, UInt32Array
from colloc.tokens.annotated.lines import Lines, Part, split_lines
from colloc.tokens.annotated.surface import PARAGRAPH_END, paragraph_starts, surface
from colloc.tokens.annotated.trees import UNSPECIFIED, head_offsets, read_heads
from colloc.tokens.annotated.values import NOTHING, Changed, TripleNumberer, ValueNumberer, check_field

VALUE_COLUMNS = {"deprel": "relation", "xpos": "xpos", "feats": "feats"}
"""Columns of the input that are kept as numbers, and what they are called in the store."""
STRETCH = 2**16
"""Code points read at once: their strings stay in the processor's cache."""

Item = TypeVar("Item")
_IN_ARRAYS = {"id", "form", "lemma", "upos", "head", *VALUE_COLUMNS}


@dataclass(frozen=True, slots=True)
class Remainder:
    """What one part holds besides types and columns; words are offsets in the part.

    Attributes
    ----------
    texts : dict of list of str
        Fields of the other columns, a field a word; columns without any are left out.
    before, after : list of (int, str)
        Lines that are not words, with the word before or after which they stand.
    changed : list of (int, str, str)
        Word, column, and the field as it was read, where the arrays do not give it back.
    """

    texts: dict[str, list[str]]
    before: list[tuple[int, str]]
    after: list[tuple[int, str]]
    changed: list[Changed]


@dataclass(frozen=True, slots=True)
class Words:
    """What reading made of annotated text.

    Attributes
    ----------
    tokens : uint32 array, shape (n_words,)
        Local type numbers.
    sentences, paragraphs : int64 arrays
        Words that begin one.
    part_words : int64 array
        First word of each part.
    heads : int32 array or None
        Words from each word to its head, 0 for none; None where the text has no heads.
    values : dict of (uint32 array, list of str)
        Columns as numbers into the list beside them.
    text : str
        Readable: the words as they were written.
    starts, widths : int64 arrays, shape (n_words,)
        Code points of the words in ``text``.
    part_characters, part_lengths : int64 arrays
        Each part's place in ``text``.
    remainders : list of Remainder
        One a part.
    """

    tokens: UInt32Array
    sentences: Int64Array
    paragraphs: Int64Array
    part_words: Int64Array
    heads: NDArray[np.int32] | None
    values: dict[str, tuple[UInt32Array, list[str]]]
    text: str
    starts: Int64Array
    widths: Int64Array
    part_characters: Int64Array
    part_lengths: Int64Array
    remainders: list[Remainder]

    def __len__(self) -> int:
        return len(self.tokens)


def read_words(text: str, parts: Sequence[Part], annotation: Annotation, numberer: TripleNumberer) -> Words:
    """Read whole sentences; the first part begins with the text.

    Raises
    ------
    DataError
        ``source:line: ...`` for whatever is not as the format wants it.
    """
    reading = _Reading(annotation, numberer)
    line = 1
    starts = [part.start for part in parts]
    for begin, stop in _stretches(text):
        here = parts[bisect_left(starts, begin) : bisect_left(starts, stop)]
        relative = [Part(part.start - begin, part.line, part.last) for part in here]
        lines = split_lines(text[begin:stop], relative, annotation, line)
        reading.add(lines)
        line = lines.next_line
    return reading.finish(parts)


def _stretches(text: str) -> Iterator[tuple[int, int]]:
    """Where to cut between sentences."""
    begin = 0
    while begin < len(text):
        stop = text.rfind("\n\n", begin, begin + STRETCH) + 2
        if stop < 2:
            stop = text.find("\n\n", begin) + 2
        if stop < 2:
            stop = len(text)
        yield begin, stop
        begin = stop


class _Reading:
    """What has been read of a text so far."""

    def __init__(self, annotation: Annotation, numberer: TripleNumberer) -> None:
        names = annotation.columns
        self._numberer = numberer
        self._with_heads = "head" in names
        self._values = {name: ValueNumberer(name) for name in VALUE_COLUMNS if name in names}
        self._others: dict[str, list[str]] = {name: [] for name in names if name not in _IN_ARRAYS}
        self._arrays: dict[str, list[NDArray[np.integer]]] = {}
        self._texts: list[str] = []
        self._before: list[tuple[int, str]] = []
        self._after: list[tuple[int, str]] = []
        self._changed: list[tuple[int, tuple[str, str]]] = []
        self._gap = ""
        self._words = 0
        self._characters = 0

    def add(self, lines: Lines) -> None:
        """Take in the next stretch."""
        first = self._words
        tokens, changed = self._numberer.number(lines)
        self._keep(tokens=tokens)
        values = {name: numberer.number(lines) for name, numberer in self._values.items()}
        self._keep(**values)
        if self._with_heads:
            heads = read_heads(lines, lines.columns["head"])
            self._keep(heads=head_offsets(lines, heads))
            changed += self._rootless(lines, heads, values.get("deprel"))
        for name, fields in self._others.items():
            column = lines.columns[name]
            if "" in column:
                check_field(lines, name, "", column.index(""))
            fields += column
        paragraphs = paragraph_starts(lines)
        self._add_surface(lines, paragraphs)
        self._keep(
            sentences=lines.sentences + first, paragraphs=paragraphs + first, part_words=lines.part_words + first
        )
        self._before += [(word + first, line) for word, line in lines.before]
        self._after += [(word + first, line) for word, line in lines.after]
        self._changed += [(word + first, (name, field)) for word, name, field in sorted(changed)]
        self._words += len(lines)

    def _keep(self, **arrays: NDArray[np.integer]) -> None:
        for name, array in arrays.items():
            self._arrays.setdefault(name, []).append(array)

    def _add_surface(self, lines: Lines, paragraphs: Int64Array) -> None:
        if not len(lines):
            return
        found = surface(lines, paragraphs)
        if self._texts:
            gap = PARAGRAPH_END if len(paragraphs) and paragraphs[0] == 0 else self._gap
            self._texts.append(gap)
            self._characters += len(gap)
        self._keep(starts=found.starts + self._characters, widths=found.widths)
        self._texts.append(found.text)
        self._characters += len(found.text)
        self._gap = found.gap

    def _rootless(self, lines: Lines, heads: Int64Array, relations: UInt32Array | None) -> list[Changed]:
        """Heads of 0 without a relation, and unspecified heads with one: as offsets both are 0."""
        related = np.zeros(len(lines), bool)
        if relations is not None:
            nothing = self._values["deprel"].values.get(NOTHING)
            related = np.ones(len(lines), bool) if nothing is None else relations != nothing
        odd = ((heads == 0) & ~related) | ((heads == UNSPECIFIED) & related)
        column = lines.columns["head"]
        return [(word, "head", column[word]) for word in np.flatnonzero(odd).tolist()]

    def finish(self, parts: Sequence[Part]) -> Words:
        """All that was read."""
        if self._texts and not parts[-1].last:
            self._texts.append(self._gap)
        text = "".join(self._texts)
        arrays = {name: np.concatenate(list_) for name, list_ in self._arrays.items()}
        nothing = np.zeros(0, np.int64)
        part_words = arrays.get("part_words", np.zeros(len(parts), np.int64))
        tokens = arrays.get("tokens", np.zeros(0, np.uint32))
        starts, widths = arrays.get("starts", nothing), arrays.get("widths", nothing)
        characters, lengths = _part_characters(parts, part_words, starts, widths, len(text))
        return Words(
            tokens,
            arrays.get("sentences", nothing),
            arrays.get("paragraphs", nothing),
            part_words,
            arrays.get("heads", np.zeros(0, np.int32)) if self._with_heads else None,
            {
                VALUE_COLUMNS[name]: (arrays.get(name, np.zeros(0, np.uint32)), [*numberer.values])
                for name, numberer in self._values.items()
            },
            text,
            starts,
            widths,
            characters,
            lengths,
            self._remainders(part_words.tolist()),
        )

    def _remainders(self, part_words: list[int]) -> list[Remainder]:
        edges = [*part_words, self._words + 1]  # 1 more: for lines behind the last word
        before, after, changed = (_dealt(items, edges) for items in (self._before, self._after, self._changed))
        remainders = []
        for part, (begin, stop) in enumerate(pairwise(edges)):
            texts = {name: fields[begin:stop] for name, fields in self._others.items()}
            told = {name: fields for name, fields in texts.items() if set(fields) - {NOTHING}}
            odd = [(word, name, field) for word, (name, field) in changed[part]]
            remainders.append(Remainder(told, before[part], after[part], odd))
        return remainders


def _part_characters(
    parts: Sequence[Part], part_words: Int64Array, starts: Int64Array, widths: Int64Array, end: int
) -> tuple[Int64Array, Int64Array]:
    """Where each part's text begins and its length: to the next part's text, or its own end where its document ends."""
    begins = np.append(starts, end)[part_words]
    stops = np.append(begins[1:], end)
    words = np.diff(part_words, append=len(starts))
    for number, part in enumerate(parts):
        if part.last and words[number]:
            word = int(part_words[number] + words[number]) - 1
            stops[number] = starts[word] + widths[word]
    return begins, stops - begins


def _dealt(items: list[tuple[int, Item]], edges: list[int]) -> list[list[tuple[int, Item]]]:
    """Items in the order of their words, dealt out to parts; words are counted from the part's first."""
    at = [bisect_left(items, edge, key=itemgetter(0)) for edge in edges]
    return [
        [(word - edges[part], item) for word, item in items[begin:stop]]
        for part, (begin, stop) in enumerate(pairwise(at))
    ]
