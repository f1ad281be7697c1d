"""Unicode properties as whole-array look-ups: code point -> kind (one byte) -> whatever a rule asks.

The table comes from ``unicode_classes.json`` (see ``make_classes``). Kinds are
renumbered on loading so that one comparison finds a group: first those that attach
to the character before, last those that end a sentence, paragraph separators after
all others.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from functools import cache, reduce
from importlib.resources import files
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.kernels.characters import look_up
from colloc.kernels.switch import compiled

Kinds = NDArray[np.uint8]
Mask = NDArray[np.bool_]
Points = NDArray[np.unsignedinteger[Any]]

# Bits of ``Classes.word_flags``. A mid bit shifted right by three is the bit of the letters it joins.
LETTER, NUMERIC, CONNECTOR, MID_LETTER, MID_NUMBER, SOLO, UNCOMMON, BARE = (1 << bit for bit in range(8))
WORDISH = LETTER | NUMERIC | CONNECTOR

WORDISH_CLASSES = {
    "ALetter": LETTER,
    "Hebrew_Letter": LETTER,
    "Numeric": NUMERIC,
    "ExtendNumLet": CONNECTOR,
    "Katakana": CONNECTOR,
}
_MID_CLASSES = {
    "MidLetter": MID_LETTER,
    "MidNum": MID_NUMBER,
    "MidNumLet": MID_LETTER | MID_NUMBER,
    "Single_Quote": MID_LETTER | MID_NUMBER,
}
_ATTACHED = {"Extend", "Format", "ZWJ"}
_UNCOMMON = {*_ATTACHED, "Hebrew_Letter", "Katakana"}
_PARAGRAPH_ENDS = {"CR", "LF", "Sep"}
_TERMINATORS = {"STerm", "ATerm"}


@dataclass(frozen=True)
class Classes:
    """All look-up tables. Tables over kinds have 256 entries; unused ones are "Other"."""

    unicode: str
    kind_of: Kinds
    """Kind of each of the 0x110000 code points."""
    latin: bytes
    """Kinds of the first 256 code points, for ``bytes.translate``."""
    word: dict[str, Mask]
    """Word_Break value -> which kinds have it."""
    sentence: dict[str, Mask]
    """Sentence_Break value -> which kinds have it."""
    pictographic: Mask
    letter: Mask
    """General category L*."""
    spoken: Mask
    """General category L* or N*: what makes a segment a word."""
    word_flags: bytes
    first_free: int
    """Kinds before this one may attach to the character before (Extend, Format, ZWJ for words or sentences)."""
    first_terminator: int
    """Kinds from here on are STerm, ATerm or a paragraph separator."""
    first_paragraph_end: int
    space_kind: int
    """A kind that is a space for sentences."""

    def words(self, *names: str) -> Mask:
        """Which kinds have one of these Word_Break values."""
        return reduce(np.bitwise_or, (self.word[name] for name in names))

    def sentences(self, *names: str) -> Mask:
        """Which kinds have one of these Sentence_Break values."""
        return reduce(np.bitwise_or, (self.sentence[name] for name in names))


def _flags(word: str, category: str) -> int:
    spoken = category in ("L", "N")
    flags = WORDISH_CLASSES.get(word, 0) | _MID_CLASSES.get(word, 0)
    if flags & WORDISH and not spoken:
        flags |= BARE
    if spoken and not flags & WORDISH:
        flags |= SOLO
    if word in _UNCOMMON:
        flags |= UNCOMMON
    return flags


@cache
def classes() -> Classes:
    """The tables, read once (about 3 ms)."""
    table = json.loads(files("colloc.tokens").joinpath("unicode_classes.json").read_text(encoding="utf-8"))

    def rank(kind: list[str]) -> int:
        if kind[0] in _ATTACHED or kind[1] in _ATTACHED:
            return 0
        return 3 if kind[1] in _PARAGRAPH_ENDS else 2 if kind[1] in _TERMINATORS else 1

    order = sorted(range(len(table["kinds"])), key=lambda number: rank(table["kinds"][number]))
    kinds = [table["kinds"][number] for number in order]
    renumbered = np.empty(len(order), np.uint8)
    renumbered[order] = np.arange(len(order), dtype=np.uint8)
    lengths = np.diff(np.array([*table["starts"], 0x110000]))
    kind_of = np.repeat(renumbered[table["runs"]], lengths)
    ranks = [rank(kind) for kind in kinds]

    def which(column: int, value: object) -> Mask:
        found = np.zeros(256, np.bool_)
        found[: len(kinds)] = [kind[column] == value for kind in kinds]
        return found

    return Classes(
        unicode=table["unicode"],
        kind_of=kind_of,
        latin=kind_of[:256].tobytes(),
        word={str(name): which(0, name) for name in {kind[0] for kind in kinds}},
        sentence={str(name): which(1, name) for name in {kind[1] for kind in kinds}},
        pictographic=which(2, True),
        letter=which(3, "L"),
        spoken=which(3, "L") | which(3, "N"),
        word_flags=bytes(_flags(kind[0], kind[3]) for kind in kinds).ljust(256, b"\0"),
        first_free=ranks.index(1),
        first_terminator=ranks.index(2),
        first_paragraph_end=ranks.index(3),
        space_kind=int(kind_of[0x20]),
    )


def code_points(text: str) -> Points:
    """Code points of `text` in the narrowest array that holds them all, read-only, shape (len(text),)."""
    if text.isascii():
        return np.frombuffer(text.encode("ascii"), np.uint8)
    try:
        return np.frombuffer(text.encode("latin-1"), np.uint8)
    except UnicodeEncodeError:
        pass
    # Lone surrogates can stand in a Python string; "surrogatepass" lets them through unchanged.
    narrow = text.encode("utf-16-le", "surrogatepass")
    if len(narrow) == 2 * len(text):
        return np.frombuffer(narrow, "<u2")
    return np.frombuffer(text.encode("utf-32-le", "surrogatepass"), "<u4")


def kinds_of(points: Points) -> Kinds:
    """Kind of each code point, shape (len(points),)."""
    tables = classes()
    if points.dtype == np.uint8:
        return np.frombuffer(points.tobytes().translate(tables.latin), np.uint8)
    if points.dtype == np.uint16 and compiled():
        kinds = np.empty(len(points), np.uint8)
        look_up(points, tables.kind_of, kinds)
        return kinds
    high = np.flatnonzero(points > 255)
    if 4 * len(high) > len(points):
        return tables.kind_of[points]
    kinds = np.frombuffer(bytearray(points.astype(np.uint8).tobytes().translate(tables.latin)), np.uint8)
    kinds[high] = tables.kind_of[points[high]]
    return kinds


def translated(kinds: Kinds, table: bytes) -> Kinds:
    """``table[kind]`` for each kind; several times faster than fancy indexing."""
    return np.frombuffer(kinds.tobytes().translate(table), np.uint8)
