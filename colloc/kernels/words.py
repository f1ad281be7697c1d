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
    n = len(kinds)
    count = 0  # tokens that have begun
    hyphen = 0  # the next of the hyphens
    inside = 0
    i = 0
    while True:
        # Quick: letters, digits and what stands between words, without a branch for each word.
        ended = count
        inside = 0
        while i < n:
            now = traits[kinds[i]]
            within = 1 if now & _WORDISH else 0
            if now >= MID_LETTER:
                if now >= ATTACHED:
                    break
                if inside and i + 1 < n:
                    after = traits[kinds[i + 1]]
                    if after >= ATTACHED:
                        break
                    before = traits[kinds[i - 1]]
                    if before & after & (now >> MID_SHIFT) & _LETTER_OR_NUMERIC:
                        within = 1
                    elif now & HYPHEN and after & SPOKEN:
                        while hyphen < len(hyphens) and hyphens[hyphen] < i:
                            hyphen += 1
                        if hyphen < len(hyphens) and hyphens[hyphen] == i:
                            within = 1
            starts[count] = i
            count += within & ~inside
            ends[ended] = i
            ended += inside & ~within
            inside = within
            i += 1
        if i == n:
            if inside:
                ends[ended] = n
            return count
        # With care, until a character that ends a word for certain.
        count = ended
        begin = starts[count] if inside else max(i - 1, 0)
        spoken = SPOKEN if inside else 0
        before = traits[kinds[i - 1]] if i > 0 else np.uint32(0)  # of the last one not attached to another
        previous = before
        bound = False  # whether the next one is joined, whatever it is
        while i < n:
            now = traits[kinds[i]]
            if now & ATTACHED and i > 0 and not previous & NEWLINE:  # WB4
                spoken |= now & SPOKEN
                previous = now
                i += 1
                continue
            joined = bound
            bound = False
            if now & _WORDISH and before & _WORDISH:  # WB5, WB8 to WB10, WB13 to WB13b
                apart = (now & KATAKANA and not before & _BESIDE_KATAKANA) or (
                    before & KATAKANA and not now & _BESIDE_KATAKANA
                )
                joined = joined or not apart
            elif (now & _LOOKS_AHEAD and before & _LETTER_OR_NUMERIC) or (now & HYPHEN and before & SPOKEN):
                j = i + 1
                while j < n and traits[kinds[j]] & ATTACHED:
                    j += 1
                after = traits[kinds[j]] if j < n else np.uint32(0)
                middle = before & after & (now >> MID_SHIFT) & _LETTER_OR_NUMERIC  # WB6, WB7, WB11, WB12
                quote = now & DOUBLE_QUOTE and before & after & HEBREW  # WB7b, WB7c
                if middle or quote:
                    bound = True
                elif now & HYPHEN and after & SPOKEN:
                    while hyphen < len(hyphens) and hyphens[hyphen] < i:
                        hyphen += 1
                    bound = hyphen < len(hyphens) and hyphens[hyphen] == i
                joined = joined or bound
            if now & SINGLE_QUOTE and before & HEBREW:  # WB7a
                joined = True
            if now & PICTOGRAPH and previous & JOINER:  # WB3c
                joined = True
            if not joined:
                if spoken:
                    starts[count] = begin
                    ends[count] = i
                    count += 1
                begin = i
                spoken = 0
                if now & _WORDISH == 0 and now < MID_LETTER:
                    i += 1
                    break
            spoken |= now & SPOKEN
            before = now
            previous = now
            i += 1
        else:
            if spoken:
                starts[count] = begin
                ends[count] = n
                count += 1
            return count
