"""A hash table of whole arrays: fixed-width keys -> numbers, exact."""

from __future__ import annotations

import secrets
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.kernels import numbers as loop
from colloc.records import Int64Array, UInt32Array, UInt64Array

_SMALLEST = 1 << 12
ABSENT = loop.ABSENT


class KeyTable:
    """Open addressing with linear probing over keys of one or two 64-bit words.

    Keys themselves are compared, so that equal hashes do no harm. The multipliers
    are drawn at random for each table (multiplicative hashing, Dietzfelbinger et al.
    1997, Journal of Algorithms 25(1)), so that no text can be made to fill one
    corner of it; the numbers do not depend on them.
    """

    def __init__(self, words: int) -> None:
        self._multipliers = [np.uint64(secrets.randbits(64) | 1) for _ in range(words)]
        self._make(_SMALLEST)

    def _make(self, size: int) -> None:
        self._keys = [np.zeros(size, np.uint64) for _ in self._multipliers]
        self._values = np.full(size, ABSENT, np.uint32)
        self._shift = np.uint64(64 - (size.bit_length() - 1))
        self._count = 0

    @property
    def nbytes(self) -> int:
        """Bytes held."""
        return self._values.nbytes + sum(keys.nbytes for keys in self._keys)

    @property
    def arrays(self) -> tuple[NDArray[Any], ...]:
        """Keys, one array a word, and values: what compiled loops read, and write into while there is `room`."""
        return (*self._keys, self._values)

    @property
    def multipliers(self) -> list[np.uint64]:
        """One a word of the keys."""
        return self._multipliers

    @property
    def shift(self) -> int:
        """64 less the binary logarithm of the size."""
        return int(self._shift)

    @property
    def room(self) -> int:
        """How many keys may be put in before the table has to grow."""
        return len(self._values) // 2 - self._count

    def note(self, entered: int) -> None:
        """That so many keys have been written into the arrays."""
        self._count += entered

    def grow(self) -> None:
        """Make room for twice as many keys."""
        used = self._values != ABSENT
        old_keys, old_values = [table[used] for table in self._keys], self._values[used]
        self._make(2 * len(self._values))
        self._insert(old_keys, old_values)

    def _slots(self, keys: list[UInt64Array]) -> Int64Array:
        mixed = keys[0] * self._multipliers[0]
        for key, multiplier in zip(keys[1:], self._multipliers[1:], strict=True):
            mixed ^= mixed >> np.uint64(32)
            mixed += key
            mixed *= multiplier
        mixed >>= self._shift
        return mixed.view(np.int64)

    def find(self, keys: list[UInt64Array]) -> UInt32Array:
        """The number of each key, ``ABSENT`` where there is none. Keys: one array a word, shape (n,)."""
        slots = self._slots(keys)
        found = self._values[slots]
        unequal = self._keys[0][slots] != keys[0]
        for table, key in zip(self._keys[1:], keys[1:], strict=True):
            unequal |= table[slots] != key
        open_ = np.flatnonzero(unequal & (found != ABSENT))
        found[unequal] = ABSENT
        # Each round looks one slot further for the keys that met another key.
        last = np.int64(len(self._values) - 1)
        slots = slots[open_]
        while len(open_):
            slots = (slots + 1) & last
            equal = self._keys[0][slots] == keys[0][open_]
            for table, key in zip(self._keys[1:], keys[1:], strict=True):
                equal &= table[slots] == key[open_]
            values = self._values[slots]
            found[open_[equal]] = values[equal]
            going = ~equal & (values != ABSENT)
            open_, slots = open_[going], slots[going]
        return found

    def add(self, keys: list[UInt64Array], values: UInt32Array) -> None:
        """Put in keys that are distinct and not yet there."""
        while self.room < len(values):
            self.grow()
        self._insert(keys, values)

    def _insert(self, keys: list[UInt64Array], values: UInt32Array) -> None:
        self._count += len(values)
        last = np.int64(len(self._values) - 1)
        slots = self._slots(keys)
        waiting = np.arange(len(values))
        while len(waiting):
            free = self._values[slots] == ABSENT
            # Of several keys that want one free slot the last one to sign it gets it; the rest go on.
            self._values[slots[free]] = waiting[free]
            placed = free & (self._values[slots] == waiting)
            self._values[slots[placed]] = values[waiting[placed]]
            for table, key in zip(self._keys, keys, strict=True):
                table[slots[placed]] = key[waiting[placed]]
            waiting, slots = waiting[~placed], (slots[~placed] + 1) & last
