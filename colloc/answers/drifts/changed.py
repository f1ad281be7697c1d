"""The words, or the pairs, that changed most over the periods."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any, Literal, get_args

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.contrasts.gathering import DocumentCounts, pair_counts_by_group, word_counts_by_document
from colloc.answers.contrasts.grouped import pairs_in_groups
from colloc.answers.contrasts.pairs import require_cells
from colloc.answers.contrasts.saying import NO_FINDING, SURE, UNEVEN, both_directions
from colloc.answers.drifts.course import period_slices, period_tables, rate_slope, rates_of, single_documents
from colloc.answers.drifts.periods import Periods, make_periods
from colloc.answers.questions import PairOptions, Question, ask, built_spec
from colloc.counts.words import slice_word_counts
from colloc.errors import NotSeenError, UsageError
from colloc.measures.discoveries import log_q_values
from colloc.measures.intervals import Interval, jackknife
from colloc.measures.odds import log_odds, log_odds_se
from colloc.measures.subcorpora.information import presence_information
from colloc.measures.subcorpora.periods import PeriodRates
from colloc.measures.subcorpora.trends import TrendTest, trend_test
from colloc.measures.trend import weighted_slope
from colloc.records import FloatArray, Int64Array, UInt32Array
from colloc.settings import DEFAULT_MEMORY
from colloc.store import slices, vocabulary
from colloc.store.connection import Store

DriftOrder = Literal["documents", "slope", "association"]
CANDIDATES = 20_000
"""So many pairs take part, the most frequent."""
JUDGED = 500
"""So many of either direction have the slope of their association jackknifed."""
PARTS = 10
"""Groups of documents of that jackknife."""
BARS = "▁▂▃▄▅▆▇█"


def drift_words(
    store: Store,
    *,
    by: str,
    bins: int | None = None,
    edges: Sequence[float] = (),
    width: float | None = None,
    where: Sequence[str] = (),
    layer: str | None = None,
    min_count: int = 20,
    min_docs: int = 1,
    sort: DriftOrder = "documents",
    limit: int = 50,
    memory: int = DEFAULT_MEMORY,
) -> Columns:
    """Words that became more, or less, frequent; rising ones first.

    Parameters
    ----------
    min_count : int
        Least count in all periods together; all such words are tested.
    sort : {"documents", "slope"}
        By the trend over documents, or by the end of the slope's interval that is nearer to 0.

    Returns
    -------
    Columns
        word, shape (a bar for each period's rate), count, documents, first_rate, last_rate (per million, in the first
        and the last period), slope, slope_low, slope_high (bits, that is doublings, for one unit of the key; 95 %,
        documents as the independent observations), g2, q (the rates are the same in all periods, every occurrence
        independent), document_z, document_q (trend over documents), says.
    """
    _check_order(sort, ("documents", "slope"))
    where_text = slices.canonical(where)
    periods = make_periods(store, by, where=where_text, bins=bins, edges=edges, width=width)
    layer = layer or built_spec(store).layer
    sides = period_slices(by, periods, where_text)
    frequencies = [slice_word_counts(store, layer, side) for side in sides]
    terms = np.flatnonzero(np.sum([one.tokens for one in frequencies], axis=0) >= max(min_count, 1))
    if not len(terms):
        raise NotSeenError(f"{store.path}: no word occurs {min_count} times in these documents; lower --min-count")
    held = np.sum([one.documents for one in frequencies], axis=0)[terms]
    lots = word_counts_by_document(store, layer, sides, terms, held, memory)
    found = _Trends(periods, lots, len(terms))
    rows = found.ranked(sort, min_docs, limit)
    settings = {
        "store": str(store.path),
        "layer": layer,
        "where": where_text,
        **_made(by, periods, bins, edges, width),
        "min_count": min_count,
        "min_docs": min_docs,
        "sort": sort,
        "limit": limit,
        "tested": len(terms),
    }
    return Columns({"word": vocabulary.term_texts(store, layer, terms[rows]), **found.columns(rows)}, settings)


def drift_pairs(
    store: Store,
    *,
    by: str,
    bins: int | None = None,
    edges: Sequence[float] = (),
    width: float | None = None,
    options: PairOptions | None = None,
    min_count: int = 20,
    min_docs: int = 1,
    sort: DriftOrder = "documents",
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """Pairs that became more, or less, frequent or (sort ``association``) more, or less, strongly associated.

    Parameters
    ----------
    min_count : int
        Least joint count in all documents together; the ``CANDIDATES`` most frequent of such pairs are tested.

    Returns
    -------
    Columns
        As ``drift_words``, with first, second for word. With ``association``: shape (of the log odds ratio), joint,
        documents, odds_slope, odds_low, odds_high (nats for one unit of the key; 95 %, jackknife over documents),
        odds_q (by Woolf's standard errors), first_odds, last_odds (log odds ratio in the first and the last period;
        0.5 more in each cell where one is 0), says.
    """
    _check_order(sort, get_args(DriftOrder))
    options = options or PairOptions()
    where_text = slices.canonical(options.where)
    periods = make_periods(store, by, where=where_text, bins=bins, edges=edges, width=width)
    question = ask(store, options, jobs=jobs, memory=memory, progress=progress)
    require_cells(question)
    first, second = _frequent(question, min_count)
    settings = question.settings(
        **_made(by, periods, bins, edges, width),
        min_count=min_count,
        min_docs=min_docs,
        sort=sort,
        limit=limit,
        tested=len(first),
    )
    if sort == "association":
        rows, columns = _association(question, periods, first, second, min_docs, limit)
    else:
        counts = pair_counts_by_group(question, first, second, periods.groups)
        found = _Trends(periods, iter([(slice(0, len(first)), counts)]), len(first))
        rows = found.ranked(sort, min_docs, limit)
        columns = found.columns(rows)
    words = {
        "first": vocabulary.term_texts(store, question.layer, first[rows]),
        "second": vocabulary.term_texts(store, question.layer, second[rows]),
    }
    return Columns({**words, **columns}, settings)


def bars(values: FloatArray) -> str:
    """A bar for each value, from the smallest to the largest; a blank where there is none.

    >>> bars(np.array([0.0, 1.0, np.nan, 7.0]))
    '▁▂ █'
    """
    finite = np.isfinite(values)
    if not finite.any():
        return " " * len(values)
    low, high = float(values[finite].min()), float(values[finite].max())
    step = (high - low) / (len(BARS) - 1) or 1.0
    return "".join(
        BARS[round((float(value) - low) / step)] if known else " " for value, known in zip(values, finite, strict=True)
    )


class _Trends:
    """Trends of many items, a lot at a time."""

    def __init__(self, periods: Periods, lots: Iterator[tuple[slice, DocumentCounts]], n: int) -> None:
        self._periods = periods
        rates: list[PeriodRates] = []
        tests: list[TrendTest] = []
        for _, counts in lots:
            rates.append(rates_of(counts, len(periods)))
            tests.append(trend_test(counts.rates, periods.times[counts.side]))
        self._count = np.concatenate([one.count for one in rates])
        self._held = np.concatenate([one.held for one in rates])
        self._rate = np.concatenate([one.rate for one in rates])
        self._z = np.concatenate([one.rank_z for one in tests])
        self._log_p = np.concatenate([one.log_p for one in tests])
        self._slope = rate_slope(
            np.concatenate([one.log2_rate for one in rates]),
            np.concatenate([one.log2_variance for one in rates]),
            periods,
        )
        told = presence_information(self._count, rates[0].tokens)
        self._g2, self._log_q = told.g2, log_q_values(told.log_p)
        self._document_log_q = log_q_values(self._log_p)

    def ranked(self, sort: str, min_docs: int, limit: int) -> Int64Array:
        """The rows shown, rising ones first."""
        alone = single_documents(self._periods)
        if sort == "slope" and alone:
            raise UsageError(
                f"{alone} of {len(self._periods)} periods hold a single document and let no slope be told: make "
                "periods wider, or sort by documents"
            )
        shown = np.flatnonzero(self._held.sum(axis=1) >= min_docs)
        slope = self._slope
        bound = np.where(slope.slope >= 0, slope.interval.low, -slope.interval.high)
        score = bound if sort == "slope" else -self._log_p
        rising = self._z >= 0 if sort == "documents" else slope.slope >= 0
        return shown[both_directions(score[shown], [np.abs(self._z[shown])], rising[shown], limit)]

    def columns(self, rows: Int64Array) -> dict[str, Any]:
        """What is told of some rows."""
        document_q, q = np.exp(self._document_log_q[rows]), np.exp(self._log_q[rows])
        return {
            "shape": [bars(rate) for rate in self._rate[rows]],
            "count": self._count[rows].sum(axis=1),
            "documents": self._held[rows].sum(axis=1),
            "first_rate": self._rate[rows, 0] * 1e6,
            "last_rate": self._rate[rows, -1] * 1e6,
            "slope": self._slope.slope[rows],
            "slope_low": self._slope.interval.low[rows],
            "slope_high": self._slope.interval.high[rows],
            "g2": self._g2[rows],
            "q": q,
            "document_z": self._z[rows],
            "document_q": document_q,
            "says": [
                _direction(z, over_documents, pooled)
                for z, over_documents, pooled in zip(self._z[rows], document_q, q, strict=True)
            ],
        }


def _direction(z: float, document_q: float, q: float) -> str:
    if document_q <= SURE:
        return f"{'rises' if z > 0 else 'falls'} over documents"
    return NO_FINDING if q > SURE else UNEVEN


def _frequent(question: Question, min_count: int) -> tuple[UInt32Array, UInt32Array]:
    """The most frequent pairs of the tally, ties by term number."""
    kept: list[tuple[UInt32Array, UInt32Array, Int64Array]] = []
    for table in question.reader.blocks():
        chosen = table.take(np.flatnonzero(table.joint >= max(min_count, 1)))
        kept.append((chosen.first, chosen.second, chosen.joint))
    first, second, joint = (np.concatenate(column) for column in zip(*kept, strict=True))
    if not len(first):
        raise NotSeenError(f"{question.store.path}: no pair occurs {min_count} times; lower --min-count")
    order = np.lexsort((second, first, -joint))[:CANDIDATES]
    return first[order].astype(np.uint32), second[order].astype(np.uint32)


def _association(
    question: Question, periods: Periods, first: UInt32Array, second: UInt32Array, min_docs: int, limit: int
) -> tuple[Int64Array, dict[str, Any]]:
    """Rows and columns of the pairs whose log odds ratio has the steepest sure slope."""
    found = pairs_in_groups(question, first, second, periods.groups)
    value, se = log_odds(*found.arguments), log_odds_se(*found.arguments)
    slope = weighted_slope(*_where_possible(found.arguments, value, se), periods.times)
    with np.errstate(divide="ignore", invalid="ignore"):
        z = slope.slope / slope.interval.se
        q = np.exp(log_q_values(np.log(slope.p)))
    held = found.documents.sum(axis=0)
    enough = np.flatnonzero((held >= min_docs) & np.isfinite(z))
    judged = enough[both_directions(np.abs(z[enough]), [], z[enough] >= 0, 2 * JUDGED)]
    interval = _jackknifed(question, periods, first[judged], second[judged], slope.slope[judged])
    with np.errstate(divide="ignore", invalid="ignore"):
        t = np.nan_to_num(np.abs(slope.slope[judged] / interval.se), nan=0.0)
    order = both_directions(np.minimum(np.abs(z[judged]), t), [np.abs(z[judged])], z[judged] >= 0, limit)
    rows = judged[order]
    low, high = interval.low[order], interval.high[order]
    columns = {
        "shape": [bars(one) for one in _where_possible(found.arguments, value, se)[0][rows]],
        "joint": found.joint.sum(axis=0)[rows],
        "documents": held[rows],
        "odds_slope": slope.slope[rows],
        "odds_low": low,
        "odds_high": high,
        "odds_q": q[rows],
        "first_odds": value[rows, 0],
        "last_odds": value[rows, -1],
        "says": [
            NO_FINDING if q[row] > SURE else _direction(z[row], 0.0 if below > 0 or above < 0 else 1.0, q[row])
            for row, below, above in zip(rows.tolist(), low, high, strict=True)
        ],
    }
    return rows, columns


def _where_possible(
    arguments: tuple[np.ndarray, ...], value: FloatArray, se: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Log odds ratios and their variances; nan in periods that lack a word: they say nothing of the pair."""
    both = (arguments[1] > 0) & (arguments[2] > 0)
    return np.where(both, value, np.nan), np.where(both, se**2, np.nan)


def _jackknifed(
    question: Question, periods: Periods, first: UInt32Array, second: UInt32Array, slope: FloatArray
) -> Interval:
    """The slope without each tenth of the documents of every period."""
    whole, pieces, _ = period_tables(question, first, second, periods, PARTS)
    replicates = []
    for part in range(PARTS):
        without = tuple(column - piece[..., part] for column, piece in zip(whole, pieces, strict=True))
        value, variance = _where_possible(without, log_odds(*without), log_odds_se(*without))
        replicates.append(weighted_slope(value, variance, periods.times).slope)
    return jackknife(slope, np.stack(replicates))


def _check_order(sort: str, known: Sequence[str]) -> None:
    if sort not in known:
        raise UsageError(f"drift is sorted by one of {', '.join(known)} here, not {sort!r}")


def _made(by: str, periods: Periods, bins: int | None, edges: Sequence[float], width: float | None) -> dict[str, Any]:
    return {"by": by, "periods": list(periods.groups.names), "bins": bins, "edges": list(edges), "width": width}
