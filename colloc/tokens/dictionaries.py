"""Words of scripts that are written without spaces, by the dictionaries of ICU.

UAX #29 leaves them to implementations (section 4, on complex context and
ideographs). Runs of one of these scripts are found first; all runs of a text
go to ICU in one piece, divided by line ends, and its words back to their
places. What stands between runs is not touched.
"""

from __future__ import annotations

from functools import cache

import numpy as np

from colloc.errors import MissingExtraError
from colloc.records import Int64Array
from colloc.tokens.arrays import any_within
from colloc.tokens.classes import Kinds, Mask, Points, classes
from colloc.tokens.tables import having

_SCRIPTS = ("Han", "Hiragana", "Katakana", "Thai", "Lao", "Khmer", "Myanmar")
_LONG_VOWELS = "\\u30FC\\uFF70"
"""The prolonged sound marks, which several scripts share."""
_DIVIDER = "\n"


def check_library() -> None:
    """Raise MissingExtraError where ICU is not installed."""
    try:
        import icu4py.breakers  # noqa: F401
    except ImportError as error:
        raise MissingExtraError("words by dictionary need ICU: pip install 'colloc[scripts]'") from error


@cache
def _members() -> Mask:
    return having("".join(f"\\p{{Script={name}}}" for name in _SCRIPTS) + _LONG_VOWELS)


def find_runs(points: Points) -> tuple[Int64Array, Int64Array]:
    """Starts and ends of the runs of these scripts, marks that stand on their letters included."""
    member = _members()[points]
    if member.any():
        mark = having("\\p{M}")[points] & ~member
        if mark.any():
            # A mark goes with the last character before it that is none.
            base = np.maximum.accumulate(np.where(mark, -1, np.arange(len(points))))
            member = member | (mark & (base >= 0) & member[base])
    edges = np.diff(member.astype(np.int8), prepend=0, append=0)
    return np.flatnonzero(edges == 1), np.flatnonzero(edges == -1)


def dictionary_words(text: str, kinds: Kinds, starts: Int64Array, ends: Int64Array) -> tuple[Int64Array, Int64Array]:
    """Starts and ends of the words in the runs, those without letter and digit left out."""
    from icu4py.breakers import WordBreaker

    if not len(starts):
        return starts, ends
    runs = [text[start:end] for start, end in zip(starts.tolist(), ends.tolist(), strict=True)]
    joined = _DIVIDER.join(runs)
    # The words are taken as strings: offsets of the library are in UTF-16.
    lengths = np.fromiter(map(len, WordBreaker(joined, "en")), np.int64)
    last = np.cumsum(lengths)
    first = last - lengths
    # Back to the places of the text: each run is moved by what was left out before it.
    inner = np.concatenate(([0], np.cumsum(ends - starts + 1)[:-1]))
    run = np.searchsorted(inner, first, "right") - 1
    divider = first == inner[run] + (ends - starts)[run]
    first, last, run = first[~divider], last[~divider], run[~divider]
    shift = (starts - inner)[run]
    word_starts, word_ends = first + shift, last + shift
    spoken = any_within(kinds, classes().spoken, word_starts, word_ends)
    return word_starts[spoken], word_ends[spoken]
