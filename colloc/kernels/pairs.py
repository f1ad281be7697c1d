"""Loops of counting windows: tokens to cells and keys, cells to entries."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from colloc.kernels.kernel import kernel

_NO_TERM = 0xFFFFFFFF


@kernel(
    "void(uint32[::1], int64[::1], int64, int64, int64, int32[::1], int32[::1], int32[::1], int32[:, ::1],"
    " int32[::1], uint64[::1], int64[::1])"
)
def add_windows(
    terms: NDArray[np.uint32],
    units: NDArray[np.int64],
    context: int,
    left: int,
    right: int,
    base: NDArray[np.int32],
    stop: NDArray[np.int32],
    twice: NDArray[np.int32],
    rows: NDArray[np.int32],
    cells: NDArray[np.int32],
    keys: NDArray[np.uint64],
    state: NDArray[np.int64],
) -> None:
    """Count the pairs of a span whose second token is at ``context`` or later, until ``keys`` is nearly full.

    Parameters
    ----------
    terms : uint32 array, shape (n,)
        Terms of the span's tokens; 0xFFFFFFFF: none.
    units : int64 array
        Offsets in the span where units begin, ascending.
    left, right : int
        A pair of tokens i < j of one unit adds to the cell [i, j] where j - i <= right, to [j, i] where j - i <= left.
    base, stop, twice : int32 arrays, shape (n_terms,)
        The staircase of frequent pairs, see ``colloc.counts.dense``.
    rows : int32 array, shape (n, 3)
        Room for what the three say of each token.
    cells : int32 array
        Counts of frequent pairs, added to; whoever calls sees to it that none can pass 2**31.
    keys : uint64 array
        Receives the others, ``low << 32 | high << 1 | (first is higher)``; room for more than twice the longer reach.
    state : int64 array, shape (2,)
        Token to begin with, and keys in ``keys``; both are moved on. Done where the former reaches n.
    """
    n = len(terms)
    n_keys = state[1]
    reach = max(left, right)
    first = max(state[0], context)
    for i in range(max(first - reach, 0), n):
        if terms[i] != _NO_TERM:
            rows[i, 0] = base[terms[i]]
            rows[i, 1] = stop[terms[i]]
            rows[i, 2] = twice[terms[i]]
    next_unit = np.searchsorted(units, first)
    begin = units[next_unit - 1] if next_unit > 0 else 0
    room = len(keys) - 2 * reach - 1
    for j in range(first, n):
        while next_unit < len(units) and units[next_unit] <= j:
            begin = units[next_unit]
            next_unit += 1
        if n_keys > room:
            state[0] = j
            state[1] = n_keys
            return
        two = terms[j]
        if two == _NO_TERM:
            continue
        base_two = rows[j, 0]
        stop_two = rows[j, 1]
        twice_two = rows[j, 2]
        for i in range(max(begin, j - reach), j):
            one = terms[i]
            if one == _NO_TERM:
                continue
            twice_one = rows[i, 2]
            # What has no cell goes to the row's spare cell, and its key is written where the next one will stand
            # otherwise: the processor need not guess which pairs are frequent.
            spare = min(stop_two, rows[i, 1])
            cell = min(base_two, rows[i, 0]) + max(twice_one, twice_two)
            rare = cell >= spare
            pair = (np.uint64(min(one, two)) << np.uint64(32)) | (np.uint64(max(one, two)) << np.uint64(1))
            if j - i <= right:
                cells[min(cell + (twice_one > twice_two), spare)] += 1
                keys[n_keys] = pair | np.uint64(one > two)
                n_keys += rare
            if j - i <= left:
                cells[min(cell + (twice_two > twice_one), spare)] += 1
                keys[n_keys] = pair | np.uint64(two > one)
                n_keys += rare
    state[0] = n
    state[1] = n_keys


@kernel("void(uint64[::1], int64, int64[::1])")
def find_places(keys: NDArray[np.uint64], shift: int, places: NDArray[np.int64]) -> None:
    """Where keys with each digit begin when they are sorted by it: the bits from ``shift`` on.

    Parameters
    ----------
    places : int64 array of zeros
        As long as there are digits, a power of two; receives the places.
    """
    mask = np.uint64(len(places) - 1)
    move = np.uint64(shift)
    for i in range(len(keys)):
        places[(keys[i] >> move) & mask] += 1
    total = 0
    for digit in range(len(places)):
        here = places[digit]
        places[digit] = total
        total += here


@kernel("void(uint64[::1], uint64[::1], int64, int64[::1])")
def move_keys(keys: NDArray[np.uint64], keys_out: NDArray[np.uint64], shift: int, places: NDArray[np.int64]) -> None:
    """Keys to the places that `find_places` found, in order."""
    mask = np.uint64(len(places) - 1)
    move = np.uint64(shift)
    for i in range(len(keys)):
        digit = (keys[i] >> move) & mask
        place = places[digit]
        places[digit] = place + 1
        keys_out[place] = keys[i]


@kernel("int64(uint64[::1], int64[::1])")
def group_keys(keys: NDArray[np.uint64], counts: NDArray[np.int64]) -> int:
    """Sorted keys to different ones in their place, with counts (zeros before); how many they are. At least one key."""
    last = 0
    for i in range(len(keys)):
        # No branch that the processor would have to guess.
        last += keys[i] != keys[last]
        keys[last] = keys[i]
        counts[last] += 1
    return last + 1


@kernel("int64(int32[::1], int64[::1], int64[::1], uint64[::1], int64[::1])")
def list_cells(
    cells: NDArray[np.int32],
    row_starts: NDArray[np.int64],
    terms: NDArray[np.int64],
    keys: NDArray[np.uint64],
    counts: NDArray[np.int64],
) -> int:
    """Keys and counts of the cells that are not zero, row by row; how many they are.

    Parameters
    ----------
    cells : int32 array
        Set to zero on the way.
    row_starts, terms : int64 arrays
        Of the staircase, see ``colloc.counts.dense``.
    keys, counts : arrays
        Receive the entries; as long as there are cells that are not zero.
    """
    n = 0
    for row in range(len(row_starts) - 1):
        one = terms[row]
        for cell in range(row_starts[row], row_starts[row + 1] - 1):
            if cells[cell] != 0:
                two = terms[row + ((cell - row_starts[row]) >> 1)]
                swapped = (((cell - row_starts[row]) & 1) == 1) != (one > two)
                keys[n] = (
                    (np.uint64(min(one, two)) << np.uint64(32))
                    | (np.uint64(max(one, two)) << np.uint64(1))
                    | np.uint64(swapped)
                )
                counts[n] = cells[cell]
                n += 1
            cells[cell] = 0
    return n


@kernel("void(uint64[::1], int64[::1], uint64[::1], int64[::1], int64, int64[::1])")
def move_entries(
    keys: NDArray[np.uint64],
    counts: NDArray[np.int64],
    keys_out: NDArray[np.uint64],
    counts_out: NDArray[np.int64],
    shift: int,
    places: NDArray[np.int64],
) -> None:
    """Keys with counts to the places that `find_places` found, in order."""
    mask = np.uint64(len(places) - 1)
    move = np.uint64(shift)
    for i in range(len(keys)):
        digit = (keys[i] >> move) & mask
        place = places[digit]
        places[digit] = place + 1
        keys_out[place] = keys[i]
        counts_out[place] = counts[i]


@kernel("void(uint32[::1], int64[::1], int64, int64[::1], int64[::1], int64[::1])")
def count_words(
    terms: NDArray[np.uint32],
    starts: NDArray[np.int64],
    document: int,
    tokens: NDArray[np.int64],
    documents: NDArray[np.int64],
    seen: NDArray[np.int64],
) -> None:
    """Add a stretch to the frequencies of terms, and to their numbers of documents.

    Parameters
    ----------
    terms : uint32 array, shape (n,)
    starts : int64 array
        Offsets where documents begin, ascending.
    document : int
        Number of the document that the stretch begins inside of; each start counts one further.
    tokens, documents : int64 arrays, shape (n_terms,)
        Added to.
    seen : int64 array, shape (n_terms,)
        The last document in which each term was found.
    """
    following = 0
    for i in range(len(terms)):
        while following < len(starts) and starts[following] <= i:
            document += 1
            following += 1
        term = terms[i]
        if term == _NO_TERM:
            continue
        tokens[term] += 1
        if seen[term] != document:
            seen[term] = document
            documents[term] += 1


def bit_ranges(low_bits: int, high_bits: int, widest: int) -> list[tuple[int, int]]:
    """Shifts and widths of the digits by which keys of such terms are sorted, least first."""
    found: list[tuple[int, int]] = []
    for begin, bits in ((0, high_bits + 1), (32, low_bits)):
        parts = -(-bits // widest)
        for part in range(parts):
            first, past = bits * part // parts, bits * (part + 1) // parts
            found.append((begin + first, past - first))
    return found
