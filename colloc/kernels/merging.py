"""Loops of merging runs of counted pairs and of putting them in order."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from colloc.kernels.kernel import kernel


@kernel("int64(uint64[::1], int64[::1], uint64[::1], int64[::1], uint64[::1], int64[::1])")
def merge_two(
    keys: NDArray[np.uint64],
    counts: NDArray[np.int64],
    other_keys: NDArray[np.uint64],
    other_counts: NDArray[np.int64],
    keys_out: NDArray[np.uint64],
    counts_out: NDArray[np.int64],
) -> int:
    """Two runs into one, counts of equal keys added; how many keys come out. Room for all keys of both."""
    i = 0
    j = 0
    n = 0
    while i < len(keys) and j < len(other_keys):
        one = keys[i]
        two = other_keys[j]
        # No branch that the processor would have to guess.
        keys_out[n] = min(one, two)
        count = 0
        if one <= two:
            count += counts[i]
            i += 1
        if two <= one:
            count += other_counts[j]
            j += 1
        counts_out[n] = count
        n += 1
    while i < len(keys):
        keys_out[n] = keys[i]
        counts_out[n] = counts[i]
        i += 1
        n += 1
    while j < len(other_keys):
        keys_out[n] = other_keys[j]
        counts_out[n] = other_counts[j]
        j += 1
        n += 1
    return n


@kernel("int64(uint64[::1], int64[::1], int64, uint32[::1], uint32[::1], int64[::1], int64[::1])")
def pair_up(
    keys: NDArray[np.uint64],
    counts: NDArray[np.int64],
    sign: int,
    low: NDArray[np.uint32],
    high: NDArray[np.uint32],
    forward: NDArray[np.int64],
    backward: NDArray[np.int64],
) -> int:
    """A run as unordered pairs with both directions beside each other; how many they are. Room for all keys."""
    n = -1
    last = np.uint64(0)
    one = np.uint64(1)
    for i in range(len(keys)):
        pair = keys[i] >> one
        if n < 0 or pair != last:
            n += 1
            last = pair
            low[n] = pair >> np.uint64(31)
            high[n] = pair & np.uint64(0x7FFFFFFF)
            forward[n] = 0
            backward[n] = 0
        if keys[i] & one:
            backward[n] = sign * counts[i]
        else:
            forward[n] = sign * counts[i]
    return n + 1


@kernel("void(uint32[::1], int64[::1], int64[::1])")
def order_by_value(values: NDArray[np.uint32], places: NDArray[np.int64], order: NDArray[np.int64]) -> None:
    """The stable order of values.

    Parameters
    ----------
    places : int64 array of zeros
        One for each value from 0 to the largest.
    order : int64 array, shape (n,)
        Receives where the least value stands, and so on.
    """
    for i in range(len(values)):
        places[values[i]] += 1
    total = 0
    for value in range(len(places)):
        here = places[value]
        places[value] = total
        total += here
    for i in range(len(values)):
        place = places[values[i]]
        places[values[i]] = place + 1
        order[place] = i
