"""Chance floors: how strong pairs come out that only chance has brought together.

The words of the text are shuffled, the pairs counted again as the question counts them, and for every band of
expected counts the 99th percentile of a measure is noted, over all pairs of the band, those that never met included.

``order``
    Words shuffled within each document: what being in the same documents (topic, author) alone gives.
``corpus``
    Words shuffled across all documents: what frequency alone gives.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from dataclasses import asdict, dataclass, replace
from typing import Any, Literal, get_args

import numpy as np

from colloc.answers.questions import Question
from colloc.answers.sureness.bands import EDGES, band_of, count_pairs
from colloc.answers.tables import PairTable, TableReader, joined
from colloc.counts.placing import document_places
from colloc.counts.scanning.shuffling import keep_stretches, shuffled_stretches
from colloc.counts.selection import slice_selection
from colloc.counts.tallying import obtain_tally
from colloc.measures.catalogue import MEASURES
from colloc.measures.contingency import expected
from colloc.records import FloatArray, Int64Array
from colloc.settings import DEFAULT_MEMORY
from colloc.store import facts
from colloc.store.aside import stream_aside
from colloc.store.vocabulary import layer_map, term_count

Shuffle = Literal["order", "corpus"]
SHUFFLES: tuple[Shuffle, ...] = get_args(Shuffle)
FLOOR_MEASURES = ("pmi", "npmi", "g2")
"""Measures that floors are kept for; those the margins cannot bear are left out."""
SHARE = 0.01
"""Share of the pairs of a band that lie above its floor."""
SEED = 1
LEAST_PAIRS = 1000
"""Bands with fewer pairs are joined with the one below: a percentile of fewer says little."""
_SAMPLE = 2**17
"""Pairs of a band that are measured; of larger bands a random sample."""
ENOUGH_TOKENS, MOST_ROUNDS = 1_000_000, 10
"""A text is shuffled again until so many words have been, but not more often."""

Progress = Callable[[float, int, str], None]


@dataclass(frozen=True, slots=True)
class Floors:
    """The floors of one way to count.

    Attributes
    ----------
    shuffle : "order" or "corpus"
    edges : list of float
        Expected counts where bands begin, the first 0; a band ends where the next begins.
    pairs, seen : list of float
        Pairs of words in each band, and how many of them met at all, on average over the rounds.
    values : dict of str to list of (float or None)
        By measure the floor of each band; None where fewer than 1 % of the band's pairs met.
    generation : int
        State of the documents they were made from.
    """

    shuffle: Shuffle
    seed: int
    rounds: int
    generation: int
    edges: list[float]
    pairs: list[float]
    seen: list[float]
    values: dict[str, list[float | None]]

    def at(self, measure: str, expected_counts: FloatArray) -> FloatArray:
        """The floor for pairs with these expected counts; nan where too few such pairs met for one to be known."""
        known = np.array([np.nan if value is None else value for value in self.values[measure]])
        band = np.searchsorted(np.array(self.edges), expected_counts, side="right") - 1
        floor: FloatArray = known[np.maximum(band, 0)]
        return floor


def floor_measures(question: Question) -> tuple[str, ...]:
    """The measures whose floors a question can be held against."""
    tokens = question.convention.margins == "tokens"
    return tuple(name for name in FLOOR_MEASURES if not (tokens and MEASURES[name].needs_cells))


def find_floors(question: Question, shuffle: Shuffle) -> Floors | None:
    """The floors kept in the store, or None where there are none or the documents have changed since."""
    text = facts.get(question.store, _key(question, shuffle), None)
    if text is None:
        return None
    found = Floors(**json.loads(text))
    return found if found.generation == facts.generation(question.store) else None


def keep_floors(question: Question, floors: Floors) -> None:
    """Write floors into the store, which must be open for writing."""
    with question.store.transaction():
        facts.put(question.store, _key(question, floors.shuffle), json.dumps(asdict(floors)))


def obtain_floors(
    question: Question,
    shuffle: Shuffle,
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Progress | None = None,
) -> Floors:
    """The floors of a question: found in the store, or made; kept where the store can be written."""
    found = find_floors(question, shuffle)
    if found is None:
        found = make_floors(question, shuffle, jobs=jobs, memory=memory, progress=progress)
        if question.store.writable:
            keep_floors(question, found)
    return found


def _key(question: Question, shuffle: Shuffle) -> str:
    convention = question.convention
    way = f"{convention.margins} {'directed' if question.reader.ordered else 'symmetric'} {convention.spanned}"
    return f"floors {shuffle} {way} {question.spec.to_json()}"


def make_floors(
    question: Question,
    shuffle: Shuffle,
    *,
    seed: int = SEED,
    rounds: int | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Progress | None = None,
) -> Floors:
    """Shuffle, count and measure.

    Parameters
    ----------
    rounds : int
        How often the text is shuffled; for small texts several times, so that percentiles are steady.
    """
    tokens = int(question.words.tokens.sum())
    if rounds is None:
        rounds = int(np.clip(-(-ENOUGH_TOKENS // max(tokens, 1)), 1, MOST_ROUNDS))
    generation = facts.generation(question.store)
    gathered = _Bands(floor_measures(question), rounds)
    random = np.random.default_rng([seed, SHUFFLES.index(shuffle)])
    for _ in range(rounds):
        for reader in shuffled_readers(question, shuffle, random, jobs=jobs, memory=memory, progress=progress):
            gathered.add(reader, random)
    return gathered.floors(shuffle, seed, generation)


def shuffled_readers(
    question: Question,
    shuffle: Shuffle,
    random: np.random.Generator,
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Progress | None = None,
) -> Iterator[TableReader]:
    """One reader of the tables of shuffled text, counted in a temporary store that goes when the iteration does."""
    store, spec = question.store, question.spec
    selection = slice_selection(store, spec.where)
    places = document_places(store, selection)
    parts = np.zeros(1, np.int64)
    if shuffle == "order":
        parts = np.unique(np.concatenate([parts, places.begins[places.begins < len(selection)]]))
    layer, n_terms = layer_map(store, spec.layer), term_count(store, spec.layer)
    with stream_aside(store, spec.layer) as aside:
        keep_stretches(aside, shuffled_stretches(store, layer, n_terms, selection, spec.inside, parts, random))
        there = replace(spec, layer="form", where="")
        tally = obtain_tally(aside, there, jobs=jobs, memory=memory, progress=progress)
        yield TableReader(tally, question.convention, question.words)


class _Bands:
    """Values of shuffled pairs by band, a sample of bounded size from each."""

    def __init__(self, measures: tuple[str, ...], rounds: int) -> None:
        self._measures, self._rounds = measures, rounds
        self._pairs = np.zeros(len(EDGES), np.float64)
        self._seen = np.zeros(len(EDGES), np.float64)
        self._found: list[tuple[Int64Array, FloatArray, dict[str, FloatArray]]] = []

    def add(self, reader: TableReader, random: np.random.Generator) -> None:
        """Take the pairs of one shuffled text."""
        counted = count_pairs(reader)
        self._pairs += counted
        # of pairs with expected count E about 1 - exp(-E) meet, so that is how many of each band will come
        upper = np.append(EDGES[1:], np.inf)
        likely = counted * -np.expm1(-upper)
        rate = np.minimum(1.0, _SAMPLE / self._rounds / np.maximum(likely, 1.0))
        chosen: list[PairTable] = []
        for table in reader.blocks():
            table = table.take(table.joint > 0)
            band = band_of(expected(*table.arguments))
            self._seen += np.bincount(band, minlength=len(EDGES))
            sampled = random.random(len(table)) < rate[band]
            chosen.append(table.take(sampled))
        if not chosen:
            return
        table = joined(chosen)
        band = band_of(expected(*table.arguments))
        values = {name: MEASURES[name].compute(*table.arguments) for name in self._measures}
        self._found.append((band, 1.0 / rate[band], values))

    def floors(self, shuffle: Shuffle, seed: int, generation: int) -> Floors:
        """The percentiles."""
        begins = self._joined_bands()
        group = np.searchsorted(begins, np.arange(len(EDGES)), side="right") - 1
        pairs: FloatArray = np.bincount(group, weights=self._pairs).astype(np.float64)
        seen: FloatArray = np.bincount(group, weights=self._seen).astype(np.float64)
        empty = np.empty(0)
        band = group[np.concatenate([np.empty(0, np.int64), *(found[0] for found in self._found)])]
        weight = np.concatenate([empty, *(found[1] for found in self._found)])
        values: dict[str, list[float | None]] = {}
        for name in self._measures:
            measured = np.concatenate([empty, *(found[2][name] for found in self._found)])
            values[name] = [
                _from_the_top(measured[band == number], weight[band == number], SHARE * pairs[number])
                for number in range(len(begins))
            ]
        edges = [float(EDGES[begin]) for begin in begins]
        pairs, seen = pairs / self._rounds, seen / self._rounds
        return Floors(shuffle, seed, self._rounds, generation, edges, pairs.tolist(), seen.tolist(), values)

    def _joined_bands(self) -> list[int]:
        """First band of each group of bands that holds enough pairs."""
        begins = [0]
        waiting = 0.0
        for number in range(len(EDGES) - 1, 0, -1):
            waiting += self._pairs[number]
            if waiting >= LEAST_PAIRS:
                begins.append(number)
                waiting = 0.0
        return sorted(begins)


def _from_the_top(values: FloatArray, weights: FloatArray, above: float) -> float | None:
    """The value that pairs of total weight ``above`` exceed; None where there are not so many."""
    order = np.argsort(-values)
    reached = np.flatnonzero(np.cumsum(weights[order]) > above)
    return float(values[order[reached[0]]]) if len(reached) else None


def floor_summary(floors: Floors) -> dict[str, Any]:
    """The floors as columns: one row a band."""
    return {
        "expected_from": floors.edges,
        "pairs": floors.pairs,
        "met": floors.seen,
        **{f"{name}_floor": [np.nan if v is None else v for v in values] for name, values in floors.values.items()},
    }
