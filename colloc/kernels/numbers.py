"""Tokens -> numbers through hash tables of spelled-out keys: the loop behind ``colloc.tokens.numbering``."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.kernels.kernel import kernel

SHORT, LONG, PLAIN, UNKEYED = range(4)
"""Tables by their place; what cannot be spelled as a key has none."""
_CODED_WORD = 8
_PLAIN_WORD = 3
ABSENT = np.uint32(0xFFFFFFFF)
_NOTHING = np.uint64(0)
_ONE = np.uint64(1)
_HALF = np.uint64(32)
_ONES = np.uint64(0x0101010101010101)
_HIGHS = np.uint64(0x8080808080808080)
_ALL = np.uint64(0xFFFFFFFFFFFFFFFF)


@kernel(
    "void(uint8[::1], Array(int64, 1, 'C', True), Array(int64, 1, 'C', True), uint64[::1], uint32[::1], "
    "uint64, uint64, uint32[::1])"
)
def find_short(
    coded: NDArray[np.uint8],
    starts: NDArray[Any],
    ends: NDArray[Any],
    keys: NDArray[np.uint64],
    values: NDArray[np.uint32],
    multiplier: np.uint64,
    shift: np.uint64,
    numbers: NDArray[np.uint32],
) -> None:
    """Write the numbers of the short tokens that the table of short ones knows, ``ABSENT`` for all others.

    Most tokens of most texts are done with this. See `number_tokens` for the parameters.
    """
    # Unsigned, since for indices with a sign the compiler adds a look whether they count from the end.
    last = np.uint64(len(values) - 1)
    for token in range(len(starts)):
        start = np.uint64(starts[token])
        length = ends[token] - starts[token]
        value = ABSENT
        if length <= _CODED_WORD:
            key = np.uint64(0)
            for k in range(_CODED_WORD):
                key |= np.uint64(coded[start + np.uint64(k)]) << np.uint64(8 * k)
            if length < _CODED_WORD:
                key &= ~(_ALL << np.uint64(8 * length))
            slot = (key * multiplier) >> shift
            found = keys[slot]
            while found != key and found != _NOTHING:
                slot = (slot + _ONE) & last
                found = keys[slot]
            # A token that ends in 0 has the key of a shorter one; a key with 0 inside is never entered.
            if found == key and key >> np.uint64(8 * (length - 1)) != _NOTHING:
                value = values[slot]
        numbers[token] = value


@kernel(
    "int64(uint8[::1], uint32[::1], Array(int64, 1, 'C', True), Array(int64, 1, 'C', True), int64, int64, "
    "uint64[::1], uint32[::1], uint64[::1], uint64[::1], uint32[::1], uint64[::1], uint64[::1], uint32[::1], "
    "uint64[::1], int64[::1], int64[::1], uint32[::1], int64[::1], int64[::1])"
)
def number_tokens(
    coded: NDArray[np.uint8],
    points: NDArray[np.uint32],
    starts: NDArray[Any],
    ends: NDArray[Any],
    first: int,
    base: int,
    short_keys: NDArray[np.uint64],
    short_values: NDArray[np.uint32],
    long_keys: NDArray[np.uint64],
    long_more: NDArray[np.uint64],
    long_values: NDArray[np.uint32],
    plain_keys: NDArray[np.uint64],
    plain_more: NDArray[np.uint64],
    plain_values: NDArray[np.uint32],
    multipliers: NDArray[np.uint64],
    shifts: NDArray[Any],
    room: NDArray[Any],
    numbers: NDArray[np.uint32],
    fresh: NDArray[Any],
    slots: NDArray[Any],
) -> int:
    """Number the tokens from ``first`` on that have no number yet, until all are done or a table has no room.

    Returns where it stopped.

    The k-th token that no table knows gets the number ``base`` + k, also in the table that it is entered
    in, and is told: ``room[3]`` counts them.

    Parameters
    ----------
    coded : uint8 array, shape (n + 16,)
        A byte for each character of the text, 0 where it has no code.
    points : uint32 array, shape (n,) or (0,)
        Code points; may be left out where no character lacks a code.
    starts, ends : int64 arrays, shape (n_tokens,)
    multipliers : uint64 array, shape (6,)
        Two for each table, the second of the short ones unused.
    shifts : int64 array, shape (3,)
        64 less the binary logarithm of each table's size.
    room : int64 array, shape (4,)
        How many keys each table may take, counted down; and the count of tokens told.
    numbers : uint32 array, shape (n_tokens,)
        As `find_short` leaves them.
    fresh, slots : int64 arrays, shape (n_tokens,)
        Tokens told, ascending, and where they were entered: 4 * slot + table.
    """
    n_fresh = room[UNKEYED]
    short_last = np.uint64(len(short_values) - 1)
    long_last = np.uint64(len(long_values) - 1)
    plain_last = np.uint64(len(plain_values) - 1)
    short_multiplier = multipliers[0]
    short_shift = np.uint64(shifts[SHORT])
    for token in range(first, len(starts)):
        if numbers[token] != ABSENT:
            continue
        start = np.uint64(starts[token])
        length = ends[token] - starts[token]
        table = UNKEYED
        key = np.uint64(0)
        more = np.uint64(0)
        slot = np.uint64(0)
        if length <= 2 * _CODED_WORD:
            for k in range(_CODED_WORD):
                key |= np.uint64(coded[start + np.uint64(k)]) << np.uint64(8 * k)
            mask = _ALL
            if length < _CODED_WORD:
                mask = ~(_ALL << np.uint64(8 * length))
            key &= mask
            # A byte that is 0 inside the token: Mycroft's test, which is exact as to whether there is one.
            filled = key | ~mask
            zeros = (filled - _ONES) & ~filled & _HIGHS
            table = SHORT
            if length > _CODED_WORD:
                table = LONG
                for k in range(_CODED_WORD, 2 * _CODED_WORD):
                    more |= np.uint64(coded[start + np.uint64(k)]) << np.uint64(8 * (k - _CODED_WORD))
                mask = _ALL
                if length < 2 * _CODED_WORD:
                    mask = ~(_ALL << np.uint64(8 * (length - _CODED_WORD)))
                more &= mask
                filled = more | ~mask
                zeros |= (filled - _ONES) & ~filled & _HIGHS
            if zeros != _NOTHING:
                table = UNKEYED
                if length <= 2 * _PLAIN_WORD:
                    table = PLAIN
                    key = np.uint64(0)
                    more = np.uint64(0)
                    for k in range(length):
                        point = np.uint64(points[start + np.uint64(k)])
                        if point == _NOTHING:
                            table = UNKEYED
                        if k < _PLAIN_WORD:
                            key |= point << np.uint64(21 * k)
                        else:
                            more |= point << np.uint64(21 * (k - _PLAIN_WORD))
        # No key begins with 0, so that a key of 0 is a free place.
        if table == SHORT:
            slot = (key * short_multiplier) >> short_shift
            found = short_keys[slot]
            while found != key and found != _NOTHING:
                slot = (slot + _ONE) & short_last
                found = short_keys[slot]
            if found == key:
                numbers[token] = short_values[slot]
                continue
        elif table != UNKEYED:
            mixed = key * multipliers[2 * table]
            mixed ^= mixed >> _HALF
            mixed += more
            mixed *= multipliers[2 * table + 1]
            slot = mixed >> np.uint64(shifts[table])
            if table == LONG:
                while long_keys[slot] != _NOTHING and (long_keys[slot] != key or long_more[slot] != more):
                    slot = (slot + _ONE) & long_last
                if long_keys[slot] == key:
                    numbers[token] = long_values[slot]
                    continue
            else:
                while plain_keys[slot] != _NOTHING and (plain_keys[slot] != key or plain_more[slot] != more):
                    slot = (slot + _ONE) & plain_last
                if plain_keys[slot] == key:
                    numbers[token] = plain_values[slot]
                    continue
        value = np.uint32(base + n_fresh)
        if table != UNKEYED:
            if room[table] == 0:
                room[UNKEYED] = n_fresh
                return token
            room[table] -= 1
            if table == SHORT:
                short_keys[slot] = key
                short_values[slot] = value
            elif table == LONG:
                long_keys[slot] = key
                long_more[slot] = more
                long_values[slot] = value
            else:
                plain_keys[slot] = key
                plain_more[slot] = more
                plain_values[slot] = value
        numbers[token] = value
        fresh[n_fresh] = token
        slots[n_fresh] = np.int64(slot << np.uint64(2)) + table
        n_fresh += 1
    room[UNKEYED] = n_fresh
    return len(starts)
