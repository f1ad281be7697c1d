"""Numbering against a dict of NFC strings, the hash table against a dict, folding against the standard's definition."""

from __future__ import annotations

import random
import unicodedata
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from colloc.records import Segments
from colloc.settings import SegmentSettings
from colloc.tokens.folding import fold
from colloc.tokens.keytable import ABSENT, KeyTable
from colloc.tokens.numbering import TypeNumberer
from colloc.tokens.segmenter import Segmenter
from tests.tokens import texts

pytestmark = pytest.mark.usefixtures("both_ways")


def segments_of(tokens: list[str]) -> Segments:
    """A stretch that holds these tokens, a space between them, as a token pattern could cut it."""
    lengths = np.array([len(token) for token in tokens], np.int64)
    starts = np.cumsum(lengths + 1) - lengths - 1
    nothing = np.zeros(0, np.int64)
    return Segments(" ".join(tokens), starts, starts + lengths, nothing, nothing)


class Plain:
    """The same job with a dict."""

    def __init__(self) -> None:
        self.numbers: dict[str, int] = {}

    def number(self, tokens: list[str]) -> list[int]:
        keys = [unicodedata.normalize("NFC", token) for token in tokens]
        return [self.numbers.setdefault(key, len(self.numbers)) for key in keys]


def assert_like_a_dict(stretches: list[list[str]]) -> TypeNumberer:
    numberer, plain = TypeNumberer(), Plain()
    new: list[str] = []
    for tokens in stretches:
        numbers = numberer.number(segments_of(tokens))
        assert numbers.dtype == np.uint32
        assert numbers.tolist() == plain.number(tokens)
        new += numberer.take_new()
    assert new == list(plain.numbers)
    assert numberer.take_new() == []
    return numberer


# Lengths around every limit of the keys (3, 6, 8 and 16 characters), characters with and
# without codes, U+0000, and canonically equivalent spellings.
few = st.text(st.sampled_from("ab\0ée\u0301\u212bÅ一二\U00020000\uac00\u1100\u1161"), min_size=1, max_size=18)
many = st.text(st.characters(), min_size=1, max_size=18)
token_lists = st.lists(st.lists(st.one_of(few, many), max_size=12), max_size=4)


@settings(max_examples=300)
@given(token_lists)
def test_like_a_dict(stretches: list[list[str]]) -> None:
    assert_like_a_dict(stretches)


@pytest.mark.parametrize("letters", ["abcdefghijklmnopqrst", "一二三四五六七八九十"])
def test_tokens_side_by_side(letters: str) -> None:
    """Nothing of the token that follows at once may get into a key: every prefix alone, then with what follows."""
    numberer, plain = TypeNumberer(), Plain()
    nothing = np.zeros(0, np.int64)
    for size in range(2, len(letters) + 1):
        text = letters[:size]
        for cuts in [[cut] for cut in range(1, size)] + [[]]:
            edges = np.array([0, *cuts, size], np.int64)
            numbers = numberer.number(Segments(text, edges[:-1], edges[1:], nothing, nothing))
            assert numbers.tolist() == plain.number([text[start:end] for start, end in pairwise(edges.tolist())])


def test_like_a_dict_on_prose_of_many_scripts() -> None:
    segmenter = Segmenter(SegmentSettings())
    stretches = []
    for text in texts.real_texts():
        found = segmenter.segment(text)
        stretches.append([text[a:b] for a, b in zip(found.starts.tolist(), found.ends.tolist(), strict=True)])
    assert_like_a_dict(stretches)


def test_many_forms_of_every_length() -> None:
    source = random.Random(5)
    alphabets = ["ab", "abcdefghij", "".join(map(chr, range(0x400, 0x460))), "".join(map(chr, range(0x4E00, 0x4F00)))]
    stretches = [
        ["".join(source.choices(source.choice(alphabets), k=source.randint(1, 20))) for _ in range(4000)]
        for _ in range(4)
    ]
    assert_like_a_dict(stretches)


def test_more_characters_than_the_alphabet_has_codes() -> None:
    letters = [chr(point) for point in range(0xA1, 0x2C00) if chr(point).isalpha()]
    assert len(letters) > 2000
    tokens = ["".join(letters[start : start + size]) for size in (1, 7, 12, 17) for start in range(0, 2000, 3)]
    assert_like_a_dict([tokens, tokens[::-1]])


def test_forms_made_to_collide() -> None:
    """Forms that differ only in padding or at one end, and a pair that collides under every polynomial hash.

    The halves of a Thue-Morse word of 2^11 letters have one polynomial hash modulo 2^64, whatever the base.
    """
    shifted = ["".join("a" if bit else "b" for bit in bits) for bits in np.ndindex(*[2] * 7)]
    padded = ["a" * size + end for size in range(1, 20) for end in ("", "\0", "\0\0")] + ["\0", "\0\0", "\0a"]
    halves = [left + right for left in shifted[:40] for right in shifted[:40]]
    morse = "".join("ab"[bin(position).count("1") % 2] for position in range(2**11))
    pair = [morse[: 2**10], morse[2**10 :]]

    def polynomial(text: str, base: int) -> int:
        value = 0
        for character in text:
            value = (value * base + ord(character)) % 2**64
        return value

    assert polynomial(pair[0], 1_000_003) == polynomial(pair[1], 1_000_003)
    assert_like_a_dict([shifted + padded + halves + pair, [*pair[::-1], *halves, *padded, *shifted]])


def test_reset_forgets_and_nbytes_grows() -> None:
    numberer = TypeNumberer()
    empty = numberer.nbytes
    numberer.number(segments_of([f"word{number}" for number in range(20_000)]))
    assert numberer.nbytes > empty + 20_000 * 60
    numberer.reset()
    assert numberer.nbytes == empty
    assert numberer.take_new() == []
    assert numberer.number(segments_of(["b", "a", "b"])).tolist() == [0, 1, 0]
    assert numberer.take_new() == ["b", "a"]


@pytest.mark.parametrize("words", [1, 2, 4])
def test_the_table_is_like_a_dict(words: int) -> None:
    source = np.random.default_rng(words)
    table, plain = KeyTable(words), {}
    pool = source.integers(0, 2**63, (30_000, words)).astype(np.uint64)
    pool[:20_000] &= np.uint64(0xFF00FF)  # close together, many equal in one word
    pool = np.unique(pool, axis=0)
    source.shuffle(pool)
    for part in np.array_split(pool, 7):
        keys = [np.ascontiguousarray(column) for column in part.T]
        assert (table.find(keys) == ABSENT).all()
        values = source.integers(0, 5, len(part)).astype(np.uint32)  # numbers may be shared
        table.add(keys, values)
        plain.update({tuple(key): int(value) for key, value in zip(part.tolist(), values, strict=True)})
        assert table.find([np.ascontiguousarray(column) for column in pool.T]).tolist() == [
            plain.get(tuple(key), int(ABSENT)) for key in pool.tolist()
        ]


@pytest.mark.parametrize("words", [1, 2])
def test_keys_in_one_corner_of_the_table(words: int) -> None:
    """All keys in one slot: still exact, only slower. Of two words the first is always the same."""
    table = KeyTable(words)
    table._multipliers = [np.uint64(1)] * words  # the slot is then the highest bits of the sum

    def keys(last: np.ndarray) -> list[np.ndarray]:
        return [*[np.full(len(last), 5, np.uint64)] * (words - 1), last.astype(np.uint64)]

    numbers = np.arange(1, 1500, dtype=np.uint32)
    table.add(keys(numbers), numbers)
    assert table.find(keys(numbers)).tolist() == numbers.tolist()
    assert (table.find(keys(numbers + 2000)) == ABSENT).all()


@given(st.text(max_size=12))
def test_folding_is_canonical_caseless(text: str) -> None:
    """The Unicode Standard, section 3.13, D145: toCasefold of NFD, compared in NFD."""
    decomposed = unicodedata.normalize("NFD", unicodedata.normalize("NFD", text).casefold())
    assert fold(text) == unicodedata.normalize("NFC", decomposed)
    assert fold(fold(text)) == fold(text)
    assert fold(unicodedata.normalize("NFD", text)) == fold(unicodedata.normalize("NFC", text)) == fold(text)


@pytest.mark.parametrize(
    ("text", "folded"),
    [("STRASSE", "strasse"), ("Straße", "strasse"), ("ΣΊΣΥΦΟΣ", "σίσυφοσ"), ("ﬁn", "fin"), ("É", "é")],
)
def test_folding_examples(text: str, folded: str) -> None:
    """CaseFolding.txt, statuses C and F."""
    assert fold(text) == folded
