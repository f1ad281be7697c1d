"""Loops of merging runs of counted pairs and of turning them round."""

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


@kernel(
    "void(uint32[::1], uint32[::1], int64[::1], int64[::1], uint32[::1], int64[::1],"
    " uint32[::1], uint32[::1], int64[::1], int64[::1])"
)
def deal(
    low: NDArray[np.uint32],
    high: NDArray[np.uint32],
    forward: NDArray[np.int64],
    backward: NDArray[np.int64],
    bounds: NDArray[np.uint32],
    edges: NDArray[np.int64],
    low_out: NDArray[np.uint32],
    high_out: NDArray[np.uint32],
    forward_out: NDArray[np.int64],
    backward_out: NDArray[np.int64],
) -> None:
    """Group pairs stably by the range of their higher term.

    Parameters
    ----------
    bounds : uint32 array, shape (groups - 1,)
        First higher term of every group but the first, ascending.
    edges : int64 array of zeros, shape (groups + 1,)
        Receives where each group begins, and at the end the number of pairs.
    """
    groups = len(edges) - 1
    for i in range(len(high)):
        edges[np.searchsorted(bounds, high[i], side="right") + 1] += 1
    for group in range(groups):
        edges[group + 1] += edges[group]
    # Each start is moved through its group; when all are placed it is where the next group begins.
    for i in range(len(high)):
        group = np.searchsorted(bounds, high[i], side="right")
        place = edges[group]
        edges[group] = place + 1
        low_out[place] = low[i]
        high_out[place] = high[i]
        forward_out[place] = forward[i]
        backward_out[place] = backward[i]
    for group in range(groups, 0, -1):
        edges[group] = edges[group - 1]
    edges[0] = 0


@kernel(
    "void(uint32[::1], uint32[::1], int64[::1], int64[::1], int64, int64[::1],"
    " uint32[::1], uint32[::1], int64[::1], int64[::1])"
)
def sort_by_high(
    low: NDArray[np.uint32],
    high: NDArray[np.uint32],
    forward: NDArray[np.int64],
    backward: NDArray[np.int64],
    least: int,
    places: NDArray[np.int64],
    low_out: NDArray[np.uint32],
    high_out: NDArray[np.uint32],
    forward_out: NDArray[np.int64],
    backward_out: NDArray[np.int64],
) -> None:
    """Sort pairs stably by the higher term; ``places`` (zeros) has a place for each from ``least`` to the largest."""
    for i in range(len(high)):
        places[high[i] - least] += 1
    total = 0
    for term in range(len(places)):
        here = places[term]
        places[term] = total
        total += here
    for i in range(len(high)):
        place = places[high[i] - least]
        places[high[i] - least] = place + 1
        low_out[place] = low[i]
        high_out[place] = high[i]
        forward_out[place] = forward[i]
        backward_out[place] = backward[i]
