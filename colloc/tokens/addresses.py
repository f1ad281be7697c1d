"""URLs and e-mail addresses in text, found around ``://``, ``www.`` and ``@``.

A URL is a scheme (RFC 3986, section 3.1) and ``://``, or ``www.``, and all that
follows up to a space, a control character or one of ``<>"``, without closing
punctuation at its end. An e-mail address has the dot-atom form of RFC 5322,
section 3.2.3, and a domain name with at least one dot (RFC 1035, section 2.3.1),
both with letters of all scripts (RFC 6531).
"""

from __future__ import annotations

import re
from collections.abc import Callable

import numpy as np

from colloc.records import Int64Array
from colloc.tokens.classes import Points

_REST = re.compile(r"""[^\s<>"“”„«»\x00-\x1f]*""")
_SCHEME = frozenset("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789+.-")
_ATOM = frozenset("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789!#$%&'*+-/=?^_`{|}~.")
_DOMAIN = re.compile(r"[^\W_](?:[\w-]{0,62}\.)+[^\W\d_][\w-]{0,62}")
_CLOSING = ".,;:!?'’‘)]}…"
_OPENED_BY = {")": "(", "]": "[", "}": "{"}
_LONGEST_SCHEME = 32
_LONGEST_LOCAL_PART = 64


def _without_closing(text: str, start: int, end: int) -> int:
    """`end` moved before closing punctuation; a bracket opened inside the address stays."""
    depth = {
        close: text.count(close, start, end) - text.count(open_, start, end) for close, open_ in _OPENED_BY.items()
    }
    while end > start and text[end - 1] in _CLOSING:
        last = text[end - 1]
        if last in depth:
            if depth[last] <= 0:
                break
            depth[last] -= 1
        end -= 1
    return end


def _in_scheme(character: str) -> bool:
    return character in _SCHEME


def _in_local_part(character: str) -> bool:
    return character in _ATOM or (not character.isascii() and character.isalnum())


def _back(text: str, position: int, allowed: Callable[[str], bool], longest: int) -> int:
    """Where the run of allowed characters before `position` begins (at most `longest` of them)."""
    first = max(position - longest, 0)
    while position > first and allowed(text[position - 1]):
        position -= 1
    return position


def _url_at(text: str, mark: int, least: int, limit: int) -> tuple[int, int] | None:
    """The URL whose ``://`` stands at `mark`, between `least` and `limit`."""
    start = max(_back(text, mark, _in_scheme, _LONGEST_SCHEME), least)
    while start < mark and not (text[start].isascii() and text[start].isalpha()):
        start += 1
    if start == mark:
        return None
    end = _without_closing(text, mark + 3, _end_of(_REST, text, mark + 3, limit))
    return (start, end) if end > mark + 3 else None


def _www_at(text: str, mark: int, least: int, limit: int) -> tuple[int, int] | None:
    if mark < least or (mark > 0 and (text[mark - 1].isalnum() or text[mark - 1] in "_-")):
        return None
    end = _without_closing(text, mark, _end_of(_REST, text, mark, limit))
    return (mark, end) if end > mark + 4 else None


def _mail_at(text: str, mark: int, least: int, limit: int) -> tuple[int, int] | None:
    start = max(_back(text, mark, _in_local_part, _LONGEST_LOCAL_PART), least)
    while start < mark and not text[start].isalnum():
        start += 1
    end = _end_of(_DOMAIN, text, mark + 1, limit)
    return (start, end) if start < mark and end > mark + 1 else None


def _end_of(pattern: re.Pattern[str], text: str, start: int, limit: int) -> int:
    """Where the match at `start` ends; `start` itself where there is none."""
    found = pattern.match(text, start, limit)
    return found.end() if found else start


_MARKS = (("://", _url_at), ("www.", _www_at), ("WWW.", _www_at), ("@", _mail_at))


def _places(points: Points, mark: str) -> list[int]:
    """Where `mark` stands: array comparisons, which cost a fraction of searching the string.

    They are made for the last two characters, which hardly ever stand together but in a mark.
    """
    rest, ending = mark[:-2], mark[-2:]
    n = len(points) - len(mark) + 1
    found = points[len(rest) : len(rest) + n] == ord(ending[0])
    for offset, character in enumerate(ending[1:], len(rest) + 1):
        found &= points[offset : offset + n] == ord(character)
    places = np.flatnonzero(found) if found.any() else np.zeros(0, np.int64)
    for offset, character in enumerate(rest):
        places = places[points[places + offset] == ord(character)]
    return places.tolist()


def find_addresses(text: str, points: Points) -> tuple[Int64Array, Int64Array]:
    """Starts and ends of addresses, ascending and apart; of two that overlap, URLs come before e-mail addresses.

    Parameters
    ----------
    points : array
        Code points of `text`; those beyond its end are not looked at.
    """
    spans: list[tuple[int, int]] = []
    for mark, recognise in _MARKS:
        places = _places(points[: len(text)], mark) if len(text) >= len(mark) else []
        if not places:
            continue
        taken = iter([*spans, (len(text), len(text))])
        start, end = next(taken)
        least = 0
        for position in places:
            while end <= position:
                least, (start, end) = max(least, end), next(taken)
            if least <= position < start:
                # What reaches into the next address ends there, so that no stretch is looked at twice.
                span = recognise(text, position, least, start)
                if span is not None:
                    spans.append(span)
                    least = span[1]
        spans.sort()
    found = np.array(spans, np.int64).reshape(-1, 2)
    return found[:, 0].copy(), found[:, 1].copy()
