"""Word tokens in one pass over kinds of characters: the rules of UAX #29 that ``colloc.tokens.words`` lays out."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.kernels.kernel import kernel

# Bits of what a kind is.
LETTER, NUMERIC, CONNECTOR, SPOKEN, NEWLINE = (1 << bit for bit in range(5))
# Those that need a closer look. A mid bit shifted right by five is the bit of the letters it joins.
MID_LETTER, MID_NUMBER, SINGLE_QUOTE, DOUBLE_QUOTE, HYPHEN = (1 << bit for bit in range(5, 10))
# Those that the quick loop leaves to the other one. ODD: spoken, but no part of words, or the reverse.
ATTACHED, HEBREW, KATAKANA, UNDERSCORE, JOINER, PICTOGRAPH, ODD = (1 << bit for bit in range(10, 17))
MID_SHIFT = 5
_WORDISH = LETTER | NUMERIC | CONNECTOR
_LETTER_OR_NUMERIC = LETTER | NUMERIC
_LOOKS_AHEAD = MID_LETTER | MID_NUMBER | DOUBLE_QUOTE
_BESIDE_KATAKANA = KATAKANA | UNDERSCORE
_NONE, _ONE = np.uint64(0), np.uint64(1)


@kernel(
    "int64(Array(uint8, 1, 'C', True), Array(uint32, 1, 'C', True), Array(int64, 1, 'C', True), int64[::1], int64[::1])"
)
def word_spans(
    kinds: NDArray[np.uint8],
    traits: NDArray[np.uint32],
    hyphens: NDArray[Any],
    starts: NDArray[Any],
    ends: NDArray[Any],
) -> int:
    """Write where the tokens begin and end, and return how many there are.

    Parameters
    ----------
    kinds : uint8 array, shape (n,)
    traits : uint32 array, shape (256,)
        Bits of each kind.
    hyphens : int64 array
        Positions, ascending, of hyphens that join what is spoken on both sides; their kinds have the bit ``HYPHEN``.
    starts, ends : int64 arrays, shape (n + 1,)
        To be written.
    """
    # Unsigned, since for indices with a sign the compiler adds a look whether they count from the end.
    n = np.uint64(len(kinds))
    n_hyphens = np.uint64(len(hyphens))
    count = _NONE  # tokens that have begun
    hyphen = _NONE  # the next of the hyphens
    i = _NONE
    while True:
        # Quick: letters, digits and what stands between words, without a branch for each word.
        ended = count
        inside = _NONE
        while i < n:
            now = traits[kinds[i]]
            within = _ONE if now & _WORDISH else _NONE
            if now >= MID_LETTER:
                if now >= ATTACHED:
                    break
                if inside and i + _ONE < n:
                    after = traits[kinds[i + _ONE]]
                    if after >= ATTACHED:
                        break
                    before = traits[kinds[i - _ONE]]
                    if before & after & (now >> MID_SHIFT) & _LETTER_OR_NUMERIC:
                        within = _ONE
                    elif now & HYPHEN and after & SPOKEN:
                        while hyphen < n_hyphens and hyphens[hyphen] < np.int64(i):
                            hyphen += _ONE
                        if hyphen < n_hyphens and hyphens[hyphen] == np.int64(i):
                            within = _ONE
            starts[count] = np.int64(i)
            count += within & ~inside
            ends[ended] = np.int64(i)
            ended += inside & ~within
            inside = within
            i += _ONE
        if i == n:
            if inside:
                ends[ended] = np.int64(n)
            return int(count)
        # With care, until a character that ends a word for certain.
        count = ended
        begin = starts[count] if inside else max(np.int64(i) - 1, 0)
        spoken = SPOKEN if inside else 0
        before = traits[kinds[i - _ONE]] if i > _NONE else np.uint32(0)  # of the last one not attached to another
        previous = before
        bound = False  # whether the next one is joined, whatever it is
        while i < n:
            now = traits[kinds[i]]
            if now & ATTACHED and i > _NONE and not previous & NEWLINE:  # WB4
                spoken |= now & SPOKEN
                previous = now
                i += _ONE
                continue
            joined = bound
            bound = False
            if now & _WORDISH and before & _WORDISH:  # WB5, WB8 to WB10, WB13 to WB13b
                apart = (now & KATAKANA and not before & _BESIDE_KATAKANA) or (
                    before & KATAKANA and not now & _BESIDE_KATAKANA
                )
                joined = joined or not apart
            elif (now & _LOOKS_AHEAD and before & _LETTER_OR_NUMERIC) or (now & HYPHEN and before & SPOKEN):
                j = i + _ONE
                while j < n and traits[kinds[j]] & ATTACHED:
                    j += _ONE
                after = traits[kinds[j]] if j < n else np.uint32(0)
                middle = before & after & (now >> MID_SHIFT) & _LETTER_OR_NUMERIC  # WB6, WB7, WB11, WB12
                quote = now & DOUBLE_QUOTE and before & after & HEBREW  # WB7b, WB7c
                if middle or quote:
                    bound = True
                elif now & HYPHEN and after & SPOKEN:
                    while hyphen < n_hyphens and hyphens[hyphen] < np.int64(i):
                        hyphen += _ONE
                    bound = bool(hyphen < n_hyphens and hyphens[hyphen] == np.int64(i))
                joined = joined or bound
            if now & SINGLE_QUOTE and before & HEBREW:  # WB7a
                joined = True
            if now & PICTOGRAPH and previous & JOINER:  # WB3c
                joined = True
            if not joined:
                if spoken:
                    starts[count] = begin
                    ends[count] = np.int64(i)
                    count += _ONE
                begin = np.int64(i)
                spoken = 0
                if now & _WORDISH == 0 and now < MID_LETTER:
                    i += _ONE
                    break
            spoken |= now & SPOKEN
            before = now
            previous = now
            i += _ONE
        else:
            if spoken:
                starts[count] = begin
                ends[count] = np.int64(n)
                count += _ONE
            return int(count)
