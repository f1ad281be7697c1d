"""Slices of bytes -> numbers, exactly and on whole arrays."""

from __future__ import annotations

import secrets
from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.kernels import slices as loops
from colloc.kernels.switch import compiled
from colloc.records import Int64Array, UInt32Array, UInt64Array
from colloc.tokens.annotated.buffer import MASKS, WORD, Buffer, Slices, gather
from colloc.tokens.keytable import ABSENT, KeyTable

LONGEST_HASHED = 512
"""Bytes; longer slices, which are rare, are looked up one by one."""
_BYTES_A_STRING = 160


class Growing:
    """An array that grows at its end."""

    def __init__(self, kind: type[np.generic]) -> None:
        self._room: NDArray[Any] = np.zeros(1024, kind)
        self._count = 0

    @property
    def values(self) -> NDArray[Any]:
        """What is in it."""
        return self._room[: self._count]

    @property
    def nbytes(self) -> int:
        """Bytes held."""
        return self._room.nbytes

    def __len__(self) -> int:
        return self._count

    def extend(self, more: NDArray[Any]) -> None:
        """Add values at the end."""
        stop = self._count + len(more)
        if stop > len(self._room):
            room = np.zeros(max(stop, 2 * len(self._room)), self._room.dtype)
            room[: self._count] = self.values
            self._room = room
        self._room[self._count : stop] = more
        self._count = stop

    def drop(self, n: int) -> None:
        """Take the last ``n`` values away."""
        self._count -= n


class SliceTable:
    """Numbers different slices from 0 on, over many buffers.

    A slice is found by a hash of 64 bits (multiplicative, by a number drawn at
    random for each table) and then compared, eight bytes at a time, with what
    is kept of the slice that has this hash; one that has the same hash but
    other bytes is looked up by its bytes, as are long ones.
    """

    def __init__(self) -> None:
        self._multiplier = np.uint64(secrets.randbits(64) | 1)
        self._table = KeyTable(1)
        self._apart: dict[bytes, int] = {}
        self._kept = Growing(np.uint8)
        self._kept.extend(np.zeros(WORD, np.uint8))
        self._starts, self._lengths, self._tails = Growing(np.int64), Growing(np.int64), Growing(np.uint64)

    def __len__(self) -> int:
        return len(self._starts)

    @property
    def nbytes(self) -> int:
        """Memory taken, about."""
        arrays = (self._kept, self._starts, self._lengths, self._tails)
        apart = sum(map(len, self._apart)) + _BYTES_A_STRING * len(self._apart)
        return self._table.nbytes + sum(array.nbytes for array in arrays) + apart

    def number(self, buffer: Buffer, slices: Slices) -> tuple[UInt32Array, Int64Array]:
        """Numbers of slices, none of them empty.

        Returns
        -------
        numbers : uint32 array, shape (n,)
        fresh : int64 array
            The slices with which numbers were given, in the order of these numbers.
        """
        long = np.flatnonzero(slices.lengths > LONGEST_HASHED)
        if not len(long):
            return self._number(buffer, slices)
        short = np.flatnonzero(slices.lengths <= LONGEST_HASHED)
        numbers = np.zeros(len(slices), np.uint32)
        numbers[short], fresh = self._number(buffer, slices.only(short))
        return numbers, np.append(short[fresh], self._number_apart(buffer, slices, long, numbers))

    def _number(self, buffer: Buffer, slices: Slices) -> tuple[UInt32Array, Int64Array]:
        numbers, hashes, unequal = self._look_up(buffer, slices)
        absent = np.flatnonzero(numbers == ABSENT)
        fresh = absent
        if len(absent):
            keys, firsts, inverse = np.unique(hashes[absent], return_index=True, return_inverse=True)
            order = np.argsort(firsts)
            fresh = absent[firsts[order]]
            given = np.empty(len(keys), np.uint32)
            given[order] = np.arange(len(self), len(self) + len(keys), dtype=np.uint32)
            entered = slices.only(fresh)
            self._keep(buffer, entered, _tails(buffer, entered))
            self._table.add([keys], given)
            numbers[absent] = given[inverse]
            # Of those that were not there, some may have the hash of others among them.
            rest = slices.only(absent)
            odd = self._unequal(buffer, rest, _tails(buffer, rest), numbers[absent])
            unequal = np.union1d(unequal, absent[odd])
        if len(unequal):
            fresh = np.append(fresh, self._number_apart(buffer, slices, unequal, numbers))
        return numbers, fresh

    def _look_up(self, buffer: Buffer, slices: Slices) -> tuple[UInt32Array, UInt64Array, Int64Array]:
        """Numbers of slices by their hashes, ``ABSENT`` for none; the hashes; and which slices are not what is kept."""
        if compiled():
            numbers, hashes = np.empty(len(slices), np.uint32), np.empty(len(slices), np.uint64)
            differing = np.empty(len(slices), bool)
            table = self._table
            keys, values = table.arrays
            loops.look_up_slices(
                buffer.padded,
                slices.starts,
                slices.lengths,
                self._multiplier,
                keys,
                values,
                table.multipliers[0],
                np.uint64(table.shift),
                self._kept.values,
                self._starts.values,
                self._lengths.values,
                numbers,
                hashes,
                differing,
            )
            return numbers, hashes, np.flatnonzero(differing)
        tails = _tails(buffer, slices)
        hashes = self._hashes(buffer, slices, tails)
        numbers = self._table.find([hashes])
        there = np.flatnonzero(numbers != ABSENT)
        found = slices if len(there) == len(slices) else slices.only(there)
        return numbers, hashes, there[self._unequal(buffer, found, tails[there], numbers[there])]

    def _number_apart(self, buffer: Buffer, slices: Slices, rows: Int64Array, numbers: UInt32Array) -> Int64Array:
        """Number some slices by their bytes; tells the new ones."""
        fresh: list[int] = []
        for row in rows.tolist():
            start = int(slices.starts[row])
            key = buffer.data[start : start + int(slices.lengths[row])]
            number = self._apart.setdefault(key, len(self) + len(fresh))
            if number == len(self) + len(fresh):
                fresh.append(row)
            numbers[row] = number
        new = np.array(fresh, np.int64)
        # So that numbers and places go on together; their bytes are in the dictionary.
        self._keep(buffer, Slices(slices.starts[new], np.zeros(len(new), np.int64)), np.zeros(len(new), np.uint64))
        return new

    def _keep(self, buffer: Buffer, slices: Slices, tails: UInt64Array) -> None:
        kept, begins = gather(buffer.bytes, slices)
        self._starts.extend(begins + len(self._kept) - WORD)
        self._lengths.extend(slices.lengths)
        self._tails.extend(tails)
        # Behind the last one is room for reading a whole word.
        self._kept.drop(WORD)
        self._kept.extend(np.append(kept, np.zeros(WORD, np.uint8)))

    def _hashes(self, buffer: Buffer, slices: Slices, tails: UInt64Array) -> UInt64Array:
        mixed = self._mixed(tails + slices.lengths.astype(np.uint64) * self._multiplier)
        for rows, offset in _inner_words(slices.lengths):
            places = slices.starts[rows]
            places += offset
            words = buffer.words[places]
            words ^= mixed[rows]
            mixed[rows] = self._mixed(words)
        return mixed

    def _mixed(self, words: UInt64Array) -> UInt64Array:
        words *= self._multiplier
        words ^= words >> np.uint64(32)
        return words

    def _unequal(self, buffer: Buffer, slices: Slices, tails: UInt64Array, numbers: UInt32Array) -> Int64Array:
        """Slices that are not what is kept under their numbers, ascending."""
        unequal = self._lengths.values[numbers] != slices.lengths
        unequal |= self._tails.values[numbers] != tails
        unequal_rows = [np.flatnonzero(unequal)]
        kept = self._kept.values
        words = np.ndarray((len(kept) - WORD + 1,), "<u8", kept, strides=(1,))
        starts = self._starts.values[numbers]
        for rows, offset in _inner_words(np.where(unequal, 0, slices.lengths) if unequal.any() else slices.lengths):
            one, other = starts[rows], slices.starts[rows]
            one += offset
            other += offset
            unequal_rows.append(rows[words[one] != buffer.words[other]])
        return np.unique(np.concatenate(unequal_rows))


def _tails(buffer: Buffer, slices: Slices) -> UInt64Array:
    """The last eight bytes of each slice, or all that it has."""
    beyond = np.maximum(slices.lengths - WORD, 0)
    tails: UInt64Array = buffer.words[slices.starts + beyond] & MASKS[np.minimum(slices.lengths, WORD)]
    return tails


def _inner_words(lengths: Int64Array) -> Iterator[tuple[Int64Array, int]]:
    """Slices that have more than the next eight bytes, and where these begin; the last ones are in the tails."""
    offset = 0
    rows = np.flatnonzero(lengths > WORD)
    while len(rows):
        yield rows, offset
        offset += WORD
        rows = rows[lengths[rows] > offset + WORD]
