"""Slices of a stretch of bytes: copied one behind the other, looked up, and read as numbers.

The loops behind ``colloc.tokens.annotated``, whose numpy forms say what each is
for. Behind the bytes there is room for reading eight more.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.kernels.kernel import kernel

_WORD = 8
_ABSENT = np.uint32(0xFFFFFFFF)
_ONE = np.uint64(1)
_HALF = np.uint64(32)
_ALL = np.uint64(0xFFFFFFFFFFFFFFFF)
_TAB, _LINE_FEED = 9, 10
_ZERO = 48


@kernel("int64(Array(uint8, 1, 'C', True), int64[::1], int64[::1])")
def divide(data: NDArray[np.uint8], dividers: NDArray[Any], ends: NDArray[Any]) -> int:
    """Write where tabs and line feeds stand, and which of them are line feeds; return how many of these there are.

    Parameters
    ----------
    data : uint8 array, shape (n,)
    dividers, ends : int64 arrays
        With room for one more than there are of either.
    """
    # Written in any case, counted where it is one: no branch that would be foretold wrongly.
    count = np.uint64(0)
    for i in range(np.uint64(len(data))):
        dividers[count] = np.int64(i)
        count += np.uint64(np.uint8(data[i] - _TAB) < 2)
    lines = np.uint64(0)
    for divider in range(count):
        ends[lines] = np.int64(divider)
        lines += np.uint64(data[np.uint64(dividers[divider])] == _LINE_FEED)
    return int(lines)


@kernel(
    "void(Array(uint8, 1, 'C', True), Array(int64, 1, 'C', True), Array(int64, 1, 'C', True), uint8[::1], int64[::1])"
)
def copy(
    data: NDArray[np.uint8],
    starts: NDArray[Any],
    lengths: NDArray[Any],
    copied: NDArray[np.uint8],
    begins: NDArray[Any],
) -> None:
    """Copy slices one behind the other, and write where each begins.

    Parameters
    ----------
    data : uint8 array
    starts, lengths : int64 arrays, shape (n,)
    copied : uint8 array, shape (sum of the lengths,)
    begins : int64 array, shape (n,)
    """
    at = np.uint64(0)
    for row in range(len(starts)):
        begins[row] = np.int64(at)
        start = np.uint64(starts[row])
        for k in range(np.uint64(lengths[row])):
            copied[at + k] = data[start + k]
        at += np.uint64(lengths[row])


@kernel(
    "void(Array(uint8, 1, 'C', True), Array(int64, 1, 'C', True), Array(int64, 1, 'C', True), int64[::1], boolean[::1])"
)
def read_numbers(
    data: NDArray[np.uint8],
    starts: NDArray[Any],
    lengths: NDArray[Any],
    numbers: NDArray[Any],
    other: NDArray[np.bool_],
) -> None:
    """Read slices of one to eight digits without zeros in front as numbers, and mark all others.

    Parameters
    ----------
    data : uint8 array
    starts, lengths, numbers : int64 arrays, shape (n,)
    other : bool array, shape (n,)
    """
    for row in range(len(starts)):
        start = np.uint64(starts[row])
        length = lengths[row]
        number = np.int64(0)
        wrong = length == 0 or length > _WORD or (length > 1 and data[start] == _ZERO)
        if not wrong:
            for k in range(np.uint64(length)):
                digit = np.int64(data[start + k]) - np.int64(_ZERO)
                wrong |= digit < 0 or digit > 9
                number = np.int64(10) * number + digit
        numbers[row] = number
        other[row] = wrong


@kernel(
    "void(Array(uint8, 1, 'C', True), Array(int64, 1, 'C', True), Array(int64, 1, 'C', True), uint64, "
    "uint64[::1], uint32[::1], uint64, uint64, uint8[::1], int64[::1], int64[::1], uint32[::1], uint64[::1], "
    "boolean[::1])"
)
def look_up_slices(
    data: NDArray[np.uint8],
    starts: NDArray[Any],
    lengths: NDArray[Any],
    multiplier: np.uint64,
    keys: NDArray[np.uint64],
    values: NDArray[np.uint32],
    table_multiplier: np.uint64,
    shift: np.uint64,
    kept: NDArray[np.uint8],
    kept_starts: NDArray[Any],
    kept_lengths: NDArray[Any],
    numbers: NDArray[np.uint32],
    hashes: NDArray[np.uint64],
    unequal: NDArray[np.bool_],
) -> None:
    """Write the hash of each slice, the number that the table has for it, and whether what is kept of that is another.

    Parameters
    ----------
    data : uint8 array
    starts, lengths : int64 arrays, shape (n,)
        No slice is empty.
    multiplier : uint64
        Of the hash.
    keys, values, table_multiplier, shift
        Of a table of hashes that is never full.
    kept : uint8 array
        The slices that have numbers.
    kept_starts, kept_lengths : int64 arrays
        By number.
    numbers : uint32 array, shape (n,)
        All ones where the table has none.
    hashes : uint64 array, shape (n,)
    unequal : bool array, shape (n,)
    """
    last = np.uint64(len(values) - 1)
    for row in range(len(starts)):
        start = np.uint64(starts[row])
        length = np.uint64(lengths[row])
        beyond = length - np.uint64(_WORD) if length > _WORD else np.uint64(0)
        tail = np.uint64(0)
        for k in range(_WORD):
            tail |= np.uint64(data[start + beyond + np.uint64(k)]) << np.uint64(8 * k)
        if length < _WORD:
            tail &= ~(_ALL << (length << np.uint64(3)))
        mixed = (tail + length * multiplier) * multiplier
        mixed ^= mixed >> _HALF
        offset = np.uint64(0)
        while length > offset + np.uint64(_WORD):
            word = np.uint64(0)
            for k in range(_WORD):
                word |= np.uint64(data[start + offset + np.uint64(k)]) << np.uint64(8 * k)
            mixed = (word ^ mixed) * multiplier
            mixed ^= mixed >> _HALF
            offset += np.uint64(_WORD)
        hashes[row] = mixed
        slot = (mixed * table_multiplier) >> shift
        while values[slot] != _ABSENT and keys[slot] != mixed:
            slot = (slot + _ONE) & last
        number = values[slot]
        numbers[row] = number
        differs = False
        if number != _ABSENT:
            differs = np.uint64(kept_lengths[number]) != length
            if not differs:
                other = np.uint64(kept_starts[number])
                offset = np.uint64(0)
                while offset + np.uint64(_WORD) < length:
                    one_word = np.uint64(0)
                    other_word = np.uint64(0)
                    for k in range(_WORD):
                        one_word |= np.uint64(data[start + offset + np.uint64(k)]) << np.uint64(8 * k)
                        other_word |= np.uint64(kept[other + offset + np.uint64(k)]) << np.uint64(8 * k)
                    differs |= one_word != other_word
                    offset += np.uint64(_WORD)
                other_tail = np.uint64(0)
                for k in range(_WORD):
                    other_tail |= np.uint64(kept[other + beyond + np.uint64(k)]) << np.uint64(8 * k)
                if length < _WORD:
                    other_tail &= ~(_ALL << (length << np.uint64(3)))
                differs |= other_tail != tail
        unequal[row] = differs
