"""Many slices of one stretch of bytes at once: gathered, searched, and read as numbers."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from colloc.kernels import slices as loops
from colloc.kernels.switch import compiled
from colloc.records import Int64Array, UInt8Array, UInt64Array

WORD = 8
MASKS = np.array([(1 << (8 * n)) - 1 for n in range(WORD + 1)], np.uint64)
"""The first n bytes of a word, by n."""
_ZEROS = 0x3030303030303030
# Digits of a number of n bytes are moved to the word's end and zeros written before them.
_SHIFTS = np.array([0, *(64 - 8 * n for n in range(1, WORD + 1))], np.uint64)
_PADS = np.array([0, *(_ZEROS >> (8 * n) if n < WORD else 0 for n in range(1, WORD + 1))], np.uint64)

_COUNTING = np.arange(1 << 14)


class Buffer:
    """Bytes as an array, and the eight bytes from each place on as one number.

    Attributes
    ----------
    data : bytes
    bytes : uint8 array, shape (n,)
    padded : uint8 array, shape (n + 8,)
        The same with zeros behind the end.
    words : uint64 array, shape (n + 1,)
        Little-endian, of ``padded``.
    """

    def __init__(self, data: bytes) -> None:
        self.data = data
        self.padded: UInt8Array = np.frombuffer(data + bytes(WORD), np.uint8)
        self.bytes: UInt8Array = self.padded[: len(data)]
        self.words: UInt64Array = np.ndarray((len(data) + 1,), "<u8", self.padded, strides=(1,))

    @cached_property
    def is_ascii(self) -> bool:
        """Whether a byte is a code point everywhere."""
        return self.data.isascii()

    def text(self, start: int, stop: int) -> str:
        """A slice as text."""
        return self.data[start:stop].decode("utf-8", "surrogatepass")


@dataclass(frozen=True, slots=True)
class Slices:
    """Slices of a buffer: where each starts, and its bytes. Arrays of shape (n,), int64."""

    starts: Int64Array
    lengths: Int64Array

    def __len__(self) -> int:
        return len(self.starts)

    def only(self, chosen: NDArray[np.integer] | NDArray[np.bool_]) -> Slices:
        """Some of them."""
        return Slices(self.starts[chosen], self.lengths[chosen])

    def through(self, last: Slices) -> Slices:
        """Slices from the start of these to the end of the ``last``."""
        return Slices(self.starts, last.starts + last.lengths - self.starts)

    def are(self, buffer: Buffer, text: bytes) -> NDArray[np.bool_]:
        """Which of them hold ``text`` (of at most eight bytes) and nothing else."""
        same: NDArray[np.bool_] = self.lengths == len(text)
        same &= buffer.words[self.starts] & MASKS[len(text)] == np.uint64(int.from_bytes(text, "little"))
        return same


def dividers(data: UInt8Array) -> tuple[Int64Array, Int64Array]:
    """Where tabs and line feeds stand, and which of them (offsets) are line feeds."""
    # They are neighbours: the bytes 9 and 10.
    either = data - np.uint8(ord("\t")) < 2
    if compiled():
        places, ends = (np.empty(np.count_nonzero(one) + 1, np.int64) for one in (either, data == ord("\n")))
        return places[:-1], ends[: loops.divide(data, places, ends)]
    found = np.flatnonzero(either)
    return found, np.flatnonzero(data[found] == ord("\n"))


def gather(data: UInt8Array, slices: Slices) -> tuple[UInt8Array, Int64Array]:
    """The bytes of slices, one after the other, and where each begins among them."""
    if compiled():
        copied, firsts = np.empty(int(slices.lengths.sum()), np.uint8), np.empty(len(slices), np.int64)
        loops.copy(data, slices.starts, slices.lengths, copied, firsts)
        return copied, firsts
    ends = np.cumsum(slices.lengths)
    begins = ends - slices.lengths
    places = np.repeat(slices.starts - begins, slices.lengths)
    # In parts that stay in the processor's cache.
    gathered = np.empty(len(places), np.uint8)
    for first in range(0, len(places), len(_COUNTING)):
        part = places[first : first + len(_COUNTING)]
        part += _COUNTING[: len(part)]
        part += first
        np.take(data, part, out=gathered[first : first + len(part)], mode="clip")
    return gathered, begins


def column_text(buffer: Buffer, column: Slices) -> tuple[UInt8Array, Int64Array]:
    """Fields with a line feed behind each, and where each begins; a byte that divides fields follows each of them."""
    joined, begins = gather(buffer.bytes, Slices(column.starts, column.lengths + 1))
    joined[begins + column.lengths] = ord("\n")
    return joined, begins


def having(joined: UInt8Array, begins: Int64Array, part: bytes) -> NDArray[np.bool_]:
    """Which fields of `column_text` have ``part`` among what ``|`` divides them into."""
    found = np.flatnonzero(joined[: max(len(joined) - len(part), 0)] == part[0])
    for offset, byte in enumerate(part[1:], 1):
        found = found[joined[found + offset] == byte]
    after = joined[found + len(part)]
    before = joined[np.maximum(found - 1, 0)]
    edges = (ord("\n"), ord("|"))
    found = found[np.isin(after, edges) & (np.isin(before, edges) | (found == 0))]
    fields = np.zeros(len(begins), bool)
    fields[np.searchsorted(begins, found, "right") - 1] = True
    return fields


def whole_numbers(buffer: Buffer, column: Slices) -> tuple[Int64Array, NDArray[np.bool_]]:
    """Fields of one to eight digits without zeros in front as numbers, and which fields are something else.

    Eight digits are added up at once: neighbours to pairs, pairs to fours, fours to eights.
    """
    if compiled():
        numbers, wrong = np.empty(len(column), np.int64), np.empty(len(column), bool)
        loops.read_numbers(buffer.padded, column.starts, column.lengths, numbers, wrong)
        return numbers, wrong
    shorts = np.minimum(column.lengths, WORD)
    digits = buffer.words[column.starts] << _SHIFTS[shorts]
    first = (digits >> _SHIFTS[shorts]) & np.uint64(0xFF)
    digits |= _PADS[shorts]
    # Digits are the bytes 0x30 to 0x39: high half 3, before and after 6 is added.
    high = np.uint64(0xF0F0F0F0F0F0F0F0)
    other = digits & high != np.uint64(_ZEROS)
    other |= (digits + np.uint64(0x0606060606060606)) & high != np.uint64(_ZEROS)
    other |= (column.lengths > WORD) | (column.lengths == 0)
    other |= (first == ord("0")) & (column.lengths > 1)
    digits = ((digits & np.uint64(0x0F0F0F0F0F0F0F0F)) * np.uint64(2561)) >> np.uint64(8)
    digits = ((digits & np.uint64(0x00FF00FF00FF00FF)) * np.uint64(6553601)) >> np.uint64(16)
    digits = ((digits & np.uint64(0x0000FFFF0000FFFF)) * np.uint64(42949672960001)) >> np.uint64(32)
    return digits.astype(np.int64), other


def code_points_before(data: UInt8Array, places: Int64Array) -> Int64Array:
    """How many code points of UTF-8 stand before each of the ascending places."""
    inside = np.flatnonzero((data & 0xC0) == 0x80)
    return places - np.searchsorted(inside, places)
