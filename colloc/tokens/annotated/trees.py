"""Heads of words: read, checked to be trees, and kept as offsets."""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from colloc.records import Int64Array
from colloc.tokens.annotated.lines import NUMBERS, Lines

UNSPECIFIED = -1
_HEADS = NUMBERS | {"0": 0, "_": UNSPECIFIED}
_INTEGER = re.compile(r"[1-9][0-9]{0,8}")


def read_heads(lines: Lines, column: Sequence[str]) -> Int64Array:
    """The heads as numbers of words in their sentence: 0 for the root, -1 where unspecified.

    Raises
    ------
    DataError
        A head that is no number, or beyond the sentence.
    """
    found = [*map(_HEADS.get, column)]
    if None in found:
        for offset in [offset for offset, number in enumerate(found) if number is None]:
            if not _INTEGER.fullmatch(column[offset]):
                lines.places.fail(f"HEAD {column[offset][:40]!r} is no number (0 for the root)", word=offset)
            found[offset] = int(column[offset])
    heads = np.array(found, np.int64)
    lengths = np.diff(lines.sentences, append=len(lines))
    beyond = np.flatnonzero(heads > np.repeat(lengths, lengths))
    if len(beyond):
        word = int(beyond[0])
        lines.places.fail(f"HEAD {heads[word]} is no word of its sentence", word=word)
    return heads


def head_offsets(lines: Lines, heads: Int64Array) -> NDArray[np.int32]:
    """Words from each word to its head, 0 where it has none.

    Raises
    ------
    DataError
        Heads that go round in a circle.
    """
    offsets = np.where(heads > 0, heads - lines.positions, 0)
    own = np.flatnonzero(heads == lines.positions)
    if len(own):
        lines.places.fail("a word that is its own head", word=int(own[0]))
    # Every word looks as far up again as it has come: 2^k steps after k rounds, so depth costs its logarithm only.
    above = np.arange(len(lines)) + offsets
    for _ in range(int(lines.positions.max(initial=1)).bit_length() + 1):
        unfinished = offsets[above] != 0
        if not unfinished.any():
            break
        above = above[above]
    else:
        word = int(np.flatnonzero(unfinished)[0])
        lines.places.fail("its heads go round in a circle and reach no root", word=word)
    return offsets.astype(np.int32)
