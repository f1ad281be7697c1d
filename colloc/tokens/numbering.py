"""Surface forms -> local type numbers, exactly and on whole arrays.

A short token becomes a key of one or two 64-bit words that spells it out, so that
equal keys are equal strings: eight characters a word through an alphabet of up to
255 characters that is filled as they are met, or three a word as plain code
points. Keys are found in hash tables that compare them; only forms not met
before, and long tokens, become Python strings.
"""

from __future__ import annotations

import unicodedata
from collections import defaultdict
from collections.abc import Callable
from dataclasses import dataclass
from itertools import count, islice
from typing import Final

import numpy as np
from numpy.typing import NDArray

from colloc.kernels.numbers import UNKEYED, find_short, number_tokens
from colloc.kernels.switch import compiled
from colloc.records import Int64Array, Segments, UInt32Array, UInt64Array
from colloc.tokens.arrays import distinct
from colloc.tokens.classes import Points, code_points
from colloc.tokens.keytable import ABSENT, KeyTable

_CODED_WORD: Final = 8
_PLAIN_WORD: Final = 3
_PART: Final = 1 << 15
_TABLES: Final = 4
_MASKS: Final = np.array([(1 << (8 * n)) - 1 for n in range(_CODED_WORD + 1)], np.uint64)
_BYTES_A_STRING: Final = 160
"""A short string, its number and its share of the dict, roughly."""

Codes = NDArray[np.uint8]


class Alphabet:
    """An injective map from code points to one byte: ASCII to itself, others as they come; 0: no code.

    Ideographs and other characters of large scripts get no code; the alphabets
    of several scripts fit in together.
    """

    def __init__(self) -> None:
        self._codes = np.zeros(0x110000, np.uint8)
        self._codes[1:128] = np.arange(1, 128)
        self._free = 128

    @property
    def nbytes(self) -> int:
        """Bytes held."""
        return self._codes.nbytes

    def encode(self, points: Points) -> Codes:
        """Codes of code points, shape (n,), with room for reading 16 bytes from each place: shape (n + 16,)."""
        coded = np.zeros(len(points) + 2 * _CODED_WORD, np.uint8)
        coded[: len(points)] = points
        foreign = np.flatnonzero(points > 127)
        if len(foreign):
            characters = points[foreign]
            codes = self._codes[characters]
            if self._free < 256 and not codes.all():
                self._extend(characters[codes == 0])
                codes = self._codes[characters]
            coded[foreign] = codes
        return coded

    def _extend(self, characters: Points) -> None:
        fresh = np.unique(characters)
        # U+2E80 begins the blocks of East Asian scripts; katakana (U+30A0..) is small enough to be coded.
        fresh = fresh[(fresh < 0x2E80) | ((fresh >= 0x30A0) & (fresh < 0x3100))][: 256 - self._free]
        self._codes[fresh] = np.arange(self._free, self._free + len(fresh))
        self._free += len(fresh)


@dataclass(frozen=True)
class _Unknown:
    """Keys that a table does not know yet: distinct, each with the token where it first stands."""

    table: KeyTable
    keys: list[UInt64Array]
    first: Int64Array
    tokens: Int64Array
    inverse: Int64Array


class TypeNumberer:
    """Numbers surface forms by their type (the form in NFC), in order of first appearance."""

    nbytes: int
    """Bytes held, roughly."""

    def __init__(self) -> None:
        self.reset()

    def reset(self) -> None:
        """Forget everything: numbers begin again at 0."""
        self._alphabet = Alphabet()
        self._short, self._long, self._plain = KeyTable(1), KeyTable(2), KeyTable(2)
        # Whatever is asked for gets a number: the next one where it has none.
        self._numbers: defaultdict[str, int] = defaultdict(count().__next__)
        self._new: list[str] = []
        self._measure()

    def take_new(self) -> list[str]:
        """NFC type keys first seen since the last call, in the order of their numbers."""
        taken, self._new = self._new, []
        return taken

    def number(self, segments: Segments) -> UInt32Array:
        """Local type number of each token, shape (n_tokens,)."""
        numbers = np.full(len(segments.starts), ABSENT, np.uint32)
        if len(numbers):
            points = code_points(segments.text) if segments.points is None else segments.points
            number = self._number_in_a_loop if compiled() else self._number_arrays
            number(segments, points, self._alphabet.encode(points), numbers)
            self._measure()
        return numbers

    def _number_in_a_loop(self, segments: Segments, points: Points, coded: Codes, numbers: UInt32Array) -> None:
        """Write the numbers with a compiled loop, which stops where a table must grow."""
        tables = (self._short, self._long, self._plain)
        # Code points are asked for only where a character has no code.
        spelled = points.astype(np.uint32) if not coded[: len(points)].all() else np.zeros(0, np.uint32)
        fresh, slots = np.empty(len(numbers), np.int64), np.empty(len(numbers), np.int64)
        multipliers = np.array(
            [table.multipliers[word % len(table.multipliers)] for table in tables for word in (0, 1)]
        )
        keys, values = self._short.arrays
        shift = np.uint64(self._short.shift)
        find_short(coded, segments.starts, segments.ends, keys, values, self._short.multipliers[0], shift, numbers)
        done = 0
        while True:
            base, first = len(self._numbers), done
            room = np.array([*(table.room for table in tables), 0], np.int64)
            before = room.copy()
            shifts = np.array([table.shift for table in tables], np.int64)
            arrays = [array for table in tables for array in table.arrays]
            done = number_tokens(
                *(coded, spelled, segments.starts, segments.ends, first, base),
                *(*arrays, multipliers, shifts, room, numbers, fresh, slots),
            )
            n_fresh = int(room[UNKEYED])
            final = np.array(self._spelled_numbers(segments, fresh[:n_fresh]), np.uint32)
            # Tokens told twice, and forms that are canonically equivalent, share a number.
            if n_fresh and not np.array_equal(final, np.arange(base, base + n_fresh)):
                told = numbers[first:done]
                moved = np.flatnonzero(told >= base)
                told[moved] = final[told[moved] - np.uint32(base)]
            for place, table in enumerate(tables):
                table.note(int(before[place] - room[place]))
                entered = np.flatnonzero(slots[:n_fresh] % _TABLES == place)
                table.arrays[-1][slots[entered] // _TABLES] = final[entered]
            if done == len(numbers):
                return
            for place, table in enumerate(tables):
                if room[place] == 0:
                    table.grow()

    def _number_arrays(self, segments: Segments, points: Points, coded: Codes, numbers: UInt32Array) -> None:
        """Write the numbers with array operations."""
        starts, lengths = segments.starts, segments.ends - segments.starts
        uncoded = _tokens_with_zeros(coded[: len(points)], starts, segments.ends)
        # A view at every byte: the word that begins at a token's start is one element.
        words = np.ndarray((len(coded) - _CODED_WORD + 1,), "<u8", coded, strides=(1,))
        is_short = lengths <= _CODED_WORD
        is_long = (lengths > _CODED_WORD) & (lengths <= 2 * _CODED_WORD)
        is_short[uncoded] = is_long[uncoded] = False

        def short_keys(tokens: Int64Array) -> list[UInt64Array]:
            return [words[starts[tokens]] & _MASKS[lengths[tokens]]]

        def long_keys(tokens: Int64Array) -> list[UInt64Array]:
            second = words[starts[tokens] + _CODED_WORD] & _MASKS[lengths[tokens] - _CODED_WORD]
            return [words[starts[tokens]], second]

        plain = _plain_tokens(points, starts, lengths, uncoded)
        looked_up = [
            _look_up(self._short, np.flatnonzero(is_short), short_keys, numbers),
            _look_up(self._long, np.flatnonzero(is_long), long_keys, numbers),
            _look_up(self._plain, plain, lambda tokens: _plain_keys(points, starts, lengths, tokens), numbers),
        ]
        self._number_new(segments, numbers, [unknown for unknown in looked_up if unknown is not None])

    def _number_new(self, segments: Segments, numbers: UInt32Array, unknown: list[_Unknown]) -> None:
        """Give numbers to what no table knows, in the order of the text."""
        listed = numbers == ABSENT
        for part in unknown:
            listed[part.tokens] = False
            listed[part.first] = True
        tokens = np.flatnonzero(listed)
        if not len(tokens):
            return
        numbers[tokens] = self._spelled_numbers(segments, tokens)
        for part in unknown:
            values = numbers[part.first]
            part.table.add(part.keys, values)
            numbers[part.tokens] = values[part.inverse]

    def _spelled_numbers(self, segments: Segments, tokens: Int64Array) -> list[int]:
        """Numbers of the types of some tokens as strings; those that are canonically equivalent share one."""
        spans = zip(segments.starts[tokens].tolist(), segments.ends[tokens].tolist(), strict=True)
        keys = [segments.text[start:end] for start, end in spans]
        if not all(map(str.isascii, keys)):
            keys = [key if key.isascii() else unicodedata.normalize("NFC", key) for key in keys]
        known = len(self._numbers)
        result = list(map(self._numbers.__getitem__, keys))
        # What is new stands at the end of the dict.
        self._new += list(islice(reversed(self._numbers), len(self._numbers) - known))[::-1]
        return result

    def _measure(self) -> None:
        tables = self._short.nbytes + self._long.nbytes + self._plain.nbytes + self._alphabet.nbytes
        self.nbytes = tables + _BYTES_A_STRING * len(self._numbers)


def _tokens_with_zeros(codes: Points, starts: Int64Array, ends: Int64Array) -> Int64Array:
    """Tokens that hold a character without a code, ascending."""
    zeros = np.flatnonzero(codes == 0)
    if not len(zeros):
        return zeros
    tokens = np.searchsorted(starts, zeros, "right") - 1
    inside = (tokens >= 0) & (zeros < ends[np.maximum(tokens, 0)])
    return distinct(tokens[inside])


def _plain_tokens(points: Points, starts: Int64Array, lengths: Int64Array, tokens: Int64Array) -> Int64Array:
    """Those of `tokens` that two words of three code points can spell; U+0000 would pass for padding."""
    fitting = tokens[lengths[tokens] <= 2 * _PLAIN_WORD]
    if not len(fitting):
        return fitting
    return np.setdiff1d(fitting, _tokens_with_zeros(points, starts, starts + lengths), assume_unique=True)


def _plain_keys(points: Points, starts: Int64Array, lengths: Int64Array, tokens: Int64Array) -> list[UInt64Array]:
    keys = [np.zeros(len(tokens), np.uint64), np.zeros(len(tokens), np.uint64)]
    for offset in range(2 * _PLAIN_WORD):
        found = points[np.minimum(starts[tokens] + offset, len(points) - 1)].astype(np.uint64)
        found[offset >= lengths[tokens]] = 0
        keys[offset // _PLAIN_WORD] |= found << np.uint64(21 * (offset % _PLAIN_WORD))
    return keys


def _look_up(
    table: KeyTable, tokens: Int64Array, keys_of: Callable[[Int64Array], list[UInt64Array]], numbers: UInt32Array
) -> _Unknown | None:
    """Write the numbers of the keys that the table knows; tell the others, where there are any."""
    # In parts that stay in the processor's cache.
    for first in range(0, len(tokens), _PART):
        part = tokens[first : first + _PART]
        numbers[part] = table.find(keys_of(part))
    tokens = tokens[numbers[tokens] == ABSENT]
    if not len(tokens):
        return None
    keys = keys_of(tokens)
    combined = keys[0]
    if len(keys) == 2:
        ranks = [np.unique(key, return_inverse=True)[1] for key in keys]
        combined = (ranks[0] * len(tokens) + ranks[1]).astype(np.uint64)
    _, first_places, inverse = np.unique(combined, return_index=True, return_inverse=True)
    return _Unknown(table, [key[first_places] for key in keys], tokens[first_places], tokens, inverse)
