"""Sentences of annotated text as arrays: types, columns of annotation, readable text, and what fits in no column."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from colloc.records import Annotation, Int64Array, UInt8Array, UInt32Array
from colloc.tokens.annotated.buffer import column_text
from colloc.tokens.annotated.lines import NOTHING, Lines, Others, Part, split_lines
from colloc.tokens.annotated.surface import Misc, paragraph_starts, surface
from colloc.tokens.annotated.trees import UNSPECIFIED, head_offsets, read_heads
from colloc.tokens.annotated.values import TYPE_COLUMNS, VALUE_COLUMNS, Changed, FieldNumberer, by_appearance

STORED_AS = {"deprel": "relation", "xpos": "xpos", "feats": "feats"}
"""Columns of the input that are kept as numbers, and what they are called in the store."""
_IN_ARRAYS = {"id", "head", *TYPE_COLUMNS, *VALUE_COLUMNS}


@dataclass(frozen=True, slots=True)
class Remainder:
    """What one part holds besides types and columns; words are offsets in the part.

    Attributes
    ----------
    texts : dict of bytes
        Fields of the other columns, joined by line feeds, a field a word; columns without any are left out.
    before, after : (list of int, bytes)
        Lines that are not words: the word before or after which each stands, and all of them, ended by LF.
    changed : list of (int, str, str)
        Word, column, and the field as it was read, where the arrays do not give it back.
    """

    texts: dict[str, bytes]
    before: tuple[list[int], bytes]
    after: tuple[list[int], bytes]
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


def read_words(text: bytes, parts: Sequence[Part], annotation: Annotation, numberer: FieldNumberer) -> Words:
    """Read whole sentences (UTF-8, every line ended by LF); the first part begins with the text.

    Raises
    ------
    DataError
        ``source:line: ...`` for whatever is not as the format wants it.
    """
    lines = split_lines(text, parts, annotation)
    heads = head_numbers = None
    if "head" in lines.columns:
        head_numbers = read_heads(lines)
        heads = head_offsets(lines, head_numbers)
    tokens, fields, changed = numberer.number(lines)
    values = {name: by_appearance(numbers, numberer.texts(name)) for name, numbers in fields.items()}
    if head_numbers is not None:
        changed += _rootless(lines, head_numbers, values.get("deprel"))
    kept = {name: column_text(lines.buffer, column) for name, column in lines.columns.items() if name not in _IN_ARRAYS}
    misc = Misc(*kept["misc"]) if "misc" in kept else None
    paragraphs = paragraph_starts(lines, misc)
    shown = surface(lines, paragraphs, misc, goes_on=not parts[-1].last)
    characters, lengths = _part_characters(parts, lines.part_words, shown.starts, shown.widths, len(shown.text))
    return Words(
        tokens,
        lines.sentences,
        paragraphs,
        lines.part_words,
        heads,
        {STORED_AS[name]: value for name, value in values.items()},
        shown.text,
        shown.starts,
        shown.widths,
        characters,
        lengths,
        _remainders(lines, kept, sorted(changed)),
    )


def _rootless(lines: Lines, heads: Int64Array, relations: tuple[UInt32Array, list[str]] | None) -> list[Changed]:
    """Heads of 0 without a relation, and unspecified heads with one: as offsets both are 0."""
    related = np.zeros(len(lines), bool)
    if relations is not None:
        numbers, texts = relations
        related = numbers != texts.index(NOTHING) if NOTHING in texts else ~related
    odd = ((heads == 0) & ~related) | ((heads == UNSPECIFIED) & related)
    return [(word, "head", lines.field("head", word)) for word in np.flatnonzero(odd).tolist()]


def _part_characters(
    parts: Sequence[Part], part_words: Int64Array, starts: Int64Array, widths: Int64Array, end: int
) -> tuple[Int64Array, Int64Array]:
    """Where each part's text begins and its length: to the next part's text, or its own end where its document ends."""
    begins = np.append(starts, end)[part_words]
    stops = np.append(begins[1:], end)
    words = np.diff(part_words, append=len(starts))
    ending = np.array([part.last for part in parts], bool) & (words > 0)
    last = (part_words + words - 1)[ending]
    stops[ending] = starts[last] + widths[last]
    return begins, stops - begins


def _remainders(
    lines: Lines, kept: dict[str, tuple[UInt8Array, Int64Array]], changed: list[Changed]
) -> list[Remainder]:
    """What each part holds besides types and columns."""
    edges = np.append(lines.part_words, len(lines))
    texts = {name: _part_texts(lines, name, edges, *column) for name, column in kept.items()}
    before, after = _dealt(lines, lines.before), _dealt(lines, lines.after)
    changes: list[list[Changed]] = [[] for _ in range(len(edges) - 1)]
    for word, name, field in changed:
        part = int(np.searchsorted(lines.part_words, word, "right")) - 1
        changes[part].append((word - int(edges[part]), name, field))
    return [
        Remainder(
            {name: column[part] for name, column in texts.items() if column[part]},
            before[part],
            after[part],
            changes[part],
        )
        for part in range(len(edges) - 1)
    ]


def _part_texts(lines: Lines, name: str, edges: Int64Array, joined: UInt8Array, begins: Int64Array) -> list[bytes]:
    """The fields of a column by part; empty for parts that have nothing in it."""
    nothing = lines.columns[name].are(lines.buffer, NOTHING.encode())
    told = np.append(0, np.cumsum(~nothing))[edges]
    bounds = np.append(begins, len(joined))[edges].tolist()
    data = joined.tobytes()
    return [
        # The last field's line feed is left out.
        data[begin : stop - 1] if anything else b""
        for (begin, stop), anything in zip(pairwise(bounds), np.diff(told).tolist(), strict=True)
    ]


def _dealt(lines: Lines, others: Others) -> list[tuple[list[int], bytes]]:
    """Lines that are no words, dealt out to parts; words are counted from the part's first."""
    parts = lines.part_words
    # What stands behind a part's last word stands before the next one's first, where there is a next part.
    edges = np.append(np.searchsorted(others.words, parts), len(others.words))
    words = (others.words - np.repeat(parts, np.diff(edges))).tolist()
    joined, begins = column_text(lines.buffer, others.lines)
    bounds = np.append(begins, len(joined))[edges].tolist()
    data = joined.tobytes()
    places = zip(pairwise(edges.tolist()), pairwise(bounds), strict=True)
    return [(words[first:last], data[begin:stop]) for (first, last), (begin, stop) in places]
