"""Sentence boundaries of UAX #29 (rules SB1 to SB998), decided only where a sentence may end.

Those places are the sentence terminators and the paragraph separators, a few in a
hundred characters; all of them are looked at together.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from typing import Literal

import numpy as np

from colloc.kernels import sentences as loop
from colloc.kernels.switch import compiled
from colloc.records import Int64Array, UInt32Array
from colloc.tokens.abbreviations import after_abbreviation
from colloc.tokens.arrays import distinct
from colloc.tokens.attaching import Attached, find_attached
from colloc.tokens.classes import Kinds, Mask, Points, classes, code_points, kinds_of

_PARAGRAPH_SEPARATOR = 0x2029
_FULL_STOP = 0x2E
_ROUNDS = 16
_PAST_THE_END = 255
"""A kind that no character has: stands for the end of the text."""


@dataclass(frozen=True)
class Breaks:
    """Where sentences and paragraphs begin: offsets in code points, ascending, 0 left out, len(text) at most.

    Paragraph breaks are sentence breaks too. The end of the text is listed only
    where a paragraph separator stands before it.
    """

    sentences: Int64Array
    paragraphs: Int64Array


def _skip(kinds: Kinds, member: Mask, positions: Int64Array) -> Int64Array:
    """The first position from each of `positions` on whose kind is not a member (len(kinds) where none)."""
    result = positions.copy()
    active = np.arange(len(result))
    for _ in range(_ROUNDS):
        active = active[result[active] < len(kinds)]
        active = active[member[kinds[result[active]]]]
        if not len(active):
            return result
        result[active] += 1
    # Long runs are rare; one look at the whole text keeps them from taking a round a character.
    stops = np.append(np.flatnonzero(~member[kinds]), len(kinds))
    result[active] = stops[np.searchsorted(stops, result[active])]
    return result


def _at(kinds: Kinds, positions: Int64Array) -> Kinds:
    """Kinds at positions that may lie one past the end."""
    found = kinds[np.minimum(positions, len(kinds) - 1)]
    found[positions >= len(kinds)] = _PAST_THE_END
    return found


def paragraph_ends(kinds: Kinds, points: Points, line_ends: Literal["paragraph", "space"]) -> tuple[Int64Array, Mask]:
    """Line ends (CR LF counts once, at its LF) and which of them end a paragraph.

    With ``line_ends="space"`` those do that are U+2029 or are followed, but for
    spaces, by another line end.
    """
    tables = classes()
    ends = np.flatnonzero(kinds >= tables.first_paragraph_end)
    before_feed = tables.sentence["CR"][kinds[ends]] & tables.sentence["LF"][_at(kinds, ends + 1)]
    ends = ends[~before_feed]
    if line_ends == "paragraph":
        return ends, np.ones(len(ends), np.bool_)
    following = _at(kinds, _skip(kinds, tables.sentence["Sp"], ends + 1))
    blank = tables.sentences("CR", "LF", "Sep")[following]
    return ends, blank | (points[ends] == _PARAGRAPH_SEPARATOR)


def _terminated(kinds: Kinds, points: Points, attached: Attached | None, abbreviations: bool) -> Int64Array:
    """Rules SB6 to SB11: positions before which a sentence breaks after a terminator."""
    tables = classes()
    # Line ends that are mere spaces have been given another kind by now.
    terminators = np.flatnonzero((kinds >= tables.first_terminator) & (kinds < tables.first_paragraph_end))
    after_spaces = _skip(kinds, tables.sentence["Sp"], _skip(kinds, tables.sentence["Close"], terminators + 1))
    following = _at(kinds, after_spaces)
    goes_on = tables.sentences("CR", "LF", "Sep", "SContinue", "STerm", "ATerm")
    goes_on[_PAST_THE_END] = True
    breaks = ~goes_on[following]

    full_stop = np.flatnonzero(breaks & tables.sentence["ATerm"][kinds[terminators]])
    stops, targets, next_kind = terminators[full_stop], after_spaces[full_stop], following[full_stop]
    direct = targets == stops + 1
    before = kinds[np.maximum(stops - 1, 0)]
    cased = tables.sentences("Upper", "Lower")[before]
    stays = direct & tables.sentence["Numeric"][next_kind]  # SB6
    stays |= direct & cased & tables.sentence["Upper"][next_kind]  # SB7
    neutral = ~tables.sentences("OLetter", "Upper", "Lower", "CR", "LF", "Sep", "STerm", "ATerm")
    stays |= tables.sentence["Lower"][_at(kinds, _skip(kinds, neutral, targets))]  # SB8
    if abbreviations:
        asked = np.flatnonzero(~stays)
        dots = stops[asked] if attached is None else attached.outer(stops[asked])
        numeric = tables.sentence["Numeric"][next_kind[asked]]
        plain = points[dots] == _FULL_STOP
        stays[asked[plain]] = after_abbreviation(points, dots[plain], numeric[plain])
    breaks[full_stop[stays]] = False
    return after_spaces[breaks]


@cache
def _traits() -> UInt32Array:
    """What the compiled loop is told of each kind."""
    bits = {
        "Upper": loop.UPPER,
        "Lower": loop.LOWER,
        "OLetter": loop.LETTER,
        "Numeric": loop.NUMERIC,
        "Close": loop.CLOSE,
        "Sp": loop.SPACE,
        "SContinue": loop.CONTINUES,
        "Extend": loop.ATTACHED,
        "Format": loop.ATTACHED,
        "STerm": loop.TERMINATOR,
        "ATerm": loop.FULL_STOP,
        "CR": loop.RETURN,
        "LF": loop.FEED,
        "Sep": loop.SEPARATOR,
    }
    traits = np.zeros(256, np.uint32)
    for value, bit in bits.items():
        traits[classes().sentence[value]] = bit
    return traits


def _places(kinds: Kinds, points: Points, abbreviations: bool) -> Int64Array:
    """Where sentences break, found by a compiled loop."""
    places, stops = np.empty(len(kinds), np.int64), np.empty(len(kinds), np.int64)
    numeric = np.empty(len(kinds), np.uint8)
    count = loop.sentence_places(kinds, _traits(), classes().first_terminator, places, stops, numeric)
    places = places[:count]
    if not abbreviations:
        return places.copy()
    asked = np.flatnonzero(stops[:count] >= 0)
    asked = asked[points[stops[asked]] == _FULL_STOP]
    return np.delete(places, asked[after_abbreviation(points, stops[asked], numeric[asked] != 0)])


def sentence_breaks(
    kinds: Kinds,
    points: Points,
    line_ends: Literal["paragraph", "space"] = "paragraph",
    abbreviations: bool = False,
) -> Breaks:
    """Breaks between sentences and between paragraphs.

    Parameters
    ----------
    kinds, points : arrays, shape (n,)
        From ``kinds_of`` and ``code_points``.
    line_ends : str
        Whether each line end ends the paragraph, or only a blank line does.
    abbreviations : bool
        Whether sentences go on after the abbreviations of ``colloc.tokens.abbreviations``.
    """
    if not len(kinds):
        return Breaks(np.zeros(0, np.int64), np.zeros(0, np.int64))
    tables = classes()
    ends, final = paragraph_ends(kinds, points, line_ends)
    paragraphs = ends[final] + 1
    if len(paragraphs) < len(ends):
        spaces = ends[~final]
        feeds = spaces[tables.sentence["LF"][kinds[spaces]] & (spaces > 0)]
        returns = feeds[tables.sentence["CR"][kinds[feeds - 1]]] - 1
        kinds = kinds.copy()
        kinds[spaces] = kinds[returns] = tables.space_kind
    if compiled():
        return Breaks(_places(kinds, points, abbreviations), paragraphs)
    attached = find_attached(kinds, tables.sentences("Extend", "Format"), tables.sentences("CR", "LF", "Sep"))
    if attached is not None:
        kinds = kinds[attached.kept]
    sentences = _terminated(kinds, points, attached, abbreviations)
    if attached is not None:
        sentences = attached.outer(sentences)
    sentences = distinct(np.sort(np.concatenate((sentences, paragraphs))))
    return Breaks(sentences, paragraphs)


def sentence_boundaries(text: str) -> Int64Array:
    """All sentence boundaries of UAX #29 without tailoring: offsets in code points, 0 and len(text) among them."""
    if not text:
        return np.zeros(0, np.int64)
    points = code_points(text)
    found = sentence_breaks(kinds_of(points), points).sentences
    return np.concatenate(([0], found[found < len(text)], [len(text)]))
