"""The array operations below annotated text, against plain Python on made bytes."""

from __future__ import annotations

import random

import numpy as np
import pytest

from colloc.tokens.annotated import slicetable
from colloc.tokens.annotated.buffer import (
    Buffer,
    Slices,
    code_points_before,
    column_text,
    gather,
    having,
    whole_numbers,
)
from colloc.tokens.annotated.slicetable import LONGEST_HASHED, SliceTable
from colloc.tokens.annotated.values import by_appearance

pytestmark = pytest.mark.usefixtures("loops")


def buffer_of(fields: list[bytes]) -> tuple[Buffer, Slices]:
    """Fields divided by tabs."""
    lengths = np.array([len(field) for field in fields], np.int64)
    starts = np.cumsum(lengths + 1) - lengths - 1
    return Buffer(b"".join(field + b"\t" for field in fields)), Slices(starts, lengths)


def made_fields(seed: int, n: int) -> list[bytes]:
    """Fields of all lengths, many alike, among them some that differ in their last or first byte only."""
    chance = random.Random(seed)
    stems = [
        bytes(chance.choices(b"ab\0\xc3\xa9", k=chance.choice([1, 2, 7, 8, 9, 15, 16, 17, 40]))) for _ in range(30)
    ]
    stems += [b"x" * chance.randint(LONGEST_HASHED - 2, LONGEST_HASHED + 20) for _ in range(5)]
    fields = []
    for _ in range(n):
        stem = chance.choice(stems)
        fields.append(chance.choice([stem, stem + b"\0", b"z" + stem[1:], stem[:-1] + b"z"]))
    return fields


def numbers_by_dict(fields: list[bytes], known: dict[bytes, int]) -> list[int]:
    """What numbers are, up to their order."""
    return [known.setdefault(field, len(known)) for field in fields]


@pytest.mark.parametrize("seed", range(5))
@pytest.mark.parametrize("collide", [False, True])
def test_slices_are_numbered_as_a_dictionary_would(seed: int, collide: bool, monkeypatch: pytest.MonkeyPatch) -> None:
    """Also where every slice has one of four hashes."""
    if collide:
        # Multiplied by this, numbers keep their lowest two bits.
        monkeypatch.setattr(slicetable.secrets, "randbits", lambda bits: 2 ** (bits - 2) - 1)
    table, known, pairs = SliceTable(), dict[bytes, int](), set[tuple[int, int]]()
    for part in range(4):
        fields = made_fields(10 * seed + part, 400)
        before = len(table)
        numbers, fresh = table.number(*buffer_of(fields))
        assert numbers[fresh].tolist() == [*range(before, len(table))]
        pairs |= {*zip(numbers.tolist(), numbers_by_dict(fields, known), strict=True)}
    assert len(pairs) == len(table) == len(known)
    assert len({ours for ours, _ in pairs}) == len({theirs for _, theirs in pairs}) == len(known)


def test_new_slices_come_in_the_order_of_the_text() -> None:
    table = SliceTable()
    numbers, fresh = table.number(*buffer_of([b"b", b"a", b"b", b"c", b"a"]))
    assert numbers.tolist() == [0, 1, 0, 2, 1]
    assert fresh.tolist() == [0, 1, 3]
    assert table.nbytes > 0


def test_memory_of_a_table_goes_by_what_it_keeps() -> None:
    table = SliceTable()
    table.number(*buffer_of([b"%d" % n for n in range(1000)]))
    small = table.nbytes
    table.number(*buffer_of([b"%d" % n * 8 for n in range(100_000)]))
    assert small < 200_000 < 3_000_000 < table.nbytes < 20_000_000


WHOLE = "0 1 9 10 99 123 4567 12345678 99999999"
OTHER = "123456789 00 01 _ a 1a a1 1-2 1.1 -1 +1 / : 12: /9 ² ٣ 1234567a"


@pytest.mark.parametrize("field", f"{WHOLE} {OTHER}".split())
def test_whole_numbers(field: str) -> None:
    """Eight digits at most, none but 0 to 9 (RFC 20), no zeros in front; all else is told."""
    values, other = whole_numbers(*buffer_of([b"7", field.encode(), b"", b"12"]))
    plain = field.isascii() and field.isdigit() and len(field) <= 8 and (field == "0" or field[0] != "0")
    assert other.tolist() == [False, not plain, True, False]
    assert values[[0, 3]].tolist() == [7, 12]
    assert not plain or values[1] == int(field)


def test_fields_that_have_a_part() -> None:
    fields = [
        "_",
        "SpaceAfter=No",
        "SpaceAfter=Nope",
        "a|SpaceAfter=No|b",
        "xSpaceAfter=No",
        "SpaceAfter=No|é",
        "S",
        "a|b",
    ]
    buffer, slices = buffer_of([field.encode() for field in fields])
    joined, begins = column_text(buffer, slices)
    assert joined.tobytes().decode() == "".join(f"{field}\n" for field in fields)
    wanted = ["SpaceAfter=No" in field.split("|") for field in fields]
    assert having(joined, begins, b"SpaceAfter=No").tolist() == wanted
    assert not having(joined[:0], begins[:0], b"SpaceAfter=No").any()


def test_gathering_and_counting_code_points() -> None:
    chance = random.Random(2)
    text = "".join(chance.choices("aé\u20ac\U0001f600", k=50_000))
    data = np.frombuffer(text.encode(), np.uint8)
    starts = np.array(sorted(chance.sample(range(len(data) - 9), 9000)), np.int64)
    lengths = np.array([chance.randint(0, 9) for _ in starts], np.int64)
    joined, begins = gather(data, Slices(starts, lengths))
    plain = [data.tobytes()[start : start + length] for start, length in zip(starts, lengths, strict=True)]
    assert joined.tobytes() == b"".join(plain)
    assert begins.tolist() == (np.cumsum(lengths) - lengths).tolist()
    places = np.array([len(text[:n].encode()) for n in range(0, 50_000, 1000)], np.int64)
    assert code_points_before(data, places).tolist() == [*range(0, 50_000, 1000)]


def test_fields_by_appearance() -> None:
    numbers, texts = by_appearance(
        np.array([5, 2, 5, 0, 2], np.uint32), ["zero", "one", "two", "three", "four", "five"]
    )
    assert (numbers.tolist(), texts) == ([0, 1, 0, 2, 1], ["five", "two", "zero"])


def test_growing_arrays_keep_what_they_hold() -> None:
    array = slicetable.Growing(np.int64)
    for first in range(0, 5000, 100):
        array.extend(np.arange(first, first + 100))
    array.drop(10)
    assert array.values.tolist() == [*range(4990)]
