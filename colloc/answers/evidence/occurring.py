"""One pass over the stream for one pair: its counts and margins in every document, and its profile of positions."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colloc.answers.concordance.finding import Hits, stream_places
from colloc.answers.questions import Question
from colloc.answers.tables import PairTable, Sums, TableMaker
from colloc.counts.placing import DocumentPlaces, document_places
from colloc.counts.selection import Selection, slice_selection
from colloc.counts.spans import PIECE, read_stretches, whole_units, window_spans
from colloc.records import NO_TERM, Int64Array, TokenSpan, UInt32Array, WordCounts
from colloc.settings import TallySpec
from colloc.store.vocabulary import layer_map

OTHER, FIRST, SECOND = 0, 1, 2
"""Labels: any other word, the first word of the pair, the second (which is FIRST where both are the same)."""
UNIT_REACH = 5
"""Words on either side that the profile of a pair counted by units looks at."""


@dataclass(frozen=True, slots=True)
class PairOccurrences:
    """Counts of one pair in each of n documents.

    Attributes
    ----------
    question : Question
    documents : int64 array, shape (n,)
        Document numbers, in the order of the text.
    joint : int64 array, shape (n,)
        As the question's table counts them.
    first, second, words : int64 arrays, shape (n, 3)
        Row sums, column sums and tokens (units of text that hold them, where those are counted) of the labels.
    tokens : int64 array, shape (n,)
        Words.
    total : int64 array, shape (n,)
        Sum of the table.
    cases, with_second : int64 arrays, shape (n,)
        Tokens of the first word, and those with the second in reach.
    left, right : int
        The reach.
    hits : Hits
        Each of those tokens with the nearest second word, as ``lines`` finds them.
    offsets : int64 array, shape (m,)
        Places of the second word relative to the first, 0 left out.
    profile : int64 array, shape (m,)
        Pairs of tokens at each offset.
    same : bool
        Whether both words are one.
    """

    question: Question
    documents: Int64Array
    joint: Int64Array
    first: Int64Array
    second: Int64Array
    words: Int64Array
    tokens: Int64Array
    total: Int64Array
    cases: Int64Array
    with_second: Int64Array
    left: int
    right: int
    hits: Hits
    offsets: Int64Array
    profile: Int64Array
    same: bool

    def table(self, rows: NDArray[np.bool_] | None = None) -> PairTable:
        """The contingency table of the documents chosen by a mask; of all of them without one."""
        chosen = np.ones(len(self.documents), np.bool_) if rows is None else rows
        question = self.question
        tokens = self.words[chosen].sum(axis=0)
        sums = Sums(
            question.spec,
            int(self.total[chosen].sum()),
            self.first[chosen].sum(axis=0),
            self.second[chosen].sum(axis=0),
        )
        maker = TableMaker(sums, question.convention, WordCounts(tokens, np.zeros_like(tokens)))
        one = np.array([FIRST], np.uint32)
        other = one if self.same else np.array([SECOND], np.uint32)
        return maker.counted(one, other, np.array([self.joint[chosen].sum()]))


def occurrences_of(question: Question, first: int, second: int) -> PairOccurrences:
    """Read the slice of a question once.

    Parameters
    ----------
    first, second : int
        Terms of the question's layer.
    """
    of_type = layer_map(question.store, question.layer)
    labels = np.where(of_type == NO_TERM, NO_TERM, np.uint32(OTHER))
    labels[of_type == second] = SECOND
    labels[of_type == first] = FIRST
    selection = slice_selection(question.store, question.spec.where)
    places = document_places(question.store, selection)
    counter = _Counter(question.spec, question.reader.ordered, len(places), same=first == second)
    inside = question.spec.inside
    place = 0
    reach = max(counter.left, counter.right)
    stretches = read_stretches(question.store, labels, selection, inside, 0, places.stop)
    for span in window_spans(stretches, 0, places.stop, reach, reach, PIECE):
        begin = place - span.context
        counter.add(span, begin, places)
        place = begin + len(span.terms) - span.ahead
    if question.spec.kind == "unit":
        _count_units(question, labels, selection, places, counter)
    counter.finish()
    return PairOccurrences(
        question,
        places.numbers,
        counter.joint,
        counter.first,
        counter.second,
        counter.words,
        counter.tokens,
        counter.total,
        counter.cases,
        counter.with_second,
        counter.reach_left,
        counter.right,
        counter.hits(selection, places),
        counter.offsets,
        counter.profile,
        first == second,
    )


class _Counter:
    """Adds spans of labels up by document."""

    def __init__(self, spec: TallySpec, ordered: bool, n_documents: int, *, same: bool) -> None:
        self._kind = spec.kind
        self._spec = spec
        self._ordered = ordered
        self.second_label = FIRST if same else SECOND
        reach = {"window": (spec.right, spec.right), "unit": (UNIT_REACH, UNIT_REACH)}
        self.left, self.right = reach.get(spec.kind, (spec.left, spec.right))
        self.reach_left = 0 if ordered and spec.kind == "window" else self.left
        steps = np.arange(-self.left, self.right + 1)
        self.offsets = steps[steps != 0]
        self._near: list[tuple[Int64Array, Int64Array]] = [(np.empty(0, np.int64), np.empty(0, np.int64))]
        self.profile = np.zeros(len(self.offsets), np.int64)
        self.joint, self.total, self.cases, self.with_second, self.tokens = np.zeros((5, n_documents), np.int64)
        self.first, self.second, self.words = (np.zeros((n_documents, 3), np.int64) for _ in range(3))

    def add(self, span: TokenSpan, begin: int, places: DocumentPlaces) -> None:
        """Count a span that begins at the place ``begin`` of the selection."""
        n = len(span.terms)
        if span.context >= n - span.ahead:
            return
        tokens = _Tokens.of(span, begin, places)
        here = {label: tokens.core_places(label) for label in {FIRST, self.second_label}}
        joint = self._profile(tokens, here[FIRST], begin)
        tokens.add_words(self.tokens)
        if self._kind == "unit":
            return
        tokens.add_words(self.words[:, OTHER])
        for label, found in here.items():
            tokens.add_at(self.words[:, label], found, 1)
            tokens.add_at(self.words[:, OTHER], found, -1)
        if self._kind == "positions":
            tokens.add(self.second[:, self.second_label], tokens.has_near(self.second_label, self.left, self.right))
            return
        tokens.add_at(self.joint, here[FIRST], joint)
        after, before = self._spec.right, self._spec.left
        tokens.add_neighbours(self.total, (after, before))
        for label, found in here.items():
            # Row and column sums of M, or of C where the span is unequal.
            rows = tokens.following(found, after) + tokens.preceding(found, before)
            columns = tokens.preceding(found, after) + tokens.following(found, before)
            tokens.add_at(self.first[:, label], found, rows)
            tokens.add_at(self.second[:, label], found, columns)

    def finish(self) -> None:
        """What follows from the other sums."""
        if self._kind in ("unit", "positions"):
            self.first[:] = self.words
        if self._kind == "unit":
            self.second[:] = self.words
        if self._kind == "positions":
            self.joint[:] = self.with_second
            self.total[:] = self.words.sum(axis=1)

    def hits(self, selection: Selection, places: DocumentPlaces) -> Hits:
        """The cases with the second word in reach."""
        first, distance = (np.concatenate(arrays) for arrays in zip(*self._near, strict=True))
        return Hits(
            stream_places(selection, first),
            places.numbers[places.of(first)],
            1,
            stream_places(selection, first + distance),
            distance,
            1,
        )

    def _profile(self, tokens: _Tokens, first: Int64Array, begin: int) -> Int64Array:
        """Count pairs by offset, and cases; gives the joint count of each case."""
        unit_begin, unit_end = tokens.bounds(first)
        nearest = np.zeros(len(first), np.int64)
        counted = np.zeros(len(first), np.int64)
        # From far to near, before to after: what comes last is the nearest, the one after where both are as near.
        for row in np.lexsort((self.offsets, -np.abs(self.offsets))).tolist():
            offset = int(self.offsets[row])
            other = first + offset
            met = (other >= unit_begin) & (other < unit_end)
            met[met] = tokens.labels[other[met]] == self.second_label
            self.profile[row] += np.count_nonzero(met)
            if offset >= -self.reach_left:
                nearest[met] = offset
            if self._counts(offset):
                counted += met
        near = nearest != 0
        tokens.add_at(self.cases, first, 1)
        tokens.add_at(self.with_second, first, near)
        self._near.append((first[near] + begin, nearest[near]))
        return counted

    def _counts(self, offset: int) -> bool:
        """Whether the table counts a pair at this offset of the first word: on the diagonal each pair once."""
        if self._kind != "window":
            return True
        return offset > 0 or not (self._ordered or self.second_label == FIRST)


@dataclass(frozen=True, slots=True)
class _Tokens:
    """A span ready to count.

    Attributes
    ----------
    labels : uint32 array
    core : slice
        The tokens counted here.
    present : bool array
        Which tokens are words of the layer.
    before : int64 array
        How many words stand before each token, and before the end; None where all tokens are words.
    edges : int64 array
        Where units begin, and the end.
    documents, starts : int64 arrays
        Documents of the core, and where each begins in it.
    """

    labels: UInt32Array
    core: slice
    present: NDArray[np.bool_]
    before: Int64Array | None
    edges: Int64Array
    documents: Int64Array
    starts: Int64Array

    @classmethod
    def of(cls, span: TokenSpan, begin: int, places: DocumentPlaces) -> _Tokens:
        """A span that begins at the place ``begin`` of a selection; its core is not empty."""
        n = len(span.terms)
        first, stop = span.context, n - span.ahead
        present = span.terms != NO_TERM
        before = None if present.all() else np.concatenate([[0], np.cumsum(present)])
        edges = np.concatenate([[0], span.units[span.units > 0], [n]])
        low, high = places.of(np.array([begin + first, begin + stop - 1])).tolist()
        starts = np.concatenate([[first], places.begins[low + 1 : high + 1] - begin])
        return cls(span.terms, slice(first, stop), present, before, edges, np.arange(low, high + 1), starts)

    def core_places(self, label: int) -> Int64Array:
        """Offsets of the tokens of the core with a label."""
        places: Int64Array = np.flatnonzero(self.labels[self.core] == label) + self.core.start
        return places

    def bounds(self, here: Int64Array) -> tuple[Int64Array, Int64Array]:
        """Where the unit of each token begins, and where it ends."""
        unit = np.searchsorted(self.edges[:-1], here, side="right") - 1
        return self.edges[unit], self.edges[unit + 1]

    def following(self, here: Int64Array, reach: int) -> Int64Array:
        """Words within reach after the tokens ``here``; 0 for what is no word."""
        stop = np.minimum(here + reach + 1, self.bounds(here)[1])
        found: Int64Array = self._words(here + 1, stop) * self.present[here]
        return found

    def preceding(self, here: Int64Array, reach: int) -> Int64Array:
        """Words within reach before the tokens ``here``."""
        return self._words(np.maximum(here - reach, self.bounds(here)[0]), here)

    def _words(self, first: Int64Array, stop: Int64Array) -> Int64Array:
        words: Int64Array = stop - first if self.before is None else self.before[stop] - self.before[first]
        return words

    def has_near(self, label: int, left: int, right: int) -> NDArray[np.bool_]:
        """For the core: words that have the label in reach."""
        marks = self.labels == label
        sums = np.concatenate([[0], np.cumsum(marks)])
        here = np.arange(self.core.start, self.core.stop)
        sizes = np.diff(self.edges)
        first = np.maximum(here - left, np.repeat(self.edges[:-1], sizes)[self.core])
        stop = np.minimum(here + right + 1, np.repeat(self.edges[1:], sizes)[self.core])
        found: NDArray[np.bool_] = (sums[stop] - sums[first] - marks[here] > 0) & self.present[here]
        return found

    def add_words(self, into: Int64Array) -> None:
        """Add the words of the core up by document."""
        edges = np.append(self.starts, self.core.stop)
        into[self.documents] += np.diff(edges) if self.before is None else np.diff(self.before[edges])

    def add_neighbours(self, into: Int64Array, reaches: tuple[int, ...]) -> None:
        """Add up by document how many words follow each word of the core within each reach."""
        if self.before is not None:
            here = np.flatnonzero(self.present[self.core]) + self.core.start
            for reach in reaches:
                self.add_at(into, here, self.following(here, reach))
            return
        # All tokens are words: what follows depends on how many are left in the unit, which runs down to none.
        low, high = np.searchsorted(self.edges, [self.core.start + 1, self.core.stop])
        begins = np.maximum(self.edges[low - 1 : high], self.core.start)
        ends = self.edges[low : high + 1]
        for reach in reaches:
            sums = _run_down(ends - begins, reach) - _run_down(np.maximum(ends - self.core.stop, 0), reach)
            self.add_at(into, begins, sums)

    def add(self, into: Int64Array, values: NDArray[np.bool_] | Int64Array) -> None:
        """Add values of the core up by document."""
        sums = np.concatenate([[0], np.cumsum(values, dtype=np.int64)])
        into[self.documents] += np.diff(sums[np.append(self.starts, self.core.stop) - self.core.start])

    def add_at(self, into: Int64Array, here: Int64Array, values: NDArray[np.bool_] | Int64Array | int) -> None:
        """Add values of the tokens ``here`` up by document."""
        owners = self.documents[np.searchsorted(self.starts, here, side="right") - 1]
        np.add.at(into, owners, values)


def _run_down(length: Int64Array, reach: int) -> Int64Array:
    """The sum of min(reach, k) over k = 0 .. length - 1."""
    short = np.minimum(length, reach)
    found: Int64Array = short * (short - 1) // 2 + reach * (length - short)
    return found


def _count_units(
    question: Question, labels: UInt32Array, selection: Selection, places: DocumentPlaces, into: _Counter
) -> None:
    """Units that hold the words, by document; a unit without any word is none."""
    stretches = read_stretches(question.store, labels, selection, question.spec.inside, 0, places.stop)
    for terms, starts, begins in whole_units(stretches, 0, places.stop):
        if not len(starts):
            continue
        owners = places.of(begins)
        holds = [np.logical_or.reduceat(terms == label, starts) for label in (OTHER, FIRST, SECOND)]
        np.add.at(into.total, owners, 1)
        np.add.at(into.joint, owners, holds[FIRST] & holds[into.second_label])
        for label, there in enumerate(holds):
            np.add.at(into.words[:, label], owners, there)
