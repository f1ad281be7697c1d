"""Checks find every kind of damage, and damage never becomes a wrong number. Expected values: the undamaged store."""

from __future__ import annotations

import random
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from colloc.errors import StoreDamagedError
from colloc.records import Anchors, DocumentRow
from colloc.settings import TallySpec
from colloc.store import documents, stream, tallies, texts, visibility, vocabulary
from colloc.store.checking import check
from colloc.store.database import packing
from colloc.store.opening import Store, open_for_reading
from colloc.store.pages import ORDERS, PageHead, encode_page

from .making import WINDOW, block_of, cells_of, margins_of, small_store, store_of_terms, table_of, write_tally

BLOBS = {
    "layer_maps": ("data",),
    "word_counts": ("numbers", "tokens", "documents"),
    "blocks": ("types", "sentences", "paragraphs", "document_starts", "document_numbers", "tokens", "anchor_tokens"),
    "text_blocks": ("data",),
    "tally_runs": ("summary", "low_directory", "high_directory"),
    "tally_pages": ("data",),
    "margin_pages": ("numbers", "first", "second"),
}


@pytest.fixture
def store(tmp_path: Path) -> Store:
    """A sound store whose table has had a change."""
    store = small_store(tmp_path / "a.colloc")
    write_tally(store, WINDOW, {(0, 1): 2, (1, 0): 1}, delta=True)
    assert check(store) == []
    return store


def _answers(store: Store) -> dict[str, Callable[[], Any]]:
    """Questions of every kind, each asked anew."""

    def tally() -> tallies.Tally:
        found = tallies.find(store, WINDOW)
        assert found is not None
        return found

    def blocks() -> list[list[int]]:
        return [stream.read_block(store, head.number).tokens.tolist() for head in stream.block_heads(store)]

    return {
        "table": lambda: table_of(store, WINDOW),
        "around": lambda: [cells_of(tally().around(term)) for term in range(vocabulary.term_count(store, "fold"))],
        "pairs": lambda: tally().pairs(*np.triu_indices(9)).forward.tolist(),
        "margins": lambda: (tally().first.tolist(), tally().second.tolist(), tally().total, tally().n_pairs),
        "words": lambda: vocabulary.word_counts(store, "fold").tokens.tolist(),
        "spread": lambda: vocabulary.word_counts(store, "fold").documents.tolist(),
        "map": lambda: vocabulary.layer_map(store, "fold").tolist(),
        "stream": blocks,
        "present": lambda: [stream.block_types(store, head.number).tolist() for head in stream.block_heads(store)],
        "text": lambda: texts.read_text(store, 0, texts.character_count(store)),
    }


def _right_or_refused(store: Store, right: dict[str, Any]) -> int:
    """How many questions are refused; none may be answered otherwise than by the undamaged store."""
    refused = 0
    for name, question in _answers(store).items():
        try:
            answer = question()
        except StoreDamagedError:
            refused += 1
        else:
            assert answer == right[name], name
    return refused


@pytest.mark.parametrize(
    ("table", "column"), [(table, column) for table, columns in BLOBS.items() for column in columns]
)
def test_damaged_bytes_are_found_and_never_answered_from(store: Store, table: str, column: str) -> None:
    right = {name: question() for name, question in _answers(store).items()}
    generator = random.Random(f"{table}.{column}")
    rows = store.rows(f"SELECT rowid, {column} FROM {table} WHERE length({column}) > 0")
    asked = {"sentences", "paragraphs", "document_starts", "document_numbers", "anchor_tokens"}
    assert rows
    for rowid, data in generator.sample(rows, min(3, len(rows))):
        for position in generator.sample(range(len(data)), min(6, len(data))):
            damaged = bytearray(data)
            damaged[position] ^= 1 << generator.randrange(8)
            store.execute(f"UPDATE {table} SET {column} = ? WHERE rowid = ?", (bytes(damaged), rowid))
            refused = _right_or_refused(store, right)
            assert refused >= 1 or column in asked
            assert check(store) != []
        store.execute(f"UPDATE {table} SET {column} = ? WHERE rowid = ?", (data, rowid))
    assert check(store) == []
    assert _right_or_refused(store, right) == 0


@pytest.mark.parametrize(
    "sql",
    [
        "DELETE FROM tally_pages WHERE rowid = 1",
        "UPDATE tally_pages SET data = (SELECT data FROM tally_pages AS other WHERE other.rowid = 2) WHERE rowid = 1",
        "UPDATE tally_pages SET page = -1 WHERE rowid = 1",
        "DELETE FROM margin_pages WHERE rowid = 1",
        "UPDATE tally_runs SET base = 0",
        "UPDATE tally_runs SET summary = (SELECT summary FROM tally_runs AS other WHERE other.id = 2) WHERE id = 1",
        "UPDATE tally_runs SET low_directory = high_directory WHERE id = 1",
        "UPDATE blocks SET first_token = first_token + 1 WHERE id = 1",
        "UPDATE blocks SET n_tokens = n_tokens - 1 WHERE id = 1",
        "UPDATE blocks SET tokens = (SELECT tokens FROM blocks AS other WHERE other.id = 0) WHERE id = 1",
        "DELETE FROM blocks WHERE id = 1",
        "DELETE FROM layer_maps",
        "UPDATE layers SET terms = terms - 1 WHERE name = 'fold'",
        "UPDATE layers SET types = types - 1 WHERE name = 'fold'",
        "DELETE FROM text_blocks WHERE first_character > 0",
        "UPDATE text_blocks SET n_characters = n_characters + 1",
        "UPDATE tally_pages SET data = 'text'",
    ],
)
def test_exchanged_and_missing_parts(store: Store, sql: str) -> None:
    right = {name: question() for name, question in _answers(store).items()}
    store.execute(sql)
    if "first_character > 0" not in sql:
        assert _right_or_refused(store, right) >= 1
    assert check(store) != []


def _repacked(store: Store, table: str, column: str, change: Callable[[Any], None], row: int = 1) -> None:
    """Change a packed array and seal it anew, as a crafted file would."""
    data = store.value(f"SELECT {column} FROM {table} WHERE rowid = ?", (row,))
    array = packing.unpack(data, "test").copy()
    change(array)
    store.execute(f"UPDATE {table} SET {column} = ? WHERE rowid = ?", (packing.pack(array), row))


def _add_one(array: Any) -> None:
    array[0] += 1


@pytest.mark.parametrize(
    ("table", "column", "expected"),
    [
        ("margin_pages", "first", "margins of 1 words are not the sums of their pairs"),
        ("margin_pages", "second", "margins of 1 words are not the sums of their pairs"),
        ("word_counts", "tokens", "tokens of 1 words differ from the token stream"),
        ("word_counts", "documents", "documents of 1 words differ from the token stream"),
        ("blocks", "types", "does not hold the types that it says"),
    ],
)
def test_numbers_that_disagree(store: Store, table: str, column: str, expected: str) -> None:
    _repacked(store, table, column, _add_one)
    assert any(expected in finding.problem for finding in check(store))


def test_a_wrong_total(store: Store) -> None:
    def change(summary: Any) -> None:
        summary[2] += 5

    _repacked(store, "tally_runs", "summary", change)
    assert any("pairs add up to" in finding.problem for finding in check(store))


def test_orders_that_differ(store: Store) -> None:
    """A crafted table: every page is well sealed, but the two orders hold different counts."""
    with store.transaction():
        writer = tallies.TallyWriter(store, WINDOW)
        for order, count in zip(ORDERS, (1, 2), strict=True):
            writer.add_block(order, block_of({(0, 1): count}, order))
        first, second = margins_of({(0, 1): 1})
        terms = np.array([0, 1], dtype=np.uint32)
        writer.add_margins(terms, *(np.array([margin[0], margin[1]]) for margin in (first, second)))
        writer.finish(1)
    assert [finding.problem for finding in check(store)] == ["run 3: its two orders do not hold the same pairs"]


@pytest.mark.parametrize(
    ("low", "high", "backward", "expected"),
    [
        ([1, 0], [2, 3], [0, 0], "do not ascend"),
        ([3, 4], [0, 0], [0, 0], "the wrong way round"),
        ([1, 1], [1, 2], [5, 0], "with itself backward"),
    ],
)
def test_pages_that_break_the_rules(
    store: Store, low: list[int], high: list[int], backward: list[int], expected: str
) -> None:
    block = block_of({(0, 1): 1, (0, 2): 1})
    crafted = type(block)(
        np.array(low, dtype=np.uint32), np.array(high, dtype=np.uint32), block.forward, np.array(backward)
    )
    with store.transaction():
        writer = tallies.TallyWriter(store, WINDOW)
        data = encode_page(crafted)
        ordered = sorted(int(x) << 32 | int(y) for x, y in zip(low, high, strict=True))
        check_value = int.from_bytes(data[4:8], "little")
        writer.add_page("low", PageHead(2, ordered[0], ordered[-1], check_value), data)
        writer.add_block("high", block_of({(0, 1): 1, (0, 2): 1}, "high"))
        writer.finish(2)
    problems = " ".join(finding.problem for finding in check(store))
    assert expected in problems or "another page" in problems


def test_units_are_never_met_more_often_than_their_words(store: Store) -> None:
    unit = TallySpec(layer="fold", kind="unit", right=0, left=0)
    for joint, wrong in ((2, []), (4, ["pairs are counted more often than their words"])):
        with store.transaction():
            writer = tallies.TallyWriter(store, unit)
            for order in ORDERS:
                writer.add_block(order, block_of({(0, 1): joint}, order))
            writer.add_margins(np.array([0, 1], dtype=np.uint32), np.array([3, 3]), np.array([3, 3]))
            writer.finish(7)
        assert [finding.problem for finding in check(store)] == wrong


def test_documents_outside_the_stream_and_bad_metadata(store: Store) -> None:
    store.execute("UPDATE documents SET n_tokens = 999 WHERE id = 2")
    store.execute("UPDATE documents SET n_characters = 9999 WHERE id = 1")
    store.execute("UPDATE documents SET metadata = '{' WHERE id = 0")
    found = {finding.place: finding.problem for finding in check(store)}
    assert "outside the stream" in found["document notice-1"]
    assert "outside the text" in found["document log-2"]
    assert "not JSON" in found["document 0"]


def test_missing_types(store: Store) -> None:
    store.execute("DELETE FROM types WHERE id = 3")
    assert any(finding.place == "types" for finding in check(store))


def test_a_damaged_block_says_what_is_lost_and_what_is_not(store: Store) -> None:
    store.execute("UPDATE blocks SET tokens = x'00' WHERE id = 1")
    (finding,) = check(store)
    assert finding.place == "block 1"
    assert "lost with it: 1 documents (log-2); the other documents can be used" in finding.remedy
    assert str(finding).startswith("block 1: ")


def _found(path: Path) -> bool:
    """Whether damage is found, be it on opening."""
    try:
        with open_for_reading(path) as store:
            return check(store) != []
    except StoreDamagedError:
        return True


def test_damage_to_sqlite_itself(tmp_path: Path) -> None:
    path = tmp_path / "a.colloc"
    small_store(path).close()
    data = bytearray(path.read_bytes())
    pages = len(data) // 16384
    generator = random.Random(5)
    for page in range(1, pages):
        damaged = bytearray(data)
        start = page * 16384
        damaged[start : start + 16] = generator.randbytes(16)
        path.write_bytes(bytes(damaged))
        assert _found(path), page
    path.write_bytes(bytes(data))
    assert not _found(path)


def test_removed_documents_and_what_is_not_yet_counted_are_no_damage(tmp_path: Path) -> None:
    store = small_store(tmp_path / "a.colloc")
    row = documents.document(store, 2)
    block = stream.read_block(store, 2)
    token, character = stream.token_count(store), texts.character_count(store)
    again = stream.Block(
        3,
        token,
        block.tokens,
        block.sentences,
        block.paragraphs,
        block.document_starts,
        np.array([3]),
        False,
        block.anchors,
    )
    stream.append_block(store, again)
    texts.append_text(store, character, "x" * row.n_characters)
    new = type(row)(3, "new", 0, 3, token, row.n_tokens, character, row.n_characters, {})
    documents.append_documents(store, [new])
    assert check(store) == []
    documents.remove_document(store, 3)
    assert check(store) == []
    # A document that was counted leaves its counts behind when only its tokens go.
    documents.remove_document(store, 2)
    assert {finding.place for finding in check(store)} == {"word counts of layer fold"}
    store.close()


@pytest.mark.parametrize("size", [1, 3, 5, 8, 100])
def test_frequencies_of_documents_over_several_blocks(tmp_path: Path, size: int) -> None:
    """Three documents, cut into blocks anywhere, against frequencies by the definition."""
    sequences = [[0, 1, 0, 2, 0, 1, 3], [], [1, 1, 4, 0], [2, 2, 2, 2, 2, 0]]
    whole = [term for sequence in sequences for term in sequence]
    begins = np.cumsum([0, *map(len, sequences)])
    with store_of_terms(tmp_path, 5) as store:
        none = np.zeros(0, dtype=np.int64)
        for block, first in enumerate(range(0, len(whole), size)):
            tokens = np.array(whole[first : first + size], dtype=np.uint32)
            numbers = np.flatnonzero((begins[:-1] >= first) & (begins[:-1] < first + size))
            starts = begins[numbers] - first
            anchors = Anchors(none, none)
            stream.append_block(store, stream.Block(block, first, tokens, none, none, starts, numbers, True, anchors))
        rows = [
            DocumentRow(number, f"d{number}", 0, number, int(begins[number]), len(sequence), 0, 0)
            for number, sequence in enumerate(sequences)
        ]
        documents.append_documents(store, rows)
        visibility.show_all(store)
        tokens_of = np.array([whole.count(term) for term in range(5)])
        documents_of = np.array([sum(term in sequence for sequence in sequences) for term in range(5)])
        vocabulary.append_word_counts(store, "form", np.arange(5, dtype=np.uint32), tokens_of, documents_of)
        assert check(store) == []
        vocabulary.append_word_counts(store, "form", np.array([2], dtype=np.uint32), np.array([0]), np.array([1]))
        assert [finding.problem for finding in check(store)] == ["documents of 1 words differ from the token stream"]
