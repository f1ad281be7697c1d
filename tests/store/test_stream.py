"""Token stream, text and documents: round trips, reading across blocks, and removal that leaves nothing."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from colloc.errors import DataError, NotSeenError, StoreDamagedError, UsageError
from colloc.records import NO_TERM, Anchors, DocumentRow, SourceInfo
from colloc.store import documents, stream, texts
from colloc.store.inputs import sources
from colloc.store.opening import open_for_reading

from .making import DOCUMENTS, empty_store, small_store

OFFSETS = st.lists(st.integers(0, 50), max_size=9, unique=True).map(sorted)


@given(
    tokens=st.lists(st.one_of(st.integers(0, 9), st.integers(0, 2**32 - 1)), min_size=51, max_size=60),
    offsets=st.tuples(OFFSETS, OFFSETS, OFFSETS),
    continues=st.booleans(),
)
@settings(max_examples=25, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_blocks_survive(tmp_path: Path, tokens: list[int], offsets: tuple[list[int], ...], continues: bool) -> None:
    sentences, paragraphs, starts = (np.array(values, dtype=np.int64) for values in offsets)
    numbers = np.where(starts % 3 == 0, -1, starts * 2**33)
    anchors = Anchors(sentences, sentences * 2**31)
    array = np.array(tokens, dtype=np.uint32)
    block = stream.Block(0, 0, array, sentences, paragraphs, starts, numbers, continues, anchors)
    following = replace(block, number=1, first_token=len(array))
    with empty_store(tmp_path) as store:
        stream.append_block(store, block)
        with pytest.raises(UsageError, match="does not follow"):
            stream.append_block(store, block)
        stream.append_block(store, following, np.unique(array[array != NO_TERM]))
        stream.append_column(store, 1, "head", array.astype(np.int32))
        for written in (block, following):
            read = stream.read_block(store, written.number)
            for name in ("tokens", "sentences", "paragraphs", "document_starts", "document_numbers"):
                assert np.array_equal(getattr(read, name), getattr(written, name))
                assert getattr(read, name).dtype == getattr(written, name).dtype
            assert np.array_equal(read.anchors.tokens, anchors.tokens)
            assert np.array_equal(read.anchors.characters, anchors.characters)
            assert read.head == written.head
            present = sorted({token for token in tokens if token != NO_TERM})
            assert stream.block_types(store, written.number).tolist() == present
        assert stream.block_heads(store) == [block.head, following.head]
        assert stream.token_count(store) == 2 * len(tokens)
        assert stream.column_names(store, 0) == []
        assert stream.column_names(store, 1) == ["head"]
        assert np.array_equal(stream.read_column(store, 1, "head"), array.astype(np.int32))
        with pytest.raises(UsageError, match="carries no 'head'"):
            stream.read_column(store, 0, "head")


@given(
    pieces=st.lists(st.text(st.characters(), max_size=30), max_size=6),
    span=st.tuples(st.integers(0, 200), st.integers(0, 200)),
)
@settings(max_examples=40, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_any_text_survives(tmp_path: Path, pieces: list[str], span: tuple[int, int]) -> None:
    """Half surrogate pairs and NUL included: offsets are code points."""
    whole = "".join(pieces)
    with empty_store(tmp_path) as store:
        position = 0
        for piece in pieces:
            texts.append_text(store, position, piece)
            position += len(piece)
        assert texts.has_text(store) == bool(whole)
        assert texts.character_count(store) == len(whole)
        start, stop = sorted(min(place, len(whole)) for place in span)
        if whole:
            assert texts.read_text(store, start, stop) == whole[start:stop]
            with pytest.raises(StoreDamagedError, match="is missing"):
                texts.read_text(store, 0, len(whole) + 1)
            texts.blank_texts(store, [(start, stop)])
            blanked = whole[:start] + " " * (stop - start) + whole[stop:]
            assert texts.read_text(store, 0, len(whole)) == blanked
        else:
            with pytest.raises(UsageError, match="built without its text"):
                texts.read_text(store, 0, 0)


def test_long_text_in_blocks(tmp_path: Path) -> None:
    whole = "".join(f"line {number} é😀\n" for number in range(40_000))
    with empty_store(tmp_path) as store:
        texts.append_text(store, 0, whole)
        assert store.value("SELECT max(n_characters) FROM text_blocks") == texts.BLOCK_CHARACTERS
        for start in range(0, len(whole), 99_991):
            assert texts.read_text(store, start, min(start + 70_000, len(whole))) == whole[start : start + 70_000]
        assert texts.read_text(store, 0, len(whole)) == whole


def _texts_of(store_path: Path) -> list[str]:
    with open_for_reading(store_path) as store:
        rows = list(documents.iterate_documents(store))
        return [texts.read_text(store, row.first_character, row.first_character + row.n_characters) for row in rows]


def test_documents(tmp_path: Path) -> None:
    with small_store(tmp_path / "a.colloc") as store:
        rows = list(documents.iterate_documents(store))
        assert [(row.identifier, dict(row.metadata)) for row in rows] == [(key, d[1]) for key, d in DOCUMENTS.items()]
        assert rows[1] == documents.document(store, 1)
        assert documents.find_document(store, "log-2") == 1
        assert documents.find_document(store, "log-9") is None
        assert documents.document_count(store) == 3 == documents.next_document(store)
        with pytest.raises(NotSeenError, match="no document 9"):
            documents.document(store, 9)
        with pytest.raises(DataError, match="document 'log-2' is in the store already"):
            documents.append_documents(store, [replace(rows[1], number=7)])
        new = replace(rows[1], number=7, identifier="new")
        with pytest.raises(DataError, match="document 'new' is in the store already"):
            documents.append_documents(store, [new, replace(new, number=8)])
        with pytest.raises(DataError, match="half a surrogate pair"):
            documents.append_documents(store, [replace(new, identifier="\ud800")])
    assert _texts_of(tmp_path / "a.colloc") == [text for text, _ in DOCUMENTS.values()]


def _stretches_in(data: bytes) -> set[bytes]:
    return {data[i : i + 12] for i in range(len(data) - 11)}


def _stretches(text: str) -> set[bytes]:
    """All stretches of twelve bytes."""
    return _stretches_in(text.encode())


@pytest.mark.parametrize("gone", [0, 1, 2])
def test_a_removed_document_leaves_nothing(tmp_path: Path, gone: int) -> None:
    path = tmp_path / "a.colloc"
    identifiers = list(DOCUMENTS)
    with small_store(path) as store:
        before = [stream.read_block(store, number).tokens for number in range(3)]
        documents.remove_document(store, gone)
        assert documents.document_count(store) == 2
        for number in range(3):
            block = stream.read_block(store, number)
            assert block.document_numbers.tolist() == [-1 if number == gone else number]
            if number == gone:
                assert (block.tokens == NO_TERM).all()
                assert stream.block_types(store, number).tolist() == []
            else:
                assert np.array_equal(block.tokens, before[number])
        # The number is not given again, and the identifier is free.
        assert documents.next_document(store) == 3
        assert documents.find_document(store, identifiers[gone]) is None
        with pytest.raises(NotSeenError):
            documents.remove_document(store, gone)
        store.make_durable()
    kept = [text for name, (text, _) in DOCUMENTS.items() if name != identifiers[gone]]
    assert _texts_of(path) == kept
    data = path.read_bytes()
    assert identifiers[gone].encode() not in data
    # Texts this short stand literally in their zstd frames, all but what is repeated.
    own = _stretches(DOCUMENTS[identifiers[gone]][0]) - set.union(*map(_stretches, kept))
    assert not own & _stretches_in(data)
    assert all(_stretches(text) & _stretches_in(data) for text in kept)


def test_a_document_over_several_blocks_and_half_a_block(tmp_path: Path) -> None:
    with empty_store(tmp_path) as store:
        zero = np.zeros(1, dtype=np.int64)
        tokens = np.arange(12, dtype=np.uint32)
        # Documents 0: tokens 0..5, 1: 5..29, 2: 29..36, over three blocks of twelve.
        starts = [[0, 5], [0], [0, 5]]
        numbers = [[0, 1], [1], [1, 2]]
        for block in range(3):
            offsets, whose = (np.array(values[block], dtype=np.int64) for values in (starts, numbers))
            parts = (tokens, zero, zero, offsets, whose, block > 0, Anchors(zero, zero))
            stream.append_block(store, stream.Block(block, 12 * block, *parts))
            stream.append_column(store, block, "head", tokens.astype(np.int32) + 1)
        for number, (first, stop) in enumerate([(0, 5), (5, 29), (29, 36)]):
            row = DocumentRow(number, f"d{number}", 0, number, first, stop - first, 0, 0)
            documents.append_documents(store, [row])
        documents_before = documents.next_document(store)
        stream.blank_documents(store, [1])
        whole = np.concatenate([stream.read_block(store, block).tokens for block in range(3)])
        assert np.flatnonzero(whole == NO_TERM).tolist() == list(range(5, 29))
        column = np.concatenate([stream.read_column(store, block, "head") for block in range(3)])
        assert np.flatnonzero(column == 0).tolist() == list(range(5, 29))
        assert [stream.read_block(store, block).document_numbers.tolist() for block in range(3)] == [
            [0, -1],
            [-1],
            [-1, 2],
        ]
        assert documents_before == 3


def test_sources(tmp_path: Path) -> None:
    with empty_store(tmp_path) as store:
        first = sources.add_source(store, SourceInfo("a.txt", 10, 1.5))
        second = sources.add_source(store, SourceInfo("b.txt", -1, 0.0))
        assert (first, second) == (0, 1)
        sources.note_records(store, first, 4)
        assert sources.add_source(store, SourceInfo("a.txt", 12, 2.5)) == first
        expected = sources.SourceRow(first, SourceInfo("a.txt", 12, 2.5), None, 4, False)
        assert sources.find_source(store, "a.txt") == expected
        assert [row.number for row in sources.source_list(store)] == [0, 1]
        assert sources.find_source(store, "c.txt") is None


@given(
    lengths=st.lists(st.integers(0, 7), min_size=1, max_size=9),
    size=st.integers(1, 9),
    data=st.data(),
)
@settings(max_examples=25, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_removing_many_at_once(tmp_path: Path, lengths: list[int], size: int, data: st.DataObject) -> None:
    """Documents of any length, none included, over blocks of any size: what stays is what nobody removed."""
    ends = np.cumsum(lengths)
    begins = ends - lengths
    gone = data.draw(st.lists(st.sampled_from(range(len(lengths))), unique=True))
    text = "".join(chr(97 + number) * length for number, length in enumerate(lengths))
    with empty_store(tmp_path) as store:
        zero = np.zeros(0, dtype=np.int64)
        for block, first in enumerate(range(0, int(ends[-1]), size)):
            tokens = np.arange(first, min(first + size, int(ends[-1])), dtype=np.uint32)
            numbers = np.flatnonzero((begins <= first + len(tokens)) & (ends >= first))
            starts = np.clip(begins[numbers] - first, 0, len(tokens))
            anchors = Anchors(zero, zero)
            stream.append_block(store, stream.Block(block, first, tokens, zero, zero, starts, numbers, False, anchors))
            texts.append_text(store, first, text[first : first + size])
        rows = [
            DocumentRow(number, f"d{number}", 0, number, begin, length, begin, length)
            for number, (begin, length) in enumerate(zip(begins.tolist(), lengths, strict=True))
        ]
        documents.append_documents(store, rows)
        documents.remove_documents(store, gone)
        blanked = {place for number in gone for place in range(begins[number], ends[number])}
        position = 0
        for head in stream.block_heads(store):
            block_read = stream.read_block(store, head.number)
            assert not set(gone) & set(block_read.document_numbers.tolist())
            for token in block_read.tokens.tolist():
                assert token == (int(NO_TERM) if position in blanked else position)
                position += 1
        assert position == ends[-1]
        if text:
            expected = "".join(" " if place in blanked else letter for place, letter in enumerate(text))
            assert texts.read_text(store, 0, len(text)) == expected
        assert store.value("SELECT count(*) FROM documents") == len(lengths) - len(gone)
