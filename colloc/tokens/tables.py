"""Code points that have a property, as whole-array look-ups."""

from __future__ import annotations

from functools import cache

import numpy as np

from colloc.tokens.classes import Mask

_SURROGATES = range(0xD800, 0xE000)


@cache
def having(properties: str) -> Mask:
    """Which of the 0x110000 code points fit a `regex` set such as ``\\p{P}\\p{S}``."""
    import regex

    everything = "".join("\0" if code in _SURROGATES else chr(code) for code in range(0x110000))
    found = np.zeros(0x110000, np.bool_)
    for match in regex.finditer(f"[{properties}]+", everything):
        found[match.start() : match.end()] = True
    return found
