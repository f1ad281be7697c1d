"""Heads of words: read, checked to be trees, and kept as offsets."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from colloc.records import Int64Array
from colloc.tokens.annotated.buffer import whole_numbers
from colloc.tokens.annotated.lines import INTEGER, NOTHING, Lines

UNSPECIFIED = -1


def read_heads(lines: Lines) -> Int64Array:
    """The heads as numbers of words in their sentence: 0 for the root, -1 where unspecified.

    Raises
    ------
    DataError
        A head that is no number, or beyond the sentence.
    """
    column = lines.columns["head"]
    heads, other = whole_numbers(lines.buffer, column)
    if other.any():
        unspecified = column.are(lines.buffer, NOTHING.encode())
        heads[unspecified] = UNSPECIFIED
        for word in np.flatnonzero(other & ~unspecified).tolist():
            text = lines.field("head", word)
            if not INTEGER.fullmatch(text):
                lines.places.fail(f"HEAD {text[:40]!r} is no number (0 for the root)", word=word)
            heads[word] = int(text)
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
    # Words that have reached a root stay there and are left alone.
    above = np.arange(len(lines)) + offsets
    climbing = np.flatnonzero(offsets[above])
    for _ in range(int(lines.positions.max(initial=1)).bit_length() + 1):
        if not len(climbing):
            break
        above[climbing] = above[above[climbing]]
        climbing = climbing[offsets[above[climbing]] != 0]
    else:
        lines.places.fail("its heads go round in a circle and reach no root", word=int(climbing[0]))
    return offsets.astype(np.int32)
