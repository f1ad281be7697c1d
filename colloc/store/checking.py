"""Whether a store is sound: SQLite's own structure, every checksum, and numbers that must agree."""

from __future__ import annotations

import json
from collections.abc import Sequence

import numpy as np

from colloc.errors import StoreDamagedError
from colloc.records import NO_TERM, Int64Array, UInt32Array
from colloc.settings import TallySpec
from colloc.store import decisions, documents, facts, stream, texts, visibility, vocabulary
from colloc.store.connection import Store
from colloc.store.database.findings import Finding, noting
from colloc.store.paging.checking import check_tally

__all__ = ["Finding", "check"]

_REBUILD = "build the store again from its inputs"
_RECOUNT = "documents and words can be used; count this table again with `colloc tally`"
_RECOUNT_WORDS = "documents and text can be used; build the store again for word counts"


def check(store: Store) -> list[Finding]:
    """Everything that is wrong with a store; an empty list where it is sound.

    Reads the whole store once; memory is bounded by the number of words.
    """
    findings: list[Finding] = []
    stored = (_check_stream, _check_documents, _check_texts, _check_tallies, _check_decisions)
    for part in (_check_database, _check_words, *stored):
        with noting(findings, part.__name__.removeprefix("_check_"), _REBUILD):
            part(store, findings)
    return findings


def _check_database(store: Store, findings: list[Finding]) -> None:
    remedy = "SQLite's `.recover` saves what rows can be read; build the store again for sure numbers"
    for (message,) in store.rows("PRAGMA integrity_check"):
        if message != "ok":
            findings.append(Finding("database", str(message), remedy))


def _check_words(store: Store, findings: list[Finding]) -> None:
    types = vocabulary.type_count(store)
    stored = store.row("SELECT count(*), coalesce(max(id) + 1, 0), coalesce(min(id), 0) FROM types")
    if tuple(stored) != (types, types, 0):
        findings.append(Finding("types", f"{stored[0]} of {types} types are there", _REBUILD))
    for name in vocabulary.layer_names(store):
        with noting(findings, f"layer {name}", _REBUILD):
            if len(vocabulary.layer_map(store, name)) != types:
                findings.append(Finding(f"layer {name}", f"does not map all {types} types", _REBUILD))
            vocabulary.term_texts(store, name)


def _check_stream(store: Store, findings: list[Finding]) -> None:
    types = vocabulary.type_count(store)
    layers = [name for name in vocabulary.layer_names(store) if vocabulary.has_word_counts(store, name)]
    counters = {
        name: _WordCounter(vocabulary.layer_map(store, name), vocabulary.term_count(store, name)) for name in layers
    }
    counted = json.loads(facts.get(store, visibility.MARK, "{}")).get("blocks", 0)
    complete = True
    for head in stream.block_heads(store):
        before = len(findings)
        with noting(findings, f"block {head.number}", _lost_with(store, head)):
            block = stream.read_block(store, head.number)
            present = np.unique(block.tokens[block.tokens != NO_TERM])
            if len(present) and present[-1] >= types:
                raise StoreDamagedError(f"block {head.number} holds types that the store does not have")
            if not np.array_equal(present, stream.block_types(store, head.number)):
                raise StoreDamagedError(f"block {head.number} does not hold the types that it says")
            for name in stream.column_names(store, head.number):
                if len(stream.read_column(store, head.number, name)) != head.n_tokens:
                    raise StoreDamagedError(f"block {head.number}: column {name} does not fit the tokens")
            if head.number < counted:
                for counter in counters.values():
                    counter.add(block)
        complete &= len(findings) == before
    for name, counter in counters.items() if complete else ():
        with noting(findings, f"word counts of layer {name}", _RECOUNT_WORDS):
            kept = vocabulary.word_counts(store, name)
            for what, ours, theirs in (
                ("tokens", kept.tokens, counter.tokens),
                ("documents", kept.documents, counter.documents),
            ):
                wrong = int((ours != theirs).sum())
                if wrong:
                    problem = f"{what} of {wrong} words differ from the token stream"
                    findings.append(Finding(f"word counts of layer {name}", problem, _RECOUNT_WORDS))


class _WordCounter:
    """Counts the terms of a layer over blocks, in tokens and in documents."""

    def __init__(self, layer_map: UInt32Array, terms: int) -> None:
        self._map = layer_map
        self.tokens: Int64Array = np.zeros(terms, dtype=np.int64)
        self.documents: Int64Array = np.zeros(terms, dtype=np.int64)
        self._last = -1, np.empty(0, dtype=np.uint32)

    def add(self, block: stream.Block) -> None:
        places = np.flatnonzero(block.tokens != NO_TERM)
        terms = self._map[block.tokens[places]]
        places, terms = places[terms != NO_TERM], terms[terms != NO_TERM]
        self.tokens += np.bincount(terms, minlength=len(self.tokens))
        # Tokens before the first start go on in the document of the block before.
        number, earlier = self._last
        listed = np.concatenate([[number], block.document_numbers])
        whose = listed[np.searchsorted(block.document_starts, places, side="right")]
        pairs = np.unique((whose + 1).astype(np.uint64) << np.uint64(32) | terms)
        seen, whose = (pairs & np.uint64(0xFFFFFFFF)).astype(np.uint32), (pairs >> np.uint64(32)).astype(np.int64) - 1
        self.documents += np.bincount(seen, minlength=len(self.documents))
        # A word that stood in an earlier part of the same document is counted once.
        self.documents[np.intersect1d(seen[whose == number], earlier)] -= 1
        last = int(listed[-1])
        mine = seen[whose == last]
        self._last = last, np.union1d(mine, earlier) if last == number else mine


def _lost_with(store: Store, head: stream.BlockHead) -> str:
    """What a damaged block takes with it."""
    sql = "SELECT identifier FROM documents WHERE first_token < ? AND first_token + n_tokens > ? ORDER BY id"
    names = [name for (name,) in store.rows(sql, (head.first_token + head.n_tokens, head.first_token))]
    return f"lost with it: {_some(names)}; the other documents can be used; {_REBUILD}"


def _some(names: Sequence[str]) -> str:
    shown = ", ".join(names[:3])
    return f"{len(names)} documents ({shown}{', ...' if len(names) > 3 else ''})"


def _check_documents(store: Store, findings: list[Finding]) -> None:
    tokens, characters = stream.token_count(store), texts.character_count(store)
    with_text = texts.has_text(store)
    end = 0
    for number in [row[0] for row in store.rows("SELECT id FROM documents ORDER BY first_token, id")]:
        with noting(findings, f"document {number}", "the other documents can be used; " + _REBUILD):
            row = documents.document(store, number)
            place = f"document {row.identifier}"
            if row.first_token < end or row.n_tokens < 0 or row.first_token + row.n_tokens > tokens:
                findings.append(Finding(place, "its tokens lie outside the stream or in another document", _REBUILD))
            if with_text and not 0 <= row.first_character <= row.first_character + row.n_characters <= characters:
                findings.append(Finding(place, "its text lies outside the text of the store", _REBUILD))
            end = row.first_token + row.n_tokens


def _check_texts(store: Store, findings: list[Finding]) -> None:
    end = 0
    for first, length in store.rows("SELECT first_character, n_characters FROM text_blocks ORDER BY first_character"):
        place = f"text from character {first}"
        with noting(findings, place, "counts can be used; lines from here cannot be shown; " + _REBUILD):
            texts.read_text(store, first, first + length)
        if first != end:
            findings.append(Finding(place, f"characters {end} to {first} are missing or doubled", _REBUILD))
        end = first + length


def _check_tallies(store: Store, findings: list[Finding]) -> None:
    for number, text in store.rows("SELECT id, spec FROM tallies ORDER BY id"):
        place = f"tally {text}"
        with noting(findings, place, _RECOUNT):
            try:
                spec = TallySpec.from_json(text)
            except (TypeError, ValueError) as error:
                raise StoreDamagedError(f"its description cannot be read ({error})") from error
            findings.extend(Finding(place, problem, _RECOUNT) for problem in check_tally(store, number, spec))


def _check_decisions(store: Store, findings: list[Finding]) -> None:
    remedy = "counts and text can be used; decisions before and after it can be read with an SQLite program"
    with noting(findings, "decisions", remedy):
        for _ in decisions.iterate(store):
            pass
