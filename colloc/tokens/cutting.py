"""Where text can be cut so that segmenting the parts gives what segmenting the whole gives.

Two kinds of places are safe. After a paragraph end (a *hard break*) nothing looks
back and nothing looks ahead. Inside a sentence, the place after the second space
of ``space word space letter`` is safe: the letters on both sides stop every rule of
UAX #29 that looks far (SB8 looks ahead until a letter), the spaces stop word
rules, addresses and abbreviations, and the word is sure to be a token, so that
neither a sentence nor a paragraph begins with what comes after the cut.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from colloc.settings import SegmentSettings
from colloc.tokens.classes import classes, code_points, kinds_of
from colloc.tokens.patterns import LINE_ENDS
from colloc.tokens.sentences import paragraph_ends

_FIRST_LOOK = 4096
_SPACE = 0x20


def safe_cut(text: str, settings: SegmentSettings, at_least: int = 0) -> int:
    """The largest safe position in `text`, whatever text comes after it.

    After a hard break where there is one beyond `at_least`; else between a space
    and a letter inside a sentence, beyond `at_least`; else 0. With a user's
    pattern, which may look at anything in a paragraph, only hard breaks will do.
    """
    if _blank_lines(settings):
        hard = _widening(text, at_least, _last_blank_line)
    else:
        hard = max(text.rfind(character, at_least) for character in LINE_ENDS) + 1
        # A line feed may follow and belong to this carriage return.
        if hard == len(text) and text.endswith("\r"):
            hard = max(text.rfind(character, at_least, hard - 1) for character in LINE_ENDS) + 1
    if hard > at_least or settings.pattern is not None:
        return hard if hard > at_least else 0
    return _widening(text, at_least, lambda part: _last_soft_break(part, settings.max_token))


def is_hard_break(text: str, position: int, settings: SegmentSettings) -> bool:
    """Whether a paragraph surely ends before `position`.

    With ``line_ends="space"`` a blank line of more than a few thousand spaces is not recognised.
    """
    if not 0 < position <= len(text) or text[position - 1] not in LINE_ENDS:
        return False
    if text[position - 1] == "\r" and text[position : position + 1] in ("", "\n"):
        return False
    if not _blank_lines(settings):
        return True
    part = text[max(position - _FIRST_LOOK, 0) : position]
    return _last_blank_line(part) == len(part)


def _blank_lines(settings: SegmentSettings) -> bool:
    return settings.tailored and settings.line_ends == "space"


def _widening(text: str, at_least: int, find: Callable[[str], int]) -> int:
    """The last place that `find` sees, looking at ever longer ends of the text; 0 where none is beyond `at_least`.

    What makes a place may begin before `at_least`.
    """
    size = _FIRST_LOOK
    while True:
        first = max(len(text) - size, 0)
        found = find(text[first:])
        if found > 0 or first <= at_least - _FIRST_LOOK or first == 0:
            return first + found if found > 0 and first + found > at_least else 0
        size *= 4


def _last_blank_line(text: str) -> int:
    """The last place in `text` after a blank line or U+2029, else 0."""
    if not text:
        return 0
    points = code_points(text)
    ends, final = paragraph_ends(kinds_of(points), points, "space")
    explicit = points[ends] == 0x2029
    # A line end is final because the next one follows: the place is after that one.
    after_blank = np.zeros(len(ends), np.bool_)
    after_blank[1:] = final[:-1] & ~explicit[:-1]
    places = ends[after_blank | explicit] + 1
    if len(places) and places[-1] == len(text) and text.endswith("\r"):
        places = places[:-1]
    return int(places[-1]) if len(places) else 0


def _last_soft_break(text: str, longest: int) -> int:
    """The last place in `text` after ``space word space`` and before a letter, else 0.

    The word is of letters alone and not longer than `longest`.
    """
    if not text:
        return 0
    tables = classes()
    points = code_points(text)
    plain = tables.word["ALetter"] & tables.letter & tables.sentences("Upper", "Lower", "OLetter")
    letters = plain[kinds_of(points)]
    others = np.flatnonzero(~letters)
    before, after = others[:-1], others[1:]
    lengths = after - before - 1
    fits = (lengths > 0) & (lengths <= longest) & (points[before] == _SPACE) & (points[after] == _SPACE)
    fits &= letters[np.minimum(after + 1, len(text) - 1)] & (after + 1 < len(text))
    places = after[fits] + 1
    return int(places[-1]) if len(places) else 0
