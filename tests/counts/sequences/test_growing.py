"""Growing gives the counts of a plain count of every sequence, whatever the cut into shares, ranges and processes."""

from __future__ import annotations

import functools
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from colloc.counts.sequences import growing as module
from colloc.counts.sequences import sharing_out
from colloc.counts.sequences.growing import Grower, growing
from colloc.counts.sequences.levels import Level
from colloc.errors import LockedError, NotSeenError, UsageError
from colloc.measures.dispersion import dispersion
from colloc.records import NO_TERM
from colloc.store import documents as store_documents
from colloc.store import facts
from colloc.store.opening import open_for_reading, open_for_writing
from tests.counts.sequences.plain import Seen, fillers, sequences, terms_of
from tests.counts.stores import Text, folded, make_store, random_text

LEAST = 3
Plainly = Callable[[str, int], dict[tuple[int, ...], Seen]]
Documents = list[tuple[list[int], list[int]]]


def parts(text: Text, inside: str) -> Documents:
    """Terms of each document and where its units begin."""
    terms, starts = folded(text), text.starts(inside)
    return [(terms[a:b], [s - a for s in starts if a <= s < b]) for a, b in text.document_bounds()]


@pytest.fixture(scope="module")
def text() -> Text:
    return random_text(7, 4000, 60, 9, sentence=9.0)


@pytest.fixture(scope="module")
def path(text: Text, tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("sequences") / "text.colloc"
    # blocks end in the middle of sentences and documents
    make_store(path, text, blocks=(997, 2500, 2501, 3444)).close()
    return path


@pytest.fixture(scope="module")
def plainly(text: Text) -> Plainly:
    return functools.cache(lambda inside, words: sequences(parts(text, inside), range(words)))


def as_dict(level: Level) -> dict[tuple[int, ...], int]:
    return {tuple(terms): count for terms, count in zip(terms_of(level).tolist(), level.counts.tolist(), strict=True)}


def frequent(plain: dict[tuple[int, ...], Seen], least: int = LEAST) -> dict[tuple[int, ...], int]:
    return {terms: seen.count for terms, seen in plain.items() if seen.count >= least}


def grown(grower: Grower, words: int) -> Level:
    level = grower.single
    for _ in range(words - 1):
        level = grower.join(level, level, 1)
    return level


@pytest.mark.parametrize("inside", ["sentence", "paragraph", "document"])
@pytest.mark.parametrize("share", [10**6, 700, 177])
def test_counts_of_every_length(
    path: Path, plainly: Plainly, inside: str, share: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(sharing_out, "_LARGEST_SHARE", share)
    with (
        open_for_reading(path) as store,
        growing(store, layer="fold", inside=inside, min_count=LEAST, jobs=1) as grower,
    ):
        level = grower.single
        for words in range(2, 6):
            level = grower.join(level, level, 1)
            expected = frequent(plainly(inside, words))
            assert as_dict(level) == expected
            assert words > 3 or len(expected) > 50  # there is something to find


def test_spread_over_documents_and_edges_of_sentences(path: Path, text: Text) -> None:
    documents = parts(text, "sentence")
    sizes = np.array([len(terms) for terms, _ in documents])
    with open_for_reading(path) as store, growing(store, layer="fold", min_count=LEAST) as grower:
        level = grown(grower, 2)
        units = grower.units
    assert units == len(text.starts("sentence"))
    found = sequences(documents, (0, 1))
    plain = [found[tuple(terms)] for terms in terms_of(level).tolist()]
    spread = level.spread
    assert spread is not None
    assert spread.documents.tolist() == [len(seen.documents) for seen in plain]
    assert spread.largest.tolist() == [max(seen.documents.values()) for seen in plain]
    assert spread.opening.tolist() == [seen.opening for seen in plain]
    assert spread.closing.tolist() == [seen.closing for seen in plain]
    rows = [(row, document, n) for row, seen in enumerate(plain) for document, n in seen.documents.items()]
    row, document, n = (np.array(column) for column in zip(*rows, strict=True))
    # the same by the measure for words, which knows nothing of sequences
    expected = dispersion(row, document, n, sizes, len(plain))
    np.testing.assert_allclose(spread.dp, expected.dp, rtol=0, atol=1e-12)
    np.testing.assert_allclose(spread.dp_norm, expected.dp_norm, rtol=0, atol=1e-12)


def test_slice_and_removed_documents(text: Text, tmp_path: Path) -> None:
    store = make_store(tmp_path / "text.colloc", text, blocks=(3000,))
    with store:
        store_documents.remove_documents(store, [2, 5])
        documents = [part for number, part in enumerate(parts(text, "sentence")) if number not in (2, 5)]
        with growing(store, layer="fold", min_count=LEAST, jobs=1) as grower:
            assert as_dict(grown(grower, 3)) == frequent(sequences(documents, range(3)))
        half = [part for number, part in enumerate(parts(text, "sentence")) if number in (1, 3, 7)]
        with growing(store, layer="fold", where="half=b", min_count=LEAST, jobs=1) as grower:
            assert grower.total == sum(len(terms) for terms, _ in half)
            assert as_dict(grown(grower, 2)) == frequent(sequences(half, range(2)))


def test_processes_and_ranges_change_nothing(path: Path, text: Text, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sharing_out, "_LARGEST_SHARE", 1500)
    monkeypatch.setattr(module, "_WORTH_A_PROCESS", 1)
    monkeypatch.setattr(sharing_out, "_LEAST_RANGE", 64)
    with open_for_reading(path) as store, growing(store, layer="fold", min_count=LEAST, jobs=2) as grower:
        level = grown(grower, 4)
    assert as_dict(level) == frequent(sequences(parts(text, "sentence"), range(4)))
    assert level.spread is not None
    assert level.spread.documents.max() > 1


@pytest.mark.parametrize("words", [(0, 2), (0, 3), (0, 1, 3), (0, 2, 3), (0, 2, 4)])
def test_open_slots(path: Path, text: Text, words: tuple[int, ...]) -> None:
    documents = parts(text, "sentence")
    with open_for_reading(path) as store, growing(store, layer="fold", min_count=LEAST) as grower:
        level = shaped(grower, words)
        assert level.words == words
        plain = sequences(documents, words)
        assert as_dict(level) == frequent(plain)
        numbers = np.array([len(level) - 1, 0, len(level) // 2])
        slot = next(offset for offset in range(words[-1]) if offset not in words)
        index, term, count = grower.fillers(level, numbers, slot)
    for row, number in enumerate(numbers.tolist()):
        expected = fillers(documents, words, tuple(terms_of(level)[number].tolist()), slot)
        here = index == row
        assert dict(zip(term[here].tolist(), count[here].tolist(), strict=True)) == dict(expected)


def shaped(grower: Grower, words: tuple[int, ...]) -> Level:
    if len(words) == 1:
        return grower.single
    rest = tuple(word - words[1] for word in words[1:])
    return grower.join(shaped(grower, words[:-1]), shaped(grower, rest), words[1])


def test_given_keys_are_counted_however_rare(path: Path, text: Text) -> None:
    plain = sequences(parts(text, "sentence"), (0, 2))
    rare = sorted(terms for terms, seen in plain.items() if seen.count == 1)[:20]
    never = next((a, b) for a in range(29, 0, -1) for b in range(30) if (a, b) not in plain)
    wanted = sorted({*rare, never})
    keys = np.array([a << 32 | b for a, b in wanted], np.uint64)
    with open_for_reading(path) as store, growing(store, layer="fold", min_count=LEAST) as grower:
        level = grower.known(grower.single, grower.single, 2, keys)
    assert dict(zip(wanted, level.counts.tolist(), strict=True)) == {**dict.fromkeys(rare, 1), never: 0}


def test_too_long_is_refused(path: Path) -> None:
    with (
        open_for_reading(path) as store,
        growing(store, layer="fold", min_count=LEAST) as grower,
        pytest.raises(UsageError, match="at most 12 places, not 13"),
    ):
        grower.join(grower.single, grower.single, 12)


def test_a_store_that_changes_meanwhile_is_noticed(text: Text, tmp_path: Path) -> None:
    make_store(tmp_path / "text.colloc", text).close()

    def changed_meanwhile() -> None:
        with (
            open_for_reading(tmp_path / "text.colloc") as store,
            growing(store, layer="fold", min_count=LEAST) as grower,
        ):
            grown(grower, 2)
            with open_for_writing(store.path, "test") as other, other.transaction():
                facts.next_generation(other)

    with pytest.raises(LockedError, match="added or removed"):
        changed_meanwhile()


def test_empty_slice(path: Path) -> None:
    with (
        open_for_reading(path) as store,
        pytest.raises(NotSeenError, match="no document fits 'half=c'; values of half: a, b"),
        growing(store, layer="fold", where="half=c", min_count=LEAST),
    ):
        pass


def test_removed_tokens_are_no_words() -> None:
    assert int(NO_TERM) == 2**32 - 1
    assert sequences([([1, int(NO_TERM), 2, 1, 2], [0])], (0, 1)).keys() == {(2, 1), (1, 2)}
