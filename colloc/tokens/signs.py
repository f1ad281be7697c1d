"""Hashtags and names with ``@`` kept whole, and marks as tokens."""

from __future__ import annotations

import numpy as np

from colloc.records import Int64Array
from colloc.tokens.classes import Points
from colloc.tokens.tables import having

_TAG_SIGNS = (ord("#"), ord("@"), 0xFF03, 0xFF20)
_TAG_CHARACTERS = "\\p{L}\\p{M}\\p{Nd}_\\u00B7\\u200C\\u200D\\u30FB"
"""Letters, marks, digits, underscore, and what joins them: Unicode Technical Standard 31, section 6 (hashtags)."""


def find_tags(points: Points) -> tuple[Int64Array, Int64Array]:
    """Starts and ends of hashtags and names: a sign that follows no word, and the characters that go with it."""
    places = np.flatnonzero(np.isin(points[:-1], _TAG_SIGNS))
    inside = having(_TAG_CHARACTERS)
    if len(places):
        follows = inside[points[np.maximum(places - 1, 0)]] & (places > 0)
        places = places[~follows & inside[points[places + 1]]]
    if not len(places):
        return places, places
    stops = np.append(np.flatnonzero(~inside[points]), len(points))
    ends = stops[np.searchsorted(stops, places + 1)]
    # A tag of digits and marks alone is a number: #1.
    letters = np.concatenate(([0], np.cumsum(having("\\p{L}")[points])))
    lettered = letters[ends] > letters[places + 1]
    return places[lettered], ends[lettered]


def find_marks(points: Points, starts: Int64Array, ends: Int64Array) -> tuple[Int64Array, Int64Array]:
    """Starts and ends of punctuation and symbols outside of the words; a row of the same mark is one token."""
    mark = having("\\p{P}\\p{S}")[points]
    depth = np.zeros(len(points) + 1, np.int64)
    np.add.at(depth, starts, 1)
    np.add.at(depth, np.minimum(ends, len(points)), -1)
    mark &= np.cumsum(depth)[:-1] == 0
    places = np.flatnonzero(mark)
    if not len(places):
        return places, places
    begins = np.ones(len(places), np.bool_)
    begins[1:] = (np.diff(places) > 1) | (points[places[1:]] != points[places[:-1]])
    first = places[begins]
    last = places[np.append(begins[1:], True)]
    return first, last + 1
