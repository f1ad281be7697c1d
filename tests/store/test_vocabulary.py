"""Types, layers and terms against plain dictionaries; any word survives."""

from __future__ import annotations

import re
import unicodedata
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from colloc.errors import DataError, StoreDamagedError, UsageError
from colloc.records import NO_TERM
from colloc.store import vocabulary
from colloc.store.lexicon.layers import number_texts
from colloc.store.opening import Store, open_for_reading
from colloc.store.vocabulary import TypeKey, TypeRegistry

from .making import empty_store, small_store

WORDS = st.text(st.characters(exclude_categories=["Cs"]), min_size=1, max_size=8).map(
    lambda text: unicodedata.normalize("NFC", text)
)
PLAIN = st.one_of(st.sampled_from(["lamp", "Lamp", "LAMP", "fog", "Åsa", "åsa", "straße", "STRASSE"]), WORDS)
ANNOTATED = st.tuples(PLAIN, st.sampled_from(["", "lamp", "Lamp"]), st.sampled_from(["", "NOUN", "VERB"]))
IN_FOLDER = settings(max_examples=25, suppress_health_check=[HealthCheck.function_scoped_fixture])


def _expected(keys: list[TypeKey]) -> list[tuple[str, str, str]]:
    """Types in order of first appearance."""
    return list(dict.fromkeys(key if isinstance(key, tuple) else (key, "", "") for key in keys))


@given(
    batches=st.lists(st.lists(st.one_of(PLAIN, ANNOTATED), max_size=12), max_size=4), limit=st.sampled_from([0, 3, 999])
)
@IN_FOLDER
def test_types_and_layers_against_dictionaries(tmp_path: Path, batches: list[list[TypeKey]], limit: int) -> None:
    """Whatever the limit of what is remembered, and with a new registry for every second batch."""
    seen: list[TypeKey] = []
    with empty_store(tmp_path) as store:
        vocabulary.ensure_layer(store, "fold")
        for position, keys in enumerate(batches):
            if position % 2 == 0:
                registry = TypeRegistry(store, limit=limit)
            with store.transaction():
                numbers = registry.number(keys)
            seen += keys
            types = _expected(seen)
            assert numbers.dtype == np.uint32
            assert [types[number] for number in numbers] == _expected_each(keys)
            assert len(registry) == len(types) == vocabulary.type_count(store)
        types = _expected(seen)
        assert vocabulary.type_keys(store, 0, len(types)) == types
        for late in ("upos", "lemma/upos"):
            if any(lemma and upos for _, lemma, upos in types):
                vocabulary.ensure_layer(store, late)
        for name in vocabulary.layer_names(store):
            _check_layer(store, name, types)


def _expected_each(keys: list[TypeKey]) -> list[tuple[str, str, str]]:
    return [key if isinstance(key, tuple) else (key, "", "") for key in keys]


def _check_layer(store: Store, name: str, types: list[tuple[str, str, str]]) -> None:
    functions = {
        "form": lambda key: key[0],
        # Full case folding and NFC, by the standard library: Unicode chapter 3.13, and DEVELOPERS.md.
        "fold": lambda key: unicodedata.normalize("NFC", key[0].casefold()),
        "upos": lambda key: key[2],
        "lemma/upos": lambda key: f"{key[1]}/{key[2]}" if key[1] and key[2] else "",
    }
    texts = [functions[name](key) for key in types]
    terms = list(dict.fromkeys(text for text in texts if text))
    assert vocabulary.term_texts(store, name) == terms
    assert vocabulary.term_count(store, name) == len(terms)
    numbers = {text: number for number, text in enumerate(terms)}
    assert vocabulary.layer_map(store, name).tolist() == [numbers.get(text, int(NO_TERM)) for text in texts]
    assert vocabulary.term_numbers(store, name, terms).tolist() == list(range(len(terms)))
    some = list(range(0, len(terms), 9))
    assert vocabulary.term_texts(store, name, np.array(some)) == [terms[number] for number in some]


@given(words=st.lists(WORDS, min_size=1, max_size=30, unique=True))
@IN_FOLDER
def test_any_word_survives_reopening(tmp_path: Path, words: list[str]) -> None:
    with empty_store(tmp_path) as store, store.transaction():
        TypeRegistry(store).number(words)
    with open_for_reading(store.path) as reader:
        assert vocabulary.term_texts(reader, "form") == words
        assert vocabulary.term_numbers(reader, "form", words).tolist() == list(range(len(words)))


@given(
    words=st.lists(st.text("ab[]?*^-é", min_size=1, max_size=5), min_size=1, max_size=20, unique=True),
    pattern=st.text("ab[]?*^-é", max_size=5),
)
@IN_FOLDER
def test_only_the_star_is_special(tmp_path: Path, words: list[str], pattern: str) -> None:
    with empty_store(tmp_path) as store:
        with store.transaction():
            TypeRegistry(store).number(words)
        expression = re.compile(".*".join(map(re.escape, pattern.split("*"))), re.DOTALL)
        expected = [number for number, word in enumerate(words) if expression.fullmatch(word)]
        assert vocabulary.terms_matching(store, "form", pattern).tolist() == expected


def test_words_are_brought_to_the_form_of_the_layer(tmp_path: Path) -> None:
    with small_store(tmp_path / "a.colloc") as store:
        fold = dict(zip(vocabulary.term_texts(store, "fold"), range(99), strict=False))
        decomposed = unicodedata.normalize("NFD", "ÅSA")
        asked = ["LAMP", decomposed, "harbour", "\udc80", ""]
        assert vocabulary.term_numbers(store, "fold", asked).tolist() == [fold["lamp"], fold["åsa"], -1, -1, -1]
        assert vocabulary.term_numbers(store, "form", ["LAMP", decomposed])[0] == -1
        assert vocabulary.terms_matching(store, "fold", "L*P").tolist() == [fold["lamp"]]
        assert vocabulary.terms_matching(store, "fold", "\udc80*").tolist() == []


def test_plain_text_keeps_no_second_copy_of_its_forms(tmp_path: Path) -> None:
    with small_store(tmp_path / "a.colloc") as store:
        assert store.value("SELECT count(*) FROM terms WHERE layer = 0") == 0
        assert store.value("SELECT count(*) FROM layer_maps WHERE layer = 0") == 0
        with store.transaction():
            TypeRegistry(store).number([("lamp", "lamp", "NOUN")])
        assert store.value("SELECT count(*) FROM terms WHERE layer = 0") == vocabulary.term_count(store, "form")


def test_more_types_than_one_part_of_a_map(tmp_path: Path) -> None:
    with empty_store(tmp_path) as store:
        vocabulary.ensure_layer(store, "fold")
        words = [f"W{number}" if number % 3 else f"w{number}" for number in range(70_000)] + ["w1", "w70"]
        with store.transaction():
            registry = TypeRegistry(store, limit=1000)
            numbers = np.concatenate([registry.number(words[:60_000]), registry.number(words[60_000:])])
        assert numbers.tolist() == list(range(70_002))
        assert vocabulary.layer_map(store, "fold").tolist() == [*range(70_000), 1, 70]


@pytest.mark.parametrize("name", ["", "shape", "lemma/", "lemma/lemma", "form/shape", "'; DROP TABLE types"])
def test_no_such_layer(tmp_path: Path, name: str) -> None:
    with small_store(tmp_path / "a.colloc") as store:
        with pytest.raises(UsageError, match=r"no layer .*form, fold, lemma"):
            vocabulary.ensure_layer(store, name)
        with pytest.raises(UsageError, match="no layer"):
            vocabulary.term_count(store, name)


def test_layers_that_are_not_there(tmp_path: Path) -> None:
    with small_store(tmp_path / "a.colloc") as store:
        with pytest.raises(UsageError, match="has no layer 'upos' yet, only form, fold"):
            vocabulary.layer_map(store, "upos")
        with pytest.raises(UsageError, match="carry nothing for the layer 'lemma'"):
            vocabulary.ensure_layer(store, "lemma")
        assert vocabulary.layer_names(store) == ["form", "fold"]


def test_half_a_surrogate_pair_is_no_word(tmp_path: Path) -> None:
    with small_store(tmp_path / "a.colloc") as store:
        before = vocabulary.type_count(store)
        with pytest.raises(DataError, match="half a surrogate pair"), store.transaction():
            TypeRegistry(store).number(["lamp", "\ud800x"])
        assert vocabulary.type_count(store) == before


COUNTS = st.dictionaries(st.integers(0, 19), st.tuples(st.integers(1, 2**45), st.integers(1, 9)), max_size=20)


@given(runs=st.lists(COUNTS, min_size=1, max_size=40))
@settings(max_examples=15, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_word_counts_add_up(tmp_path: Path, runs: list[dict[int, tuple[int, int]]]) -> None:
    with empty_store(tmp_path) as store:
        sums = np.zeros((20, 2), dtype=np.int64)
        with store.transaction():
            TypeRegistry(store).number([f"w{number}" for number in range(20)])
            assert not vocabulary.has_word_counts(store, "form")
            for position, run in enumerate([*runs, runs[0]]):
                sign = -1 if position == len(runs) else 1
                rows = np.array([run[term] for term in sorted(run)], dtype=np.int64).reshape(-1, 2) * sign
                terms = np.array(sorted(run), dtype=np.uint32)
                sums[terms] += rows
                vocabulary.append_word_counts(store, "form", terms, rows[:, 0], rows[:, 1])
                counts = vocabulary.word_counts(store, "form")
                assert np.array_equal(np.stack([counts.tokens, counts.documents], axis=1), sums)
        assert store.value("SELECT count(*) FROM word_counts") <= 33


def test_word_counts_that_were_not_made_or_fall_below_zero(tmp_path: Path) -> None:
    with small_store(tmp_path / "a.colloc") as store:
        with pytest.raises(UsageError, match="words of layer 'form' have not been counted"):
            vocabulary.word_counts(store, "form")
        one = np.ones(1, dtype=np.int64)
        vocabulary.append_word_counts(store, "fold", np.zeros(1, dtype=np.uint32), -99 * one, one)
        with pytest.raises(StoreDamagedError, match="below zero"):
            vocabulary.word_counts(store, "fold")


@given(st.lists(st.lists(st.text("abc", max_size=3), max_size=12), max_size=6), st.integers(0, 15))
def test_numbers_of_texts_are_those_of_a_plain_loop(batches: list[list[str]], limit: int) -> None:
    """Whatever the batches and the limit of what is remembered, as long as that is not passed."""
    known: dict[str, int] = {}
    plain: dict[str, int] = {}
    for texts in batches:
        before = len(plain)
        for text in texts:
            if text:
                plain.setdefault(text, len(plain))
        found = number_texts(texts, known, before, limit)
        assert found.numbers.tolist() == [plain.get(text, int(NO_TERM)) for text in texts]
        assert found.fresh == list(plain)[before:]
        assert found.remembered == (len(plain) <= limit)
        if not found.remembered:
            return
        assert known == plain
