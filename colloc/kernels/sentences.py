"""Sentence ends in one pass over kinds of characters: the rules that ``colloc.tokens.sentences`` lays out."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.kernels.kernel import kernel

# Bits of what a kind is.
UPPER, LOWER, LETTER, NUMERIC, CLOSE, SPACE, CONTINUES, ATTACHED = (1 << bit for bit in range(8))
TERMINATOR, FULL_STOP, RETURN, FEED, SEPARATOR = (1 << bit for bit in range(8, 13))
_CASED = UPPER | LOWER
_LINE_END = RETURN | FEED | SEPARATOR
_END = TERMINATOR | FULL_STOP
_NO_BREAK_BEFORE = _LINE_END | CONTINUES | _END
_NOT_NEUTRAL = _CASED | LETTER | _LINE_END | _END
_NONE, _ONE = np.uint64(0), np.uint64(1)


@kernel("int64(Array(uint8, 1, 'C', True), Array(uint32, 1, 'C', True), int64, int64[::1], int64[::1], uint8[::1])")
def sentence_places(
    kinds: NDArray[np.uint8],
    traits: NDArray[np.uint32],
    first_end: int,
    places: NDArray[Any],
    stops: NDArray[Any],
    numeric: NDArray[np.uint8],
) -> int:
    """Write where sentences break, ascending, and return how many places there are.

    Parameters
    ----------
    kinds : uint8 array, shape (n,)
    traits : uint32 array, shape (256,)
        Bits of each kind.
    first_end : int
        Kinds from here on have a bit of ``TERMINATOR`` to ``SEPARATOR``, and no others have.
    places : int64 array, shape (n,)
    stops : int64 array, shape (n,)
        Where the full stop stands that makes a break, -1 where another sign does: it may end an abbreviation.
    numeric : uint8 array, shape (n,)
        Whether a digit stands at the place.
    """
    # Unsigned, since for indices with a sign the compiler adds a look whether they count from the end.
    n = np.uint64(len(kinds))
    count = _NONE
    i = _NONE
    while i < n:
        if kinds[i] < first_end:
            i += _ONE
            continue
        now = traits[kinds[i]]
        j = i + _ONE
        if now & _LINE_END:  # SB3, SB4
            if not (now & RETURN and j < n and traits[kinds[j]] & FEED):
                places[count] = np.int64(j)
                stops[count] = -1
                numeric[count] = 0
                count += _ONE
            i = j
            continue
        # SB5 lets what is attached count for nothing.
        while j < n and traits[kinds[j]] & ATTACHED:
            j += _ONE
        direct = j < n and not traits[kinds[j]] & (CLOSE | SPACE)
        while j < n and traits[kinds[j]] & (CLOSE | ATTACHED):
            j += _ONE
        while j < n and traits[kinds[j]] & (SPACE | ATTACHED):
            j += _ONE
        after = traits[kinds[j]] if j < n else np.uint32(0)
        breaks = j < n and not after & _NO_BREAK_BEFORE  # SB8a to SB11
        if breaks and now & FULL_STOP:
            if direct and after & NUMERIC:  # SB6
                breaks = False
            elif direct and after & UPPER:  # SB7
                k = i
                while k > _NONE:
                    k -= _ONE
                    before = traits[kinds[k]]
                    if not before & ATTACHED or k == _NONE or traits[kinds[k - _ONE]] & _LINE_END:
                        breaks = not before & _CASED
                        break
            if breaks:  # SB8
                k = j
                while k < n and not traits[kinds[k]] & _NOT_NEUTRAL:
                    k += _ONE
                breaks = not (k < n and traits[kinds[k]] & LOWER)
        if breaks:
            places[count] = np.int64(j)
            stops[count] = np.int64(i) if now & FULL_STOP else -1
            numeric[count] = 1 if after & NUMERIC else 0
            count += _ONE
        i += _ONE
    return int(count)
