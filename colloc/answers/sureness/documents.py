"""What the documents say of given pairs: how the pairs are spread over them, and how far PMI moves without some."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colloc.answers.questions import Question
from colloc.answers.tables import Convention, PairTable, Side, Sums, TableMaker
from colloc.counts.candidates import CandidatePass
from colloc.counts.grouping import GROUPS, GroupedMargins
from colloc.measures.intervals import Interval, jackknife
from colloc.measures.pmi import pmi
from colloc.records import FloatArray, Int64Array, WordCounts
from colloc.settings import TallySpec

SOUND_JOINT, SOUND_DOCUMENTS = 20, 10
"""Meetings, and documents with one, from which on the interval was found to hold what it promises."""


ROWS = 2**17
"""Rows that one pass follows: 20 groups of so many take 50 MB."""


@dataclass(frozen=True, slots=True)
class DocumentEvidence:
    """By pair, shape (n,).

    Attributes
    ----------
    documents : int64 array
        How many documents hold the pair.
    dp_norm : float64 array
        How unevenly its occurrences are spread over the documents, 0 as their words are, towards 1 (Gries 2008;
        Lijffijt & Gries 2012). nan for pairs that never meet, and where there is only one document.
    largest_share : float64 array
        Share of the occurrences that the document with most of them holds.
    interval : Interval or None
        Of PMI in bits: 95 %, from the delete-a-group jackknife over documents.
    sound : bool array
        Whether that interval was found to hold what it promises for pairs like this: `SOUND_JOINT` and
        `SOUND_DOCUMENTS` reached, and `GROUPS` groups of documents.
    """

    documents: Int64Array
    dp_norm: FloatArray
    largest_share: FloatArray
    interval: Interval | None
    sound: NDArray[np.bool_]

    def take(self, rows: NDArray[np.int64]) -> DocumentEvidence:
        """Some of the pairs."""
        interval = self.interval
        if interval is not None:
            interval = Interval(interval.low[rows], interval.high[rows], interval.se[rows])
        columns = (self.documents[rows], self.dp_norm[rows], self.largest_share[rows])
        return DocumentEvidence(*columns, interval, self.sound[rows])


def document_evidence(
    question: Question, table: PairTable, side: Side = "both", *, intervals: bool = True
) -> DocumentEvidence:
    """One pass over the stream for all rows of a table; for more than `ROWS` of them one pass for each so many."""
    parts = [
        _of_rows(question, table.take(np.arange(begin, min(begin + ROWS, len(table)))), side, intervals)
        for begin in range(0, max(len(table), 1), ROWS)
    ]
    return parts[0] if len(parts) == 1 else _joined(parts)


def _joined(parts: Sequence[DocumentEvidence]) -> DocumentEvidence:
    intervals = [part.interval for part in parts if part.interval is not None]
    return DocumentEvidence(
        np.concatenate([part.documents for part in parts]),
        np.concatenate([part.dp_norm for part in parts]),
        np.concatenate([part.largest_share for part in parts]),
        Interval(*(np.concatenate([getattr(part, name) for part in intervals]) for name in ("low", "high", "se")))
        if intervals
        else None,
        np.concatenate([part.sound for part in parts]),
    )


def _of_rows(question: Question, table: PairTable, side: Side, intervals: bool) -> DocumentEvidence:
    n = len(table)
    joint = _counted(question, table)
    first, second = (table.second, table.first) if side == "left" else (table.first, table.second)
    found = CandidatePass(
        question.store,
        question.spec,
        first,
        second,
        directed=question.reader.ordered or side != "both",
        groups=GROUPS if intervals else 0,
    )
    spread = _Spread(joint, found.documents.lengths)
    n_groups = int(found.group_of.max(initial=-1)) + 1
    by_group = np.zeros((n_groups, n), np.int64)
    for part in found:
        index = np.searchsorted(found.documents.numbers, part.document)
        spread.add(part.pair, index, part.count)
        if intervals:
            np.add.at(by_group, (found.group_of[index], part.pair), part.count)
    documents, dp_norm, largest = spread.finish()
    interval = None
    sound = np.zeros(n, np.bool_)
    if intervals:
        columns = (found.second, found.first) if side == "left" else (found.first, found.second)
        replicates = np.full(by_group.shape, -np.inf)
        if found.margins is not None:
            replicates = without_each_group(
                question.spec, question.convention, joint, by_group, found.margins, *columns, side
            )
        interval = document_interval(pmi(*table.arguments), replicates)
        sound = (table.joint >= SOUND_JOINT) & (documents >= SOUND_DOCUMENTS) & (n_groups == GROUPS)
    return DocumentEvidence(documents, dp_norm, largest, interval, sound)


def _counted(question: Question, table: PairTable) -> Int64Array:
    """Joint counts as they are met in the text: margins of tokens show a word beside itself twice."""
    if question.convention.margins != "tokens" or question.reader.ordered:
        return table.joint
    return np.where(table.first == table.second, table.joint // 2, table.joint)


class _Spread:
    """Sums for DPnorm that need no table of pairs by documents (formulas: `colloc.measures.dispersion`)."""

    def __init__(self, joint: Int64Array, lengths: Int64Array) -> None:
        total = lengths.sum()
        self._shares = lengths / total if total else np.zeros(len(lengths))
        self._joint = np.asarray(joint, np.float64)
        n = len(joint)
        self._documents = np.zeros(n, np.int64)
        self._distance, self._largest = np.zeros(n), np.zeros(n)
        self._covered = np.zeros(n)

    def add(self, pair: Int64Array, document: Int64Array, count: Int64Array) -> None:
        """Take counts; each pair and document comes once."""
        n = len(self._documents)
        share, expected = count / self._joint[pair], self._shares[document]
        self._documents += np.bincount(pair, minlength=n)
        self._distance += np.bincount(pair, weights=np.abs(share - expected), minlength=n)
        self._covered += np.bincount(pair, weights=expected, minlength=n)
        np.maximum.at(self._largest, pair, share)

    def finish(self) -> tuple[Int64Array, FloatArray, FloatArray]:
        """Documents, DPnorm and the largest share."""
        there = self._shares[self._shares > 0]
        smallest = float(there.min()) if len(there) else 1.0
        with np.errstate(divide="ignore", invalid="ignore"):
            # a document without the pair adds its whole share
            dp = 0.5 * (self._distance + np.maximum(1.0 - self._covered, 0.0))
            dp_norm = dp / (1.0 - smallest) if smallest < 1 else np.full(len(dp), np.nan)
        never = self._documents == 0
        return self._documents, np.where(never, np.nan, dp_norm), np.where(never, np.nan, self._largest)


def without_each_group(
    spec: TallySpec,
    convention: Convention,
    joint: Int64Array,
    by_group: Int64Array,
    margins: GroupedMargins,
    first: Int64Array,
    second: Int64Array,
    side: Side = "both",
) -> FloatArray:
    """PMI of everything but one group of documents, for each group.

    Parameters
    ----------
    joint : int64 array, shape (n,)
    by_group : int64 array, shape (n_groups, n)
        The joint counts of each group.
    first, second : int64 arrays, shape (n,)
        The columns of ``margins`` that belong to the words of each pair.

    Returns
    -------
    float64 array, shape (n_groups, n)
    """
    result = np.empty(by_group.shape)
    tables = (margins.first, margins.second, margins.words)
    sums = [table.sum(axis=0) for table in tables]
    one, two = first.astype(np.uint32), second.astype(np.uint32)
    for group in range(len(by_group)):
        rows, columns, words = (whole - table[group] for whole, table in zip(sums, tables, strict=True))
        total = int(margins.total.sum() - margins.total[group])
        maker = TableMaker(Sums(spec, total, rows, columns), convention, WordCounts(words, np.zeros_like(words)))
        result[group] = pmi(*maker.counted(one, two, joint - by_group[group], side).arguments)
    return result


def document_interval(value: FloatArray, replicates: FloatArray) -> Interval:
    """The jackknife interval; without bounds where there are not two groups to leave out."""
    if len(replicates) < 2:
        unknown = np.full(len(value), np.inf)
        return Interval(-unknown, unknown, unknown)
    return jackknife(value, replicates)
