"""Pairs of words that two sub-corpora join at different rates, or with different strength."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any, Literal, get_args

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.contrasts.aligning import Cells, side_by_side
from colloc.answers.contrasts.gathering import DocumentCounts, pair_counts_by_document
from colloc.answers.contrasts.saying import both_directions, say, say_of_association
from colloc.answers.contrasts.sides import Sides, resolve_sides
from colloc.answers.contrasts.words import ranking_score
from colloc.answers.questions import PairOptions, Question, ask
from colloc.answers.sureness.documents import document_evidence
from colloc.answers.tables import PairTable
from colloc.errors import NotSeenError, UsageError
from colloc.measures.contrast import Difference, as_table, difference, keyness_g2, log_ratio_interval
from colloc.measures.discoveries import log_q_values
from colloc.measures.exact import association_log_p
from colloc.measures.intervals import Interval, jackknife_difference
from colloc.measures.odds import log_odds, log_odds_se
from colloc.measures.pmi import pmi
from colloc.measures.subcorpora.documents import document_test, permuted_p
from colloc.measures.tails import t_quantile
from colloc.records import FloatArray, Int64Array
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT
from colloc.store import vocabulary
from colloc.store.connection import Store

CANDIDATES = 10_000
"""So many pairs of either direction, those with the largest G2, take the test over documents; the rest count as
p = 1 in its q-values, which can only make them larger. All take it where all rows are shown."""
JUDGED = 1_000
"""So many pairs of either direction, those with the largest difference of log odds, have their PMI jackknifed when
association ranks."""
PairOrder = Literal["documents", "bound", "log_ratio", "g2", "association"]


@dataclass(frozen=True, slots=True)
class PairsSet:
    """All pairs tested: terms, joint counts on both sides, and what was computed of them, shape (n,) each."""

    cells: Cells
    log_ratio: FloatArray
    interval: Interval
    g2: FloatArray
    log_q: FloatArray
    odds: Difference
    odds_log_q: FloatArray

    def __len__(self) -> int:
        return len(self.g2)


def contrast_pairs(
    store: Store,
    *,
    this: Sequence[str],
    that: Sequence[str] = (),
    options: PairOptions | None = None,
    min_count: int = DEFAULT_MIN_COUNT,
    min_word_count: int = 1,
    min_docs: int = 1,
    sort: PairOrder = "documents",
    limit: int = 50,
    permutations: int = 0,
    seed: int = 1,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """Pairs more frequent, or more strongly associated, on one side than on the other.

    Parameters
    ----------
    options : PairOptions
        ``where`` holds for both sides.
    min_count : int
        Least joint count on both sides together; all such pairs are tested.
    min_word_count : int
        Least frequency of each word on both sides together.
    sort : {"documents", "bound", "log_ratio", "g2", "association"}
        As in ``contrast_words``; association goes by the difference of association, not of frequency: by the smaller
        of Woolf's z and the PMI difference divided by its jackknife standard error.
    min_docs, permutations, seed
        As in ``contrast_words``; permutations exchange labels of documents for the candidates alone.

    Returns
    -------
    Columns
        first, second, log_ratio, formula_low, formula_high (of the pair's relative frequency; bits, 95 %), joint_this,
        joint_that, documents_this, documents_that, g2, q, document_z, document_q (or document_p),
        pmi_this, pmi_that, pmi_difference, pmi_low, pmi_high (bits; 95 % from the jackknife over documents),
        log_odds_difference (nats), log_odds_q (Woolf), says.
    """
    if sort not in get_args(PairOrder):
        raise UsageError(f"sort must be one of {', '.join(get_args(PairOrder))}, not {sort!r}")
    options = options or PairOptions()
    sides = resolve_sides(store, this, that, options.where)
    questions = ask_both(store, sides, options, jobs=jobs, memory=memory, progress=progress)
    found = _tested(questions, min_count, min_word_count)
    by_association = sort == "association"
    more_in_this = (found.odds.difference if by_association else found.log_ratio) >= 0
    size = np.abs(found.odds.z if by_association else found.g2)
    most = 2 * max(JUDGED if by_association else CANDIDATES, limit) if limit else 0
    candidates = np.sort(both_directions(size, [], more_in_this, most))
    counts = pair_counts_by_document(questions, found.cells[0][candidates], found.cells[1][candidates])
    tested = document_test(counts.rates, counts.in_this)
    if permutations:
        document_q = permuted_p(counts.rates, counts.in_this, permutations, seed)
    else:
        document_q = np.exp(log_q_values(tested.log_p, len(found)))
    held = counts.documents_on(True) + counts.documents_on(False)
    if sort == "association":
        score = _association_score(questions, found, candidates)
    else:
        bounds = (found.interval.low[candidates], found.interval.high[candidates])
        score = ranking_score(sort, tested.log_p, found.log_ratio[candidates], *bounds, found.g2[candidates])
    shown = np.flatnonzero(held >= min_docs)
    rows = shown[both_directions(score[shown], [size[candidates[shown]]], more_in_this[candidates[shown]], limit)]
    settings = {
        **questions[0].settings(),
        "where": "",
        "this": sides.this,
        "that": sides.that,
        "min_count": min_count,
        "min_word_count": min_word_count,
        "min_docs": min_docs,
        "sort": sort,
        "limit": limit,
        "tested": len(found),
        "tested_over_documents": len(candidates),
        **({"permutations": permutations, "seed": seed} if permutations else {}),
    }
    document = {
        "document_z": tested.rank_z[rows],
        "document_p" if permutations else "document_q": document_q[rows],
    }
    return _columns(questions, found, candidates[rows], counts, rows, document, document_q[rows], settings)


def ask_both(
    store: Store, sides: Sides, options: PairOptions, *, jobs: int | None, memory: int, progress: Any
) -> tuple[Question, Question]:
    """The same question about either side.

    Raises
    ------
    UsageError
        The margins are those of tokens, which have no cells to compare.
    """
    this, that = (
        ask(store, replace(options, where=[side]), jobs=jobs, memory=memory, progress=progress) for side in sides.both
    )
    require_cells(this)
    return this, that


def require_cells(question: Question) -> None:
    """Raise UsageError where the margins are those of tokens: their tables have no cells to compare."""
    if question.convention.margins == "tokens":
        raise UsageError(
            "a contrast of pairs compares cells, which margins tokens does not have: use margins pairs or positions"
        )


def _tested(questions: tuple[Question, Question], min_count: int, min_word_count: int) -> PairsSet:
    """All pairs that pass the thresholds; 24 bytes a pair while they are gathered, 40 more when they are judged."""
    this, that = questions
    words = this.words.tokens + that.words.tokens
    kept: list[Cells] = []
    for first, second, joint, other_joint in side_by_side(this.reader.tally, that.reader.tally, this.reader.ordered):
        keep = joint + other_joint >= max(min_count, 1)
        if min_word_count > 1:
            keep &= (words[first] >= min_word_count) & (words[second] >= min_word_count)
        index = np.flatnonzero(keep)
        if len(index):
            kept.append((first[index], second[index], joint[index], other_joint[index]))
    if not kept:
        raise NotSeenError(f"{this.store.path}: no pair occurs {min_count} times in the two slices; lower --min-count")
    cells: Cells = tuple(np.concatenate(column) for column in zip(*kept, strict=True))  # type: ignore[assignment]
    totals = (this.reader.tally.total, that.reader.tally.total)
    arguments = (cells[2], totals[0], cells[3], totals[1])
    log_ratio, interval = log_ratio_interval(*arguments)
    log_p = association_log_p(*as_table(*arguments))
    odds = _odds_difference(tables_of(questions, cells))
    return PairsSet(
        cells, log_ratio, interval, keyness_g2(*arguments), log_q_values(log_p), odds, log_q_values(odds.log_p)
    )


def tables_of(questions: tuple[Question, Question], cells: Cells) -> tuple[PairTable, PairTable]:
    """The contingency tables of the same pairs on either side."""
    first, second, joint, other_joint = cells
    this, that = questions
    return this.reader.counted(first, second, joint), that.reader.counted(first, second, other_joint)


def _odds_difference(tables: tuple[PairTable, PairTable]) -> Difference:
    """Woolf's difference of log odds ratios."""
    estimates = [(log_odds(*table.arguments), log_odds_se(*table.arguments)) for table in tables]
    return difference(*estimates[0], *estimates[1])


def _association_score(questions: tuple[Question, Question], found: PairsSet, candidates: Int64Array) -> FloatArray:
    """The smaller of Woolf's z and the jackknife's t, in size; 0 where the jackknife bears no claim."""
    cells: Cells = tuple(column[candidates] for column in found.cells)  # type: ignore[assignment]
    compared = strength(questions, tables_of(questions, cells))
    with np.errstate(divide="ignore", invalid="ignore"):
        t = np.abs(compared.pmi_difference / compared.pmi_interval.se)
    score: FloatArray = np.minimum(np.abs(found.odds.z[candidates]), np.nan_to_num(t, nan=0.0))
    return score


@dataclass(frozen=True, slots=True)
class Strength:
    """How strongly pairs are associated on either side, and the differences, shape (n,) each.

    Attributes
    ----------
    pmi : two float64 arrays
        Bits.
    pmi_difference : float64 array
    pmi_interval : Interval
        95 %, from the delete-a-group jackknife over the documents of either side; infinite where it bears no claim.
    """

    pmi: tuple[FloatArray, FloatArray]
    pmi_difference: FloatArray
    pmi_interval: Interval


def strength(questions: tuple[Question, Question], tables: tuple[PairTable, PairTable]) -> Strength:
    """Association of the same pairs on two sides compared: one pass over the stream of each side."""
    values = tuple(pmi(*table.arguments) for table in tables)
    intervals = [document_evidence(question, table).interval for question, table in zip(questions, tables, strict=True)]
    with np.errstate(invalid="ignore"):
        gap = values[0] - values[1]
        se = (
            jackknife_difference(intervals[0], intervals[1])
            if intervals[0] is not None and intervals[1] is not None
            else np.full(len(gap), np.inf)
        )
        # Both sides have 20 groups at most; 19 degrees of freedom are the safe choice for their difference.
        reach = t_quantile(0.95, 19) * se
        bears = np.isfinite(se) & np.isfinite(gap)
        interval = Interval(np.where(bears, gap - reach, -np.inf), np.where(bears, gap + reach, np.inf), se)
    return Strength((values[0], values[1]), gap, interval)


def _columns(
    questions: tuple[Question, Question],
    found: PairsSet,
    pairs: Int64Array,
    counts: DocumentCounts,
    rows: Int64Array,
    document: dict[str, FloatArray],
    document_q: FloatArray,
    settings: dict[str, Any],
) -> Columns:
    """The answer's columns for some of the pairs (``pairs`` among all, ``rows`` among the candidates)."""
    store, layer = questions[0].store, questions[0].layer
    cells: Cells = tuple(column[pairs] for column in found.cells)  # type: ignore[assignment]
    first, second, joint, other_joint = cells
    compared = strength(questions, tables_of(questions, cells))
    if settings["sort"] == "association":
        interval = compared.pmi_interval
        differs = (interval.low > 0) | (interval.high < 0)
        remarks = say_of_association(np.exp(found.odds_log_q[pairs]), differs, (joint, other_joint))
    else:
        largest = (counts.largest_on(True)[rows], counts.largest_on(False)[rows])
        more_in_this = found.log_ratio[pairs] >= 0
        remarks = say(np.exp(found.log_q[pairs]), document_q, (joint, other_joint), largest, more_in_this)
    columns: dict[str, Any] = {
        "first": vocabulary.term_texts(store, layer, first),
        "second": vocabulary.term_texts(store, layer, second),
        "log_ratio": found.log_ratio[pairs],
        "formula_low": found.interval.low[pairs],
        "formula_high": found.interval.high[pairs],
        "joint_this": joint,
        "joint_that": other_joint,
        "documents_this": counts.documents_on(True)[rows],
        "documents_that": counts.documents_on(False)[rows],
        "g2": found.g2[pairs],
        "q": np.exp(found.log_q[pairs]),
        **document,
        "pmi_this": compared.pmi[0],
        "pmi_that": compared.pmi[1],
        "pmi_difference": compared.pmi_difference,
        "pmi_low": compared.pmi_interval.low,
        "pmi_high": compared.pmi_interval.high,
        "log_odds_difference": found.odds.difference[pairs],
        "log_odds_q": np.exp(found.odds_log_q[pairs]),
        "says": remarks,
    }
    return Columns(columns, settings)
