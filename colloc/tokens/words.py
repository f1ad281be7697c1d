"""Word boundaries of UAX #29 (rules WB1 to WB999) on whole arrays.

Characters that rule WB4 attaches to the one before (Extend, Format, ZWJ) are
taken out first and the results mapped back. Then every rule is a statement about
neighbours: ``joined[i]`` says that no boundary lies between the kept characters
i and i + 1. Rules that few texts need are applied at the places where their
characters occur.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np

from colloc.kernels import words as loop
from colloc.kernels.switch import compiled
from colloc.records import Int64Array, UInt32Array
from colloc.tokens.arrays import any_within
from colloc.tokens.attaching import Attached, find_attached
from colloc.tokens.classes import (
    BARE,
    LETTER,
    MID_LETTER,
    MID_NUMBER,
    NUMERIC,
    SOLO,
    UNCOMMON,
    WORDISH,
    WORDISH_CLASSES,
    Kinds,
    Mask,
    classes,
    code_points,
    kinds_of,
    translated,
)

HYPHENS = (0x2D, 0x2010, 0x2011)


@dataclass
class _Joins:
    """Which kept characters hang together, and which belong to a word or may do so."""

    attached: Attached | None
    flags: Kinds
    joined: Mask
    tokenish: Mask
    doubtful: bool = False
    """Whether any token may turn out to hold no letter and no digit."""

    def spread(self) -> None:
        """A segment is tokenish as a whole or not at all."""
        bounds = np.concatenate(([0], np.flatnonzero(~self.joined) + 1))
        lengths = np.diff(np.append(bounds, len(self.tokenish)))
        self.tokenish = np.repeat(np.logical_or.reduceat(self.tokenish, bounds), lengths)
        self.doubtful = True


def _join(kinds: Kinds, flags: Kinds, hyphens: Int64Array | None) -> _Joins:
    """Rules WB4 to WB13b and WB3c, and single hyphens between letters or digits where `hyphens` are given."""
    tables = classes()
    attached: Attached | None = None
    uncommon = bool(np.bitwise_or.reduce(flags) & UNCOMMON)
    if uncommon:
        attached = find_attached(kinds, tables.words("Extend", "Format", "ZWJ"), tables.words("CR", "LF", "Newline"))
        if attached is not None:
            flags = flags[attached.kept]
    wordish = (flags & WORDISH) != 0
    joined = wordish[1:] & wordish[:-1]
    joins = _Joins(attached, flags, joined, (flags & (WORDISH | SOLO)) != 0)

    middle = np.flatnonzero((flags[1:-1] & (MID_LETTER | MID_NUMBER)) != 0) + 1
    between = flags[middle - 1] & flags[middle + 1] & (flags[middle] >> 3) & (LETTER | NUMERIC)
    _bind(joins, middle[between != 0])
    if uncommon:
        _join_uncommon(joins, kinds)
    if hyphens is not None and len(hyphens):
        inner = hyphens if attached is None else attached.inner(hyphens)
        inner = inner[(inner > 0) & (inner < len(flags) - 1)]
        spoken = ((flags & (WORDISH | SOLO)) != 0) & ((flags & BARE) == 0)
        _bind(joins, inner[spoken[inner - 1] & spoken[inner + 1]])
    return joins


def _bind(joins: _Joins, middle: Int64Array) -> None:
    """Join each of these characters to both neighbours."""
    joins.joined[middle - 1] = True
    joins.joined[middle] = True
    joins.tokenish[middle] = True


def _occur(kinds: Kinds, table: Mask) -> bool:
    """Whether a kind of the table occurs."""
    content = kinds.tobytes()
    return any(bytes([kind]) in content for kind in np.flatnonzero(table).tolist())


def _join_uncommon(joins: _Joins, kinds: Kinds) -> None:
    """Hebrew quotes (WB7a-c), Katakana (WB13) and pictographs after a joiner (WB3c)."""
    tables = classes()
    attached = joins.attached
    if _occur(kinds, tables.words("Hebrew_Letter", "Katakana")):
        inner = kinds if attached is None else kinds[attached.kept]
        hebrew = tables.word["Hebrew_Letter"][inner]
        after_hebrew = np.flatnonzero(hebrew[:-1] & tables.word["Single_Quote"][inner[1:]])
        joins.joined[after_hebrew] = True
        joins.tokenish[after_hebrew + 1] = True
        _bind(joins, np.flatnonzero(hebrew[:-2] & tables.word["Double_Quote"][inner[1:-1]] & hebrew[2:]) + 1)
        katakana = tables.word["Katakana"][inner]
        neither = ~(katakana | tables.word["ExtendNumLet"][inner])
        joins.joined &= ~((katakana[:-1] & neither[1:]) | (neither[:-1] & katakana[1:]))
    if attached is not None:
        # A few attached marks are letters by category (halfwidth voicing marks): they make their segment a word.
        marks = attached.positions[tables.spoken[kinds[attached.positions]]]
        joins.tokenish[attached.inner(marks) - 1] = True
    if _occur(kinds, tables.word["ZWJ"]):
        pictographs = np.flatnonzero(tables.word["ZWJ"][kinds[:-1]] & tables.pictographic[kinds[1:]]) + 1
        places = pictographs if attached is None else attached.inner(pictographs)
        joins.joined[places - 1] = True
        joins.spread()


def word_tokens(kinds: Kinds, hyphens: Int64Array | None = None) -> tuple[Int64Array, Int64Array]:
    """Segments between word boundaries that hold a letter or digit (general category L or N).

    Parameters
    ----------
    kinds : uint8 array, shape (n,)
        From ``kinds_of``.
    hyphens : int64 array or None
        Positions of hyphens, ascending: a single one between two letters or digits joins them.

    Returns
    -------
    starts, ends : int64 arrays, shape (n_tokens,)
    """
    if not len(kinds):
        return np.zeros(0, np.int64), np.zeros(0, np.int64)
    if compiled():
        starts, ends = np.empty(len(kinds) + 1, np.int64), np.empty(len(kinds) + 1, np.int64)
        count = loop.word_spans(kinds, _traits(), np.zeros(0, np.int64) if hyphens is None else hyphens, starts, ends)
        return starts[:count], ends[:count]
    joins = _join(kinds, translated(kinds, classes().word_flags), hyphens)
    first, last = joins.tokenish.copy(), joins.tokenish.copy()
    first[1:] &= ~joins.joined
    last[:-1] &= ~joins.joined
    starts, ends = np.flatnonzero(first), np.flatnonzero(last) + 1
    if joins.doubtful:
        suspects = np.arange(len(starts))
    else:
        bare = np.flatnonzero((joins.flags & BARE) != 0)
        places = np.searchsorted(starts, bare)
        suspects = places[np.append(starts, -1)[places] == bare]
    if joins.attached is not None:
        starts, ends = joins.attached.outer(starts), joins.attached.outer(ends)
    if len(suspects):
        silent = suspects[~any_within(kinds, classes().spoken, starts[suspects], ends[suspects])]
        starts, ends = np.delete(starts, silent), np.delete(ends, silent)
    return starts, ends


@cache
def _traits() -> UInt32Array:
    """What the compiled loop is told of each kind."""
    tables = classes()
    bits = {
        "ALetter": loop.LETTER,
        "Hebrew_Letter": loop.LETTER | loop.HEBREW,
        "Numeric": loop.NUMERIC,
        "ExtendNumLet": loop.CONNECTOR | loop.UNDERSCORE,
        "Katakana": loop.CONNECTOR | loop.KATAKANA,
        "MidLetter": loop.MID_LETTER,
        "MidNum": loop.MID_NUMBER,
        "MidNumLet": loop.MID_LETTER | loop.MID_NUMBER,
        "Single_Quote": loop.MID_LETTER | loop.MID_NUMBER | loop.SINGLE_QUOTE,
        "Double_Quote": loop.DOUBLE_QUOTE,
        "Extend": loop.ATTACHED,
        "Format": loop.ATTACHED,
        "ZWJ": loop.ATTACHED | loop.JOINER,
        "CR": loop.NEWLINE,
        "LF": loop.NEWLINE,
        "Newline": loop.NEWLINE,
    }
    traits = np.zeros(256, np.uint32)
    for value, bit in bits.items():
        traits[tables.word[value]] |= np.uint32(bit)
    wordish = tables.words(*WORDISH_CLASSES)
    for which, bit in (
        (tables.spoken, loop.SPOKEN),
        (tables.pictographic, loop.PICTOGRAPH),
        (wordish != tables.spoken, loop.ODD),
    ):
        traits[which] |= np.uint32(bit)
    traits[tables.kind_of[list(HYPHENS)]] |= np.uint32(loop.HYPHEN)
    return traits


def word_boundaries(text: str) -> Int64Array:
    """All word boundaries of UAX #29 without tailoring: offsets in code points, 0 and len(text) among them."""
    if not text:
        return np.zeros(0, np.int64)
    tables = classes()
    kinds = kinds_of(code_points(text))
    joins = _join(kinds, translated(kinds, tables.word_flags), None)
    kept = np.arange(len(kinds)) if joins.attached is None else np.flatnonzero(joins.attached.kept)
    inner = kinds[kept]
    joined = joins.joined
    joined |= tables.word["CR"][inner[:-1]] & tables.word["LF"][inner[1:]]  # WB3
    spaces = tables.word["WSegSpace"][inner]
    joined |= spaces[:-1] & spaces[1:] & (np.diff(kept) == 1)  # WB3d comes before WB4
    flags = tables.word["Regional_Indicator"][inner]
    run_start = np.maximum.accumulate(np.where(flags, -1, np.arange(len(flags))))
    pairs = flags[:-1] & flags[1:]
    joined |= pairs & ((np.arange(len(pairs)) - run_start[:-1]) % 2 == 1)  # WB15, WB16
    return np.concatenate(([0], kept[np.flatnonzero(~joined) + 1], [len(kinds)]))
