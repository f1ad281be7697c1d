"""Simulated corpora, counted on arrays by the kernels of the product, without a store: fast enough for thousands."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import Any, cast

import numpy as np

from colloc.answers.questions import Question
from colloc.answers.sureness.documents import document_interval, without_each_group
from colloc.answers.tables import Convention, PairTable, Sums, TableMaker, TableReader
from colloc.counts.grouping import MarginSink, deal
from colloc.counts.keys import pair_block
from colloc.counts.positions import count_positions
from colloc.counts.scanning.feeding import Fork
from colloc.counts.scanning.sieving import Sieve, wanted_pairs
from colloc.counts.units import count_units, unit_terms
from colloc.counts.windows import add_windows, count_windows
from colloc.measures.intervals import Interval, pmi_interval
from colloc.measures.pmi import pmi
from colloc.records import Int64Array, PairBlock, TokenSpan, UInt32Array, WordCounts
from colloc.settings import Margins, TallySpec
from corpora_demo.generate import documents

# the rule of tests/demo/counting.py: a full stop ends a sentence and stands nowhere else
_TOKEN = re.compile(r"[a-z]+(?:'[a-z]+)?|\.|\0")
NO_GROUP = np.empty(0, np.int64)


@dataclass(frozen=True)
class Corpus:
    """Terms of a text, where its sentences begin, and the document of each token."""

    terms: UInt32Array
    sentences: Int64Array
    documents: Int64Array
    n_documents: int


def demo_corpus(seed: int, n_documents: int, *, bursty: bool, numbers: dict[str, int]) -> Corpus:
    """A corpus of the demo generator; ``numbers`` gives the term of a word and learns new words."""
    texts: Iterable[str] = (str(document["text"]) for document in documents(seed, n_documents, bursty))
    found = _TOKEN.findall("\0".join(texts).lower())
    raw = np.array([numbers.setdefault(token, len(numbers)) for token in [".", "\0", *found]][2:], np.int64)
    stop, gap = numbers["."], numbers["\0"]
    word = (raw != stop) & (raw != gap)
    place = np.cumsum(word) - word
    sentences = np.unique(np.append(place[~word], 0))
    document = np.cumsum(raw == gap)[word]
    return Corpus(raw[word].astype(np.uint32), sentences[sentences < word.sum()], document, n_documents)


@dataclass(frozen=True)
class Estimates:
    """By pair: joint count, documents, PMI and both intervals."""

    joint: Int64Array
    documents: Int64Array
    pmi: np.ndarray
    jackknife: Interval
    formula: Interval


def estimates(corpus: Corpus, first: UInt32Array, second: UInt32Array, n_terms: int, window: int = 5) -> Estimates:
    """What the product says of these pairs of a corpus: symmetric windows inside the sentence, margins of pairs."""
    spec, convention = TallySpec(right=window), Convention()
    wanted = wanted_pairs(first, second, n_terms, directed=False)
    groups = deal(corpus.n_documents)
    sieve, margins = Sieve(wanted), MarginSink(spec, groups, wanted.n_labels)
    sink = Fork([sieve, margins])
    sink.place(corpus.documents, 0, len(corpus.terms), NO_GROUP)
    add_windows(TokenSpan(wanted.labels[corpus.terms], corpus.sentences), 0, window, sink)
    found = sieve.take()
    pair, document = (found >> np.uint64(32)).astype(np.int64), (found & np.uint64(0xFFFFFFFF)).astype(np.int64)
    table = np.zeros((wanted.n_pairs, corpus.n_documents), np.int64)
    np.add.at(table, (pair, document), 1)
    by_group = np.zeros((int(groups.max()) + 1, wanted.n_pairs), np.int64)
    np.add.at(by_group.T, (slice(None), groups), table)
    joint, held = table.sum(axis=1)[wanted.given], (table > 0).sum(axis=1)[wanted.given]
    by_group = by_group[:, wanted.given]
    sums = margins.finish()
    one, two = wanted.labels[first], wanted.labels[second]
    whole = Sums(spec, int(sums.total.sum()), sums.first.sum(axis=0), sums.second.sum(axis=0))
    tables = TableMaker(whole, convention).counted(one, two, joint).arguments
    replicates = without_each_group(spec, convention, joint, by_group, sums, one.astype(np.int64), two.astype(np.int64))
    value = pmi(*tables)
    return Estimates(joint, held, value, document_interval(value, replicates), pmi_interval(*tables))


class Topical:
    """Text that clusters: each document mixes topics by shares of its own, and draws its words independently.

    The shares are Dirichlet with concentration ``alpha`` over equally common topics, so that with phi[k] the words of
    topic k the chance that two given places of a document hold x and y is, exactly,

        sum over k, l of E[t_k t_l] phi[k, x] phi[l, y],   E[t_k t_l] = (alpha m_k m_l + [k = l] m_k) / (alpha + 1)

    with m_k = 1 / topics (moments of the Dirichlet distribution). Every word has its own topic that it prefers.
    """

    def __init__(self, topics: int = 6, words: int = 120, alpha: float = 0.5, preference: float = 0.85) -> None:
        self.topics, self.words, self.alpha = topics, words, alpha
        weights = 1.0 / np.arange(4, words // topics + 4)
        own = np.zeros((topics, words))
        for topic in range(topics):
            own[topic, topic::topics] = weights / weights.sum()
        self.phi = preference * own + (1 - preference) * own.mean(axis=0)

    def pmi(self, first: UInt32Array, second: UInt32Array) -> np.ndarray:
        """The true PMI of pairs of words, in bits."""
        mean = 1.0 / self.topics
        moments = (self.alpha * mean**2 + np.eye(self.topics) * mean) / (self.alpha + 1)
        together = np.einsum("kl,kn,ln->n", moments, self.phi[:, first], self.phi[:, second])
        margins = self.phi.mean(axis=0)
        value: np.ndarray = np.log2(together / (margins[first] * margins[second]))
        return value

    def corpus(self, seed: int, n_documents: int, longest: int = 200) -> Corpus:
        """A random corpus; a document is one unit."""
        random = np.random.default_rng(seed)
        lengths = random.integers(longest // 4, longest, n_documents)
        document = np.repeat(np.arange(n_documents), lengths)
        shares = random.dirichlet(np.full(self.topics, self.alpha / self.topics), n_documents)
        topic = (random.random(len(document))[:, None] > np.cumsum(shares, axis=1)[document, :-1]).sum(axis=1)
        order = np.argsort(topic, kind="stable")
        terms = np.empty(len(document), np.uint32)
        draws = random.random(len(document))
        for number, places in enumerate(np.split(order, np.searchsorted(topic[order], np.arange(1, self.topics)))):
            terms[places] = np.searchsorted(np.cumsum(self.phi[number]), draws[places] * (1 - 1e-12))
        return Corpus(terms, np.cumsum(lengths) - lengths, document, n_documents)


class CountedText:
    """The whole table of a text in memory, with the attributes that a tally has."""

    def __init__(self, terms: UInt32Array, units: Int64Array, n_terms: int, spec: TallySpec) -> None:
        self.spec = spec
        span = TokenSpan(terms, units)
        self.words = WordCounts(np.bincount(terms, minlength=n_terms), np.ones(n_terms, np.int64))
        if spec.kind == "unit":
            block = pair_block(count_units(span))
            here, starts = unit_terms(span)
            self.first = self.second = np.bincount(here, minlength=n_terms)
            self.total = len(starts)
        else:
            count = count_positions if spec.kind == "positions" else count_windows
            block = pair_block(count(span, spec.left, spec.right))
            rows, columns = np.zeros(n_terms, np.int64), np.zeros(n_terms, np.int64)
            other = block.low != block.high
            for one, two, counts in (
                (block.low, block.high, block.forward),
                (block.high[other], block.low[other], block.backward[other]),
            ):
                np.add.at(rows, one, counts)
                np.add.at(columns, two, counts)
            positions = spec.kind == "positions"
            self.first, self.second = self.words.tokens if positions else rows, columns
            self.total = len(terms) if positions else int(rows.sum())
        self._block = block
        self.n_pairs = len(block)

    def blocks(self) -> Iterator[PairBlock]:
        """All pairs at once."""
        yield self._block

    def given(self, reader: TableReader, first: UInt32Array, second: UInt32Array) -> PairTable:
        """The tables of given pairs, met or not, from a dictionary of cells."""
        cells = {}
        for low, high, forward, backward in zip(
            *(getattr(self._block, name).tolist() for name in ("low", "high", "forward", "backward")), strict=True
        ):
            cells[low, high] = forward
            if low != high:
                cells[high, low] = backward
        joint = []
        for x, y in zip(first.tolist(), second.tolist(), strict=True):
            both = x != y and not reader.ordered
            joint.append(cells.get((x, y), 0) + (cells.get((y, x), 0) if both else 0))
        return reader.counted(first, second, np.array(joint, np.int64))

    def question(self, margins: Margins = "pairs", *, directed: bool = False) -> Question:
        """The question for all pairs of the text; there is no store behind it."""
        convention = Convention(margins=margins, directed=directed)
        reader = TableReader(cast(Any, self), convention, self.words)
        return Question(cast(Any, None), self.spec, convention, reader, self.words)


def independent_text(
    random: np.random.Generator, n_tokens: int, n_terms: int, sentence: int = 15
) -> tuple[UInt32Array, Int64Array]:
    """Words drawn independently with Zipf's frequencies, in sentences of random length."""
    chances = np.cumsum(1.0 / np.arange(2, n_terms + 2))
    terms = np.searchsorted(chances / chances[-1], random.random(n_tokens) * (1 - 1e-12)).astype(np.uint32)
    return terms, np.flatnonzero(np.append(True, random.random(n_tokens - 1) < 1 / sentence))
