"""Chance floors: shuffling keeps what it must, bands hold the pairs they should, and floors are what 1 % exceed.

Oracles: listing every pair of words, and text that was shuffled anew.
"""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from colloc.answers.questions import PairOptions, ask
from colloc.answers.sureness import floors
from colloc.answers.sureness.bands import EDGES, band_of, count_pairs
from colloc.answers.sureness.floors import (
    FLOOR_MEASURES,
    SHARE,
    Floors,
    Shuffle,
    find_floors,
    make_floors,
    obtain_floors,
    shuffled_readers,
)
from colloc.answers.sureness.judging import sided
from colloc.counts.placing import document_places
from colloc.counts.scanning import shuffling
from colloc.counts.scanning.shuffling import Urn, shuffled_stretches
from colloc.counts.selection import slice_selection
from colloc.counts.spans import Stretch, read_stretches
from colloc.errors import UsageError
from colloc.measures.catalogue import MEASURES
from colloc.measures.contingency import expected
from colloc.store import facts
from colloc.store.opening import open_for_reading, open_for_writing
from colloc.store.vocabulary import layer_map, term_count
from colloc.verbs.asking import pairs
from colloc.verbs.making import build
from corpora_demo.generate import documents
from tests.counts.placed import Placed, write_store
from tests.sureness.test_hypotheses import WAYS, every_pair


def stretches_of(path: Path, shuffle: Shuffle, seed: int) -> tuple[list[Stretch], list[Stretch], np.ndarray]:
    """The stream as it is and shuffled, and where documents begin."""
    with open_for_reading(path) as store:
        selection = slice_selection(store, "")
        begins = document_places(store, selection).begins
        parts = np.unique(begins[begins < len(selection)]) if shuffle == "order" else np.zeros(1, np.int64)
        layer, n_terms = layer_map(store, "fold"), term_count(store, "fold")
        random = np.random.default_rng(seed)
        shuffled = list(shuffled_stretches(store, layer, n_terms, selection, "sentence", parts, random))
        return list(read_stretches(store, layer, selection, "sentence")), shuffled, parts


@pytest.mark.parametrize("shuffle", ["order", "corpus"])
def test_words_trade_places_within_their_part(made_store: Path, shuffle: Shuffle) -> None:
    before, after, parts = stretches_of(made_store, shuffle, 1)
    one, two = (np.concatenate([stretch.terms for stretch in stretches]) for stretches in (before, after))
    assert len(before) > 2
    for begin, stop in zip(parts, [*parts[1:], len(one)], strict=True):
        assert sorted(one[begin:stop]) == sorted(two[begin:stop])
    assert (one != two).mean() > 0.5
    for left, right in zip(before, after, strict=True):
        assert (left.first, left.units.tolist()) == (right.first, right.units.tolist())
    again = np.concatenate([stretch.terms for stretch in stretches_of(made_store, shuffle, 1)[1]])
    other = np.concatenate([stretch.terms for stretch in stretches_of(made_store, shuffle, 2)[1]])
    assert np.array_equal(two, again)
    assert not np.array_equal(two, other)


def test_every_place_gets_every_word(made_store: Path) -> None:
    # term 0 makes up some 15 % of the words, so it should stand on each place in that share of the shuffles
    rounds = 80
    hits: list[np.ndarray] = []
    for seed in range(rounds):
        _, after, _ = stretches_of(made_store, "corpus", seed)
        hits.append(np.concatenate([stretch.terms for stretch in after]) == 0)
    shares = np.mean(hits, axis=0)
    spread = (shares - shares.mean()) / np.sqrt(shares.mean() * (1 - shares.mean()) / rounds)
    assert abs(spread.std() - 1) < 0.05
    # places of one block are no likelier to trade among themselves
    assert abs(shares[:700].mean() - shares[-700:].mean()) < 0.01


def test_an_urn_gives_back_what_was_put_in() -> None:
    counts = np.array([0, 5, 0, 1, 30])
    urn = Urn(counts)
    random = np.random.default_rng(1)
    drawn = np.concatenate([urn.draw(n, random) for n in (10, 0, 26)])
    assert np.bincount(drawn).tolist() == counts.tolist()


def test_too_many_words_for_an_urn(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(shuffling, "LARGEST_URN", 100)
    with pytest.raises(UsageError, match="101 words cannot be shuffled together, 100 at most"):
        Urn(np.array([100, 1]))


@pytest.mark.parametrize("options", WAYS)
def test_pairs_of_each_band(made_store: Path, options: PairOptions) -> None:
    with open_for_reading(made_store) as store:
        question = ask(store, options)
        every = every_pair(question)
        every = every.take((every.first_total > 0) & (every.second_total > 0))
        counted = np.bincount(band_of(expected(*every.arguments)), minlength=len(EDGES))
        assert count_pairs(question.reader).tolist() == counted.tolist()


@pytest.fixture(scope="module")
def demo_store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("floors")
    text = folder / "demo.jsonl"
    text.write_text("".join(json.dumps(document) + "\n" for document in documents(4, 150)), encoding="utf-8")
    build(folder / "demo.colloc", str(text), jobs=1)
    return folder / "demo.colloc"


def exceeding(
    store_path: Path, shuffle: Shuffle, options: PairOptions, rounds: int
) -> Iterator[tuple[str, float, float]]:
    """For each measure and band with a floor: the share of pairs of newly shuffled text above it, and their number."""
    with open_for_reading(store_path) as store:
        question = ask(store, options)
        known = make_floors(question, shuffle, rounds=6)
        above = {name: np.zeros(len(known.edges)) for name in FLOOR_MEASURES}
        pairs_there = np.zeros(len(known.edges))
        random = np.random.default_rng(99)
        for _ in range(rounds):
            for reader in shuffled_readers(question, shuffle, random):
                counts = count_pairs(reader)
                pairs_there += np.bincount(np.searchsorted(known.edges, EDGES, side="right") - 1, counts)
                for table in reader.blocks():
                    table = table.take(table.joint > 0)
                    often = expected(*table.arguments)
                    band = np.searchsorted(known.edges, often, side="right") - 1
                    for name in FLOOR_MEASURES:
                        over = MEASURES[name].compute(*table.arguments) > known.at(name, often)
                        above[name] += np.bincount(band[over], minlength=len(known.edges))
        for name in FLOOR_MEASURES:
            for band, value in enumerate(known.values[name]):
                if value is None:
                    # nothing is known to be above a floor that is not
                    assert not above[name][band]
                else:
                    yield name, above[name][band] / pairs_there[band], pairs_there[band]


@pytest.mark.parametrize("shuffle", ["order", "corpus"])
def test_one_in_a_hundred_exceeds_the_floor(demo_store: Path, shuffle: Shuffle) -> None:
    found = list(exceeding(demo_store, shuffle, PairOptions(), 4))
    assert len(found) > 30
    # the floor is an estimate too, from 6 rounds against 4: hence both errors
    off = [(share - SHARE) / np.sqrt(SHARE / n * (1 + 4 / 6)) for _, share, n in found]
    assert max(map(abs, off)) < 4.5
    assert abs(np.mean([share for _, share, _ in found]) - SHARE) < 0.0015


@pytest.mark.long
@pytest.mark.parametrize("shuffle", ["order", "corpus"])
@pytest.mark.parametrize("options", [PairOptions(), PairOptions(directed=True), PairOptions(margins="positions")])
def test_one_in_a_hundred_exceeds_the_floor_long(demo_store: Path, shuffle: Shuffle, options: PairOptions) -> None:
    found = list(exceeding(demo_store, shuffle, options, 30))
    shares = [share for _, share, _ in found]
    print(f"\n{shuffle}, {options}: {len(found)} bands and measures")
    print(f"  above: {min(shares):.4f}..{max(shares):.4f}, mean {np.mean(shares):.4f}")
    off = [(share - SHARE) / np.sqrt(SHARE / n * (1 + 30 / 6)) for _, share, n in found]
    assert max(map(abs, off)) < 4.5


def test_topic_alone_is_above_the_corpus_floor_and_below_the_order_floor(tmp_path: Path) -> None:
    """Words of one topic that are drawn independently of each other inside their documents are unrelated."""
    random = np.random.default_rng(6)
    n_terms, own = 260, 20
    made = []
    for number in range(240):
        topic = number % 12
        # a fifth of a document are words of its topic, the rest are common to all
        words = np.where(
            random.random(150) < 0.2, 20 + topic * own + random.integers(0, own, 150), random.integers(0, 20, 150)
        )
        made.append(Placed(words.tolist(), list(range(0, 150, 15)), "a"))
    path = tmp_path / "topics.colloc"
    write_store(path, made, n_terms, block=5000)
    answer = pairs(path, show=["pmi"], sure=False, min_count=1, limit=0, any_strength=True, measure="pmi")
    with open_for_reading(path) as store:
        question = ask(store, PairOptions())
        made_floors = {shuffle: make_floors(question, shuffle, rounds=4) for shuffle in ("order", "corpus")}  # type: ignore[arg-type]
    ranks = {f"w{20 + topic * own + word:03}": topic for topic in range(12) for word in range(own)}
    same = np.array(
        [
            x in ranks and ranks.get(x) == ranks.get(y) and x != y
            for x, y in zip(answer["first"], answer["second"], strict=True)
        ]
    )
    often = answer["expected"]
    above = {shuffle: answer["pmi"] > known.at("pmi", often) for shuffle, known in made_floors.items()}
    # 190 pairs of each of 12 topics share a topic and nothing else
    assert same.sum() > 2000
    assert above["corpus"][same].mean() > 0.6
    # 1 % of all pairs of a band lie above it, and some 8 % of a band share a topic: at most 1 in 8 of those, by chance
    assert above["order"][same].mean() < 0.2
    both = same & above["corpus"] & ~above["order"]
    assert both.sum() > 1000


def test_floors_are_kept_and_made_anew_when_documents_change(
    made_store: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(floors, "MOST_ROUNDS", 2)
    path = tmp_path / "copy.colloc"
    path.write_bytes(made_store.read_bytes())
    with open_for_writing(path, "test") as store:
        question = ask(store, PairOptions())
        assert find_floors(question, "order") is None
        made = obtain_floors(question, "order")
        assert find_floors(question, "order") == made
        assert find_floors(question, "corpus") is None
        assert find_floors(ask(store, PairOptions(directed=True)), "order") is None
        assert find_floors(sided(question, "left"), "order") is None
        assert make_floors(question, "order") == made
        assert make_floors(question, "order", seed=2) != made
        with store.transaction():
            facts.next_generation(store)
        assert find_floors(question, "order") is None


def test_a_store_that_is_only_read_keeps_no_floors(made_store: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(floors, "MOST_ROUNDS", 1)
    before = made_store.read_bytes()
    with open_for_reading(made_store) as store:
        question = ask(store, PairOptions())
        assert obtain_floors(question, "corpus").shuffle == "corpus"
        assert find_floors(question, "corpus") is None
    assert made_store.read_bytes() == before


def test_bands_without_a_floor() -> None:
    known = Floors("order", 1, 1, 0, [0.0, 0.5, 2.0], [9.0, 9.0, 9.0], [0.0, 9.0, 9.0], {"pmi": [None, 3.0, 1.0]})
    found = known.at("pmi", np.array([0.0, 0.49, 0.5, 1.99, 2.0, 1e9]))
    assert np.isnan(found).tolist() == [True, True, False, False, False, False]
    assert found[2:].tolist() == [3, 3, 1, 1]
