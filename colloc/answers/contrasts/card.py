"""One pair on two sides: everything known of it, side by side."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.contrasts.aligning import Cells
from colloc.answers.contrasts.gathering import DocumentCounts, pair_counts_by_document
from colloc.answers.contrasts.pairs import ask_both, strength, tables_of
from colloc.answers.contrasts.saying import say
from colloc.answers.contrasts.sides import resolve_sides
from colloc.answers.evidence.card import observations
from colloc.answers.questions import PairOptions, Question
from colloc.answers.spelling import not_seen
from colloc.answers.tables import PairTable
from colloc.errors import NotSeenError
from colloc.measures.catalogue import MEASURES
from colloc.measures.contingency import expected
from colloc.measures.contrast import as_table, difference, keyness_g2, keyness_g2_two_cells, log_ratio_interval
from colloc.measures.exact import association_log_p
from colloc.measures.intervals import normal_quantile
from colloc.measures.odds import log_odds, log_odds_se
from colloc.measures.subcorpora.documents import document_test
from colloc.records import FloatArray, UInt32Array
from colloc.settings import DEFAULT_MEMORY
from colloc.store import vocabulary
from colloc.store.connection import Store


@dataclass(frozen=True, slots=True)
class _Line:
    """One line of the card; what does not apply is nan."""

    item: str
    this: float
    that: float
    difference: float = np.nan
    low: float = np.nan
    high: float = np.nan
    p: float = np.nan


def contrast_pair(
    store: Store,
    first: str,
    second: str,
    *,
    this: Sequence[str],
    that: Sequence[str] = (),
    options: PairOptions | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """The evidence for one pair on two sides.

    Returns
    -------
    Columns
        item, this, that, difference, low, high (95 %), p: a row for each quantity. The difference is log2 of the
        ratio for rates (in bits), else this less that; ``settings["says"]`` has the verdict in plain words.

    Raises
    ------
    NotSeenError
        Either word does not occur in the store, or the pair on neither side.
    """
    options = options or PairOptions()
    sides = resolve_sides(store, this, that, options.where)
    questions = ask_both(store, sides, options, jobs=jobs, memory=memory, progress=progress)
    terms = term_numbers_of(store, questions[0].layer, (first, second))
    tables = tuple(question.reader.given(*terms) for question in questions)
    joint = tuple(table.joint.astype(np.int64) for table in tables)
    if not joint[0][0] + joint[1][0]:
        raise NotSeenError(f"{store.path}: {first!r} and {second!r} never meet in either slice")
    cells: Cells = (terms[0], terms[1], joint[0], joint[1])
    counts = pair_counts_by_document(questions, *terms)
    totals = tuple(question.reader.tally.total for question in questions)
    arguments = (joint[0], totals[0], joint[1], totals[1])
    log_p = association_log_p(*as_table(*arguments))
    over_documents = document_test(counts.rates, counts.in_this)
    lines = [
        *_counts(questions, (tables[0], tables[1]), terms),
        _Line("documents with the pair", *(float(counts.documents_on(side)[0]) for side in (True, False))),
        _Line("most in one document", *(float(counts.largest_on(side)[0]) for side in (True, False))),
        *_rates(arguments, float(np.exp(log_p[0])), questions),
        _over_documents(counts.in_this, over_documents.log_p, over_documents.difference, counts),
        *_strengths(questions, cells),
    ]
    verdict = say(
        np.exp(log_p),
        np.exp(over_documents.log_p),
        (joint[0], joint[1]),
        (counts.largest_on(True), counts.largest_on(False)),
        over_documents.difference >= 0,
    )[0]
    settings = {
        **questions[0].settings(),
        "where": "",
        "first": first,
        "second": second,
        "this": sides.this,
        "that": sides.that,
        "says": verdict,
    }
    names = ("this", "that", "difference", "low", "high", "p")
    return Columns(
        {
            "item": [line.item for line in lines],
            **{name: np.array([getattr(line, name) for line in lines], np.float64) for name in names},
        },
        settings,
    )


def term_numbers_of(store: Store, layer: str, words: Sequence[str]) -> list[UInt32Array]:
    """Each word as an array of its one term number.

    Raises
    ------
    NotSeenError
        A word never occurs.
    """
    numbers = vocabulary.term_numbers(store, layer, list(words))
    for word, number in zip(words, numbers, strict=True):
        if number < 0:
            raise NotSeenError(not_seen(store, layer, word))
    return [np.array([number], np.uint32) for number in numbers]


def _counts(
    questions: tuple[Question, Question], tables: tuple[PairTable, PairTable], terms: list[np.ndarray]
) -> list[_Line]:
    words = [question.words.tokens for question in questions]

    def line(item: str, values: Sequence[Any]) -> _Line:
        return _Line(item, float(values[0]), float(values[1]))

    return [
        line("tokens", [tokens.sum() for tokens in words]),
        line("first word", [tokens[terms[0][0]] for tokens in words]),
        line("second word", [tokens[terms[1][0]] for tokens in words]),
        line("joint", [table.joint[0] for table in tables]),
        line("expected if independent", [expected(*table.arguments)[0] for table in tables]),
    ]


def _rates(arguments: tuple[Any, ...], p: float, questions: tuple[Question, Question]) -> list[_Line]:
    log_ratio, interval = log_ratio_interval(*arguments)
    rates = (float(arguments[0][0] * 1e6 / arguments[1]), float(arguments[2][0] * 1e6 / arguments[3]))
    spec = questions[0].spec
    counted = observations(spec.kind, spec.inside)
    words = [float(question.words.tokens.sum()) for question in questions]
    # Where words are what is counted, both rates are one.
    beside = [_Line("per million words", *(float(j[0]) * 1e6 / n for j, n in zip(arguments[::2], words, strict=True)))]
    return [
        *(beside if counted != "words" else []),
        _Line(
            f"per million {counted}; log ratio",
            *rates,
            float(log_ratio[0]),
            float(interval.low[0]),
            float(interval.high[0]),
            p,
        ),
        _Line("G2 of the rates, four cells", np.nan, np.nan, float(keyness_g2(*arguments)[0])),
        _Line("G2 of the rates, two cells", np.nan, np.nan, float(keyness_g2_two_cells(*arguments)[0])),
    ]


def _over_documents(in_this: np.ndarray, log_p: FloatArray, gap: FloatArray, counts: DocumentCounts) -> _Line:
    rates = counts.rates
    chosen = in_this[rates.documents]
    n_this = int(np.count_nonzero(in_this))
    this = float(rates.rates[chosen].sum() * 1e6 / max(n_this, 1))
    that = float(rates.rates[~chosen].sum() * 1e6 / max(len(in_this) - n_this, 1))
    return _Line("mean per million words of a document", this, that, float(gap[0] * 1e6), p=float(np.exp(log_p[0])))


def _strengths(questions: tuple[Question, Question], cells: Cells) -> list[_Line]:
    tables = tables_of(questions, cells)
    compared = strength(questions, tables)
    bounds = (float(compared.pmi_interval.low[0]), float(compared.pmi_interval.high[0]))
    lines = [
        _Line(
            "PMI (bits); jackknife interval",
            float(compared.pmi[0][0]),
            float(compared.pmi[1][0]),
            float(compared.pmi_difference[0]),
            *bounds,
        )
    ]
    odds = [(log_odds(*table.arguments), log_odds_se(*table.arguments)) for table in tables]
    gap = difference(*odds[0], *odds[1])
    reach = normal_quantile(0.95) * float(gap.se[0])
    middle = float(gap.difference[0])
    lines.append(
        _Line(
            "log odds ratio (nats); Woolf interval",
            float(odds[0][0][0]),
            float(odds[1][0][0]),
            middle,
            middle - reach,
            middle + reach,
            float(np.exp(gap.log_p[0])),
        )
    )
    for name in ("npmi", "p_second_given_first", "p_first_given_second", "g2"):
        measure = MEASURES[name]
        values = [float(measure.compute(*table.arguments)[0]) for table in tables]
        lines.append(_Line(measure.title, values[0], values[1]))
    return lines
