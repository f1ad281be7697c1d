"""Characters that attach to the one before (rules WB4 and SB5): taken out, and positions mapped back."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from colloc.records import Int64Array
from colloc.tokens.classes import Kinds, Mask, classes


@dataclass(frozen=True)
class Attached:
    """What was taken out of a text: "inner" positions are those among the characters that were kept."""

    positions: Int64Array
    """Of the characters taken out, ascending."""
    kept: Mask
    """Which characters of the text were not."""

    def outer(self, ascending: Int64Array) -> Int64Array:
        """Positions in the text of inner positions; that of the end, too."""
        # The k-th character taken out moves all that stands k or fewer characters before it.
        thresholds = self.positions - np.arange(len(self.positions))
        moved = np.bincount(np.searchsorted(ascending, thresholds), minlength=len(ascending) + 1)
        return ascending + np.cumsum(moved)[:-1]

    def inner(self, positions: Int64Array) -> Int64Array:
        """Inner positions of kept characters; for one taken out, that of the kept one after it."""
        return positions - np.searchsorted(self.positions, positions)


def find_attached(kinds: Kinds, attaching: Mask, newline: Mask) -> Attached | None:
    """Characters of the kinds `attaching`, but for those at the start and after a line end; None where none are."""
    candidates = np.flatnonzero(kinds < classes().first_free)
    candidates = candidates[attaching[kinds[candidates]] & (candidates > 0)]
    positions = candidates[~newline[kinds[candidates - 1]]]
    if not len(positions):
        return None
    kept = np.ones(len(kinds), np.bool_)
    kept[positions] = False
    return Attached(positions, kept)
