"""From token places to the text.

A short stretch of plain text around each is segmented again and compared with
the stream; words of annotated text have their places beside them.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from colloc.answers.concordance.matching import segment_settings, versions
from colloc.errors import DataError, StoreDamagedError
from colloc.records import NO_TERM, DocumentRow, Int64Array, UInt32Array
from colloc.store import documents, stream, vocabulary
from colloc.store.annotation import tells_places, word_places
from colloc.store.connection import Store
from colloc.store.stream import Block
from colloc.store.texts import read_text
from colloc.tokens.segmenter import Segmenter

_BYTES_HELD = 96 * 2**20
"""Blocks of the stream that are kept at hand: those of some twenty million tokens."""
_STRETCHES_HELD = 32
_OPENERS = frozenset(("Ps", "Pi"))


@dataclass(frozen=True, slots=True)
class Passage:
    """Consecutive tokens of a document with their text.

    Attributes
    ----------
    document : DocumentRow
    first : int
        Token of the stream.
    text : str
        The text from the first token's beginning (and what is written close before it) to what is written close
        behind the last token.
    start : int
        Character of the document where ``text`` begins.
    starts, ends : int64 arrays
        Each token's offsets in ``text``.
    types : uint32 array
    """

    document: DocumentRow
    first: int
    text: str
    start: int
    starts: Int64Array
    ends: Int64Array
    types: UInt32Array

    def span(self, place: int, length: int) -> tuple[int, int]:
        """Offsets in ``text`` of ``length`` tokens from ``place`` of the stream."""
        offset = place - self.first
        return int(self.starts[offset]), int(self.ends[offset + length - 1])


@dataclass(frozen=True, slots=True)
class _Stretch:
    """Text between two places where segmenting can begin, segmented: offsets are characters of the store."""

    first: int
    starts: Int64Array
    ends: Int64Array
    forms: list[str]
    text: str
    begin: int


class StreamReader:
    """Reads tokens of one store by place; blocks are held up to a bound, so places should come in order."""

    def __init__(self, store: Store) -> None:
        self._store = store
        self._heads = stream.block_heads(store)
        self._firsts = np.array([head.first_token for head in self._heads], np.int64)
        self._blocks: dict[int, Block] = {}
        self._held = 0
        self._documents: dict[int, DocumentRow] = {}
        self._forms: dict[int, str] = {}
        self._form_terms = vocabulary.layer_map(store, "form")

    def sentence(self, place: int, length: int, document: int) -> tuple[int, int]:
        """First token and the one after the last of the sentence, or sentences, that hold ``length`` tokens."""
        row = self.document(document)
        return self._sentence_start(place, row), self._sentence_end(place + length - 1, row)

    def document(self, number: int) -> DocumentRow:
        """A document's row."""
        if number not in self._documents:
            self._documents[number] = documents.document(self._store, number)
        return self._documents[number]

    def types(self, first: int, stop: int) -> UInt32Array:
        """Types of the tokens ``first`` to ``stop`` - 1 of the stream."""
        parts = []
        while first < stop:
            block = self._block(self._block_of(first))
            parts.append(block.tokens[first - block.first_token : stop - block.first_token])
            first = block.first_token + len(block.tokens)
        return np.concatenate(parts) if len(parts) != 1 else parts[0]

    def types_at(self, places: Int64Array) -> UInt32Array:
        """Types of single tokens of the stream, in the order given; each block is read once."""
        order = np.argsort(places, kind="stable")
        numbers = np.searchsorted(self._firsts, places[order], side="right") - 1
        found = np.empty(len(places), np.uint32)
        edges = np.flatnonzero(np.diff(numbers, prepend=-1))
        for start, end in pairwise([*edges.tolist(), len(places)]):
            block = self._block(int(numbers[start]))
            rows = order[start:end]
            found[rows] = block.tokens[places[rows] - block.first_token]
        return found

    def forms(self, types: UInt32Array) -> list[str]:
        """Surface forms (NFC) of types."""
        unknown = [number for number in np.unique(types).tolist() if number not in self._forms]
        if unknown:
            texts = vocabulary.term_texts(self._store, "form", self._form_terms[unknown].tolist())
            self._forms.update(zip(unknown, texts, strict=True))
        return [self._forms[number] for number in types.tolist()]

    def _sentence_start(self, place: int, row: DocumentRow) -> int:
        number = self._block_of(place)
        while True:
            block = self._block(number)
            index = int(np.searchsorted(block.sentences, place - block.first_token, side="right")) - 1
            if index >= 0:
                return max(block.first_token + int(block.sentences[index]), row.first_token)
            if block.first_token <= row.first_token or not block.continues:
                return max(block.first_token, row.first_token)
            number -= 1

    def _sentence_end(self, place: int, row: DocumentRow) -> int:
        end = row.first_token + row.n_tokens
        number = self._block_of(place)
        while number < len(self._heads) and self._heads[number].first_token < end:
            block = self._block(number)
            index = int(np.searchsorted(block.sentences, place - block.first_token, side="right"))
            if index < len(block.sentences):
                return min(block.first_token + int(block.sentences[index]), end)
            number += 1
            if number < len(self._heads) and not self._heads[number].continues:
                return min(self._heads[number].first_token, end)
        return end

    def _block_of(self, place: int) -> int:
        return int(np.searchsorted(self._firsts, place, side="right")) - 1

    def _block(self, number: int) -> Block:
        if number not in self._blocks:
            block = stream.read_block(self._store, number)
            self._held += _size(block)
            while self._blocks and self._held > _BYTES_HELD:
                self._held -= _size(self._blocks.pop(next(iter(self._blocks))))
            self._blocks[number] = block
        return self._blocks[number]


class PassageReader(StreamReader):
    """Reads passages of one store; places that are near each other share the work.

    Raises
    ------
    UsageError
        Where the store keeps no text.
    """

    def __init__(self, store: Store) -> None:
        super().__init__(store)
        read_text(store, 0, 0)  # raises where there is none
        self._segmenter = Segmenter(segment_settings(store))
        self._stretches: dict[tuple[int, int], _Stretch] = {}

    def read(self, first: int, stop: int, document: int) -> Passage:
        """The tokens ``first`` to ``stop`` - 1, cut to their document.

        Raises
        ------
        StoreDamagedError
            The text does not hold the tokens that the stream says.
        DataError
            The same, where the text was segmented by another version.
        """
        row = self.document(document)
        first, stop = max(first, row.first_token), min(stop, row.first_token + row.n_tokens)
        stretch = self._stretch(first, stop, row)
        types = self.types(first, stop)
        rows = self._aligned(stretch, first, types, row)
        starts, ends = stretch.starts[rows], stretch.ends[rows]
        begin, end = _with_surroundings(stretch, int(rows[0]), int(rows[-1]))
        text = stretch.text[begin - stretch.begin : end - stretch.begin]
        return Passage(row, first, text, begin - row.first_character, starts - begin, ends - begin, types)

    def _aligned(self, stretch: _Stretch, first: int, types: UInt32Array, row: DocumentRow) -> Int64Array:
        """Tokens of the stretch that are the stored ones."""
        if (types == NO_TERM).any():
            raise StoreDamagedError(f"{self._store.path}: tokens of document {row.identifier!r} are missing")
        wanted = self.forms(types)
        offset = first - stretch.first
        if stretch.forms[offset : offset + len(wanted)] == wanted:
            return np.arange(offset, offset + len(wanted))
        from importlib.metadata import version

        made_by = versions(self._store)
        if made_by.get("colloc") == version("colloc") and made_by.get("regex") == version("regex"):
            raise StoreDamagedError(
                f"{self._store.path}: the text of document {row.identifier!r} does not hold the tokens "
                "counted from it; build the store again"
            )
        return self._matched(stretch, offset, wanted, row)

    def _matched(self, stretch: _Stretch, offset: int, wanted: list[str], row: DocumentRow) -> Int64Array:
        """Tokens found again where another version divided the text: each of them, in order, or none at all."""
        from difflib import SequenceMatcher

        # The neighbourhood of the expected place only, so that a repeated phrase is not taken for another.
        low = max(0, offset - len(wanted) - 64)
        forms = stretch.forms[low : offset + 2 * len(wanted) + 64]
        matcher = SequenceMatcher(None, forms, wanted, autojunk=False)
        rows = np.full(len(wanted), -1, np.int64)
        for block in matcher.get_matching_blocks():
            rows[block.b : block.b + block.size] = np.arange(block.size) + block.a + low
        if (rows < 0).any():
            raise DataError(
                f"{self._store.path}: document {row.identifier!r} was divided into words by another version of colloc, "
                "and this line cannot be found again; build the store again"
            )
        return rows

    def _stretch(self, first: int, stop: int, row: DocumentRow) -> _Stretch:
        begin, character = self._anchor_before(first, row)
        end, end_character = self._anchor_after(stop, row)
        key = (begin, end)
        if key not in self._stretches:
            if len(self._stretches) >= _STRETCHES_HELD:
                self._stretches.pop(next(iter(self._stretches)))
            annotated = tells_places(self._store, self._block_of(begin))
            make = self._written if annotated else self._segmented
            self._stretches[key] = make(begin, end, character, end_character, row)
        return self._stretches[key]

    def _segmented(self, begin: int, end: int, character: int, end_character: int, row: DocumentRow) -> _Stretch:
        """Plain text: segmented again."""
        last = row.first_character + row.n_characters
        text = read_text(self._store, character, min(end_character + 1, last))
        length = end_character - character
        segments = self._segmenter.segment(text[:length], text[length:], opening=True)
        spans = zip(segments.starts.tolist(), segments.ends.tolist(), strict=True)
        forms = [_nfc(text[start:stop]) for start, stop in spans]
        return _Stretch(begin, segments.starts + character, segments.ends + character, forms, text[:length], character)

    def _written(self, begin: int, end: int, character: int, end_character: int, row: DocumentRow) -> _Stretch:
        """Annotated text: its words have their places beside them."""
        starts, ends, first, at = [], [], begin, character
        while first < end:
            block = self._block(self._block_of(first))
            stop = min(end, block.first_token + len(block.tokens))
            own = word_places(self._store, block, first - block.first_token, stop - block.first_token, at)
            starts.append(own[0])
            ends.append(own[1])
            first = stop
            if first < end:
                # each block begins with a sentence, which is an anchor
                at = int(self._block(self._block_of(first)).anchors.characters[0])
        forms = self.forms(self.types(begin, end))
        text = read_text(self._store, character, end_character)
        return _Stretch(begin, np.concatenate(starts), np.concatenate(ends), forms, text, character)

    def _anchor_before(self, place: int, row: DocumentRow) -> tuple[int, int]:
        number = self._block_of(place)
        while number >= 0 and self._heads[number].first_token + self._heads[number].n_tokens > row.first_token:
            block = self._block(number)
            index = int(np.searchsorted(block.anchors.tokens, place - block.first_token, side="right")) - 1
            if index >= 0:
                anchor = block.first_token + int(block.anchors.tokens[index])
                if anchor >= row.first_token:
                    return anchor, int(block.anchors.characters[index])
                break
            number -= 1
        return row.first_token, row.first_character

    def _anchor_after(self, stop: int, row: DocumentRow) -> tuple[int, int]:
        """The next place where segmenting can begin, at least one token after ``stop``; at most the document's end."""
        end = row.first_token + row.n_tokens
        number = self._block_of(min(stop, end - 1))
        while number < len(self._heads) and self._heads[number].first_token < end:
            block = self._block(number)
            index = int(np.searchsorted(block.anchors.tokens, stop + 1 - block.first_token))
            if index < len(block.anchors.tokens):
                anchor = block.first_token + int(block.anchors.tokens[index])
                if anchor < end:
                    return anchor, int(block.anchors.characters[index])
                break
            number += 1
        return end, row.first_character + row.n_characters


def _size(block: Block) -> int:
    return block.tokens.nbytes + block.sentences.nbytes + block.paragraphs.nbytes


def _nfc(text: str) -> str:
    return text if text.isascii() else unicodedata.normalize("NFC", text)


def _with_surroundings(stretch: _Stretch, first: int, last: int) -> tuple[int, int]:
    """Characters from the first token's opening marks to the last token's closing ones."""
    before_end = int(stretch.ends[first - 1]) if first else stretch.begin
    begin = int(stretch.starts[first])
    before = stretch.text[before_end - stretch.begin : begin - stretch.begin]
    begin -= _opening(before, bool(first))
    end = int(stretch.ends[last])
    whole_end = stretch.begin + len(stretch.text)
    next_start = int(stretch.starts[last + 1]) if last + 1 < len(stretch.starts) else whole_end
    after = stretch.text[end - stretch.begin : next_start - stretch.begin]
    return begin, end + _closing(after, last + 1 < len(stretch.starts))


def _opening(gap: str, follows: bool) -> int:
    """How many characters at the end of a gap between tokens belong to the token behind it."""
    close = len(gap) - max((place + 1 for place, character in enumerate(gap) if character.isspace()), default=0)
    if close < len(gap) or not follows:
        return close
    return _openers(gap)


def _closing(gap: str, follows: bool) -> int:
    """How many characters at the beginning of a gap between tokens belong to the token before it."""
    for place, character in enumerate(gap):
        if character.isspace():
            return place
    return len(gap) - _openers(gap) if follows else len(gap)


def _openers(gap: str) -> int:
    """Opening brackets and quotes at the end of a gap without spaces."""
    count = 0
    while count < len(gap) and unicodedata.category(gap[-1 - count]) in _OPENERS:
        count += 1
    return count


def read_many(reader: PassageReader, spans: Sequence[tuple[int, int, int]]) -> list[Passage]:
    """Passages of (first, stop, document), read in the order of the text and given back in the order asked."""
    order = sorted(range(len(spans)), key=lambda row: spans[row])
    passages: dict[int, Passage] = {row: reader.read(*spans[row]) for row in order}
    return [passages[row] for row in range(len(spans))]
