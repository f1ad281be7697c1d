"""Pairs that meet much less than chance, those that never met among them.

Only pairs whose expected count reaches a threshold are looked at: they are found from the margins, without listing
all pairs of words, and the threshold knows nothing of how often they met, so the tests stay honest. A pair that never
met and was expected twice says nothing.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from colloc.answers.questions import Question
from colloc.answers.sureness.hypotheses import Hypotheses, require_cells
from colloc.answers.sureness.wishes import Wishes
from colloc.answers.tables import PairTable, Side, TableReader, joined
from colloc.errors import UsageError
from colloc.measures.contingency import expected
from colloc.measures.exact import fisher_log_p
from colloc.measures.likelihood import g2
from colloc.measures.pmi import pmi
from colloc.records import FloatArray, UInt32Array

MAX_Q = 0.05
_CHUNK = 2**20


@dataclass(frozen=True, slots=True)
class Avoidance:
    """Pairs with an expected count large enough that meet less than expected, and the tests they are among."""

    table: PairTable
    family: AvoidanceTests


class AvoidanceTests(Hypotheses):
    """Lower-tail tests of all pairs whose expected count is large enough."""

    def q_values(self, table: PairTable) -> FloatArray:
        """The q-value of each row, by the lower tail of Fisher's exact test."""
        return self.q_of(lower_tail(table))


def lower_tail(table: PairTable) -> FloatArray:
    """Natural log of the probability of meeting so seldom or more seldom, given the margins (Fisher 1935)."""
    return fisher_log_p(*table.arguments, alternative="less")


def check_avoidance(question: Question, wishes: Wishes, min_expected: float, any_strength: bool) -> None:
    """Raise UsageError for what avoidance cannot be asked with."""
    require_cells(question, "avoidance")
    if min_expected < 1:
        raise UsageError(f"min_expected must be at least 1, not {min_expected}: rarer pairs are missing by chance")
    if any_strength:
        raise UsageError("any_strength and avoid contradict each other: give one of them")
    if wishes.above_chance is not None:
        raise UsageError("above_chance asks for attraction: leave it out with avoid")


def avoiding_pairs(
    question: Question, min_expected: float, min_word_count: int = 1, max_q: float | None = None
) -> Avoidance:
    """All pairs of a store that avoid each other with a q-value of at most ``max_q`` (0.05 when not given).

    Memory goes by the pairs found and one chunk of those looked at.
    """
    passing = question.words.tokens >= max(min_word_count, 1)
    chunks = (
        question.reader.given(first, second) for first, second in expected_pairs(question.reader, min_expected, passing)
    )
    return _tested(chunks, min_expected, max_q or MAX_Q)


def avoided_by(
    question: Question,
    terms: list[int],
    side: Side,
    min_expected: float,
    min_word_count: int = 1,
    max_q: float | None = None,
) -> Avoidance:
    """What some words avoid; the tests are those of all of the words together."""
    passing = question.words.tokens >= max(min_word_count, 1)
    tables = (_whole_row(question.reader, term, side, passing) for term in terms)
    return _tested(tables, min_expected, max_q or MAX_Q)


def _whole_row(reader: TableReader, term: int, side: Side, passing: np.ndarray) -> PairTable:
    """The tables of a term with every other one, met or not."""
    met = reader.around(term, side)
    joint = np.zeros(len(passing), np.int64)
    joint[met.second] = met.joint
    others = np.flatnonzero(passing).astype(np.uint32)
    if reader.spec.kind == "unit":
        others = others[others != term]
    return reader.counted(np.full(len(others), term, np.uint32), others, joint[others], side)


def _tested(tables: Iterator[PairTable], min_expected: float, max_q: float) -> Avoidance:
    number = 0
    kept: list[PairTable] = []
    log_p = [np.empty(0)]
    for table in tables:
        often = expected(*table.arguments)
        enough = often >= min_expected
        number += int(enough.sum())
        table = table.take(enough & (table.joint < often))
        table = table.take(_may_avoid(table, max_q))
        if len(table):
            p = lower_tail(table)
            log_p.append(p[p <= np.log(max_q)])
            kept.append(table.take(p <= np.log(max_q)))
    family = AvoidanceTests(np.concatenate(log_p), number)
    if not kept:
        nothing = np.empty(0, np.int64)
        return Avoidance(PairTable(nothing.astype(np.uint32), nothing.astype(np.uint32), *[nothing] * 4), family)
    table = joined(kept)
    return Avoidance(table.take(family.q_values(table) <= max_q), family)


def _may_avoid(table: PairTable, max_q: float) -> np.ndarray:
    """Rows whose p-value may be at most ``max_q``.

    p is at least the probability of the table itself, and that (see `colloc.measures.exact`) has a logarithm of
    at least -G2/2 - ln(2 pi a)/2 - 1/6 + ln(1 - C/N)/2, without the middle terms where a is 0.
    """
    joint = table.joint.astype(np.float64)
    share = table.second_total.astype(np.float64) / table.total
    with np.errstate(divide="ignore"):
        least = -np.abs(g2(*table.arguments)) / 2 - 0.5 * np.log(2 * np.pi * np.maximum(joint, 1.0)) - 1 / 6
        least += 0.5 * np.log1p(-share)
    likely: np.ndarray = ~(least > np.log(max_q))
    return likely


def expected_pairs(
    reader: TableReader, min_expected: float, passing: np.ndarray
) -> Iterator[tuple[UInt32Array, UInt32Array]]:
    """All pairs of words with an expected count of at least ``min_expected``, many at a time.

    Each unordered pair comes once, the more frequent word first; ordered ones as they are. Terms are sorted by their
    margins, so that the partners of a term are the first so many of a list.
    """
    first, second = _by_margin(reader.first_totals(), passing), _by_margin(reader.second_totals(), passing)
    sizes = reader.second_totals()[second].astype(np.float64)
    least = min_expected * float(reader.total) / reader.first_totals()[first].astype(np.float64)
    partners = np.searchsorted(-sizes, -least, side="right")
    begins = np.zeros(len(first), np.int64) if reader.ordered else np.arange(len(first))
    partners = np.maximum(partners - begins, 0)
    rows = np.flatnonzero(partners)
    ends = np.cumsum(partners[rows])
    done = 0
    while done < len(rows):
        before = int(ends[done - 1]) if done else 0
        stop = max(done + 1, int(np.searchsorted(ends, before + _CHUNK, side="right")))
        some = rows[done:stop]
        counts = partners[some]
        place = np.arange(counts.sum()) - np.repeat(np.cumsum(counts) - counts, counts)
        one, two = first[np.repeat(some, counts)], second[np.repeat(begins[some], counts) + place]
        if reader.spec.kind == "unit":
            one, two = one[one != two], two[one != two]
        yield one, two
        done = stop


def _by_margin(totals: np.ndarray, passing: np.ndarray) -> UInt32Array:
    there = np.flatnonzero(passing & (totals > 0))
    return there[np.argsort(-totals[there], kind="stable")].astype(np.uint32)


def shown_avoidance(table: PairTable, family: Hypotheses) -> dict[str, FloatArray]:
    """The columns that go with avoidance.

    ``q_value``
        Of the lower tail, among all pairs with an expected count large enough.
    ``pmi_if_one``
        PMI if the pair had met once: the smallest association that the sample could have shown.
    ``pmi_at_most``
        The PMI that such a count speaks against at 95 %: with the exact upper limit of a Poisson mean
        (Garwood 1936) in place of the joint count.
    """
    return {"q_value": family.q_values(table), **sample_limits(table)}


def sample_limits(table: PairTable) -> dict[str, FloatArray]:
    """What counts so small can show at all: ``pmi_if_one`` and ``pmi_at_most`` of :func:`shown_avoidance`."""
    from scipy.special import gammaincinv

    joint = table.joint.astype(np.float64)
    often = expected(*table.arguments)
    return {
        "pmi_if_one": pmi(np.ones(len(table)), *table.arguments[1:]),
        "pmi_at_most": np.log2(gammaincinv(joint + 1.0, 0.95) / often),
    }
