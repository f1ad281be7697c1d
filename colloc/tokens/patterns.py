"""Tokens by a pattern of the user's, run with a time limit."""

from __future__ import annotations

from functools import cache
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np

from colloc.errors import DataError, UsageError
from colloc.records import Int64Array

if TYPE_CHECKING:
    import regex

LINE_ENDS = "\n\r\x85\u2028\u2029"
"""What ends a paragraph, or a line of one."""
SECONDS = 10.0
"""Longest time that one stretch between paragraph ends may take."""


@cache
def compiled(pattern: str) -> regex.Pattern[str]:
    """The pattern, checked; ``UsageError`` where `regex` cannot read it or where it matches nothing at all."""
    import regex

    try:
        result = regex.compile(pattern)
    except regex.error as error:
        raise UsageError(f"the token pattern {pattern!r} is not a valid regular expression: {error}") from error
    if result.fullmatch(""):
        raise UsageError(f"the token pattern {pattern!r} matches the empty string; make it need one character")
    return result


def pattern_tokens(text: str, pattern: str, paragraphs: Int64Array) -> tuple[Int64Array, Int64Array]:
    """Matches in each paragraph of `text`.

    The pattern sees a paragraph by itself and without the line ends around it, so that no
    token crosses a paragraph end and none is made of line ends.

    Parameters
    ----------
    paragraphs : int64 array
        Where paragraphs begin, 0 left out.

    Raises
    ------
    DataError
        Where a paragraph takes longer than ``SECONDS``.
    """
    finder = compiled(pattern)
    bounds = [0, *paragraphs.tolist(), len(text)]
    spans: list[tuple[int, int]] = []
    for begin, end in pairwise(bounds):
        paragraph = text[begin:end].rstrip(LINE_ENDS)
        first = begin + len(paragraph)
        paragraph = paragraph.lstrip(LINE_ENDS)
        first -= len(paragraph)
        try:
            matches = finder.finditer(paragraph, timeout=SECONDS)
            spans.extend(
                (first + found.start(), first + found.end()) for found in matches if found.end() > found.start()
            )
        except TimeoutError as error:
            raise DataError(
                f"the token pattern {pattern!r} took longer than {SECONDS:g} s on a paragraph of {len(paragraph)} "
                f"characters that begins {paragraph[:40]!r}; make it simpler, without nested repetition"
            ) from error
    found_spans = np.array(spans, np.int64).reshape(-1, 2)
    return found_spans[:, 0].copy(), found_spans[:, 1].copy()
