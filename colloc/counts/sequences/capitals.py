"""Which types are written with a capital."""

from __future__ import annotations

import numpy as np

from colloc.counts.sequences.sharing import CAPITAL, NO_MARK, SMALL
from colloc.records import UInt8Array
from colloc.store.connection import Store
from colloc.store.vocabulary import type_count, type_keys

_TYPES_AT_A_TIME = 2**16


def capital_marks(store: Store) -> UInt8Array:
    """The mark of each type: whether its form begins with a capital; words that are one letter say nothing."""
    n = type_count(store)
    marks = np.empty(n, np.uint8)
    for first in range(0, n, _TYPES_AT_A_TIME):
        keys = type_keys(store, first, min(first + _TYPES_AT_A_TIME, n))
        forms = [key if isinstance(key, str) else key[0] for key in keys]
        marks[first : first + len(forms)] = [mark(form) for form in forms]
    return marks


def mark(form: str) -> int:
    """The mark of one form, which is not empty."""
    if form[0].lower() == form[0].upper():
        return SMALL
    if not form[1:2].isalpha():
        # "I", "I'm": one letter that is always or never a capital tells nothing of names
        return NO_MARK
    return CAPITAL if form[0].isupper() or form[0].istitle() else SMALL
