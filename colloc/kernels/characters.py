"""Loops over characters and tokens that do one small thing each."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.kernels.kernel import kernel


@kernel("void(Array(uint16, 1, 'C', True), Array(uint8, 1, 'C', True), uint8[::1])")
def look_up(points: NDArray[np.uint16], table: NDArray[np.uint8], found: NDArray[np.uint8]) -> None:
    """Write ``table[point]`` for each point.

    Parameters
    ----------
    points : uint16 array, shape (n,)
    table : uint8 array, shape (65536,) or longer
    found : uint8 array, shape (n,)
    """
    for i in range(len(points)):
        found[i] = table[points[i]]


@kernel("int64(Array(int64, 1, 'C', True), Array(int64, 1, 'C', True), int64[::1])")
def first_from(starts: NDArray[Any], places: NDArray[Any], numbers: NDArray[Any]) -> int:
    """Write the numbers of the starts that come first at or after a place, each once; return how many there are.

    Parameters
    ----------
    starts, places : int64 arrays
        Ascending.
    numbers : int64 array, as long as `places`
    """
    count = 0
    number = 0
    last = -1
    for i in range(len(places)):
        while number < len(starts) and starts[number] < places[i]:
            number += 1
        if number == len(starts):
            break
        if number != last:
            numbers[count] = number
            count += 1
            last = number
    return count


@kernel("void(Array(uint32, 1, 'C', True), boolean[::1])")
def mark(numbers: NDArray[np.uint32], seen: NDArray[np.bool_]) -> None:
    """Set the flag of each number.

    Parameters
    ----------
    numbers : uint32 array
    seen : bool array, longer than the largest number
    """
    for number in numbers:
        seen[number] = True
