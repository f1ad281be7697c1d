"""The course of one word or one pair over the periods, and its trend."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.contrasts.card import term_numbers_of
from colloc.answers.contrasts.gathering import DocumentCounts, pair_counts_by_group, word_counts_by_document
from colloc.answers.contrasts.grouped import Groups, pairs_in_groups
from colloc.answers.contrasts.pairs import require_cells
from colloc.answers.drifts.periods import Periods, make_periods
from colloc.answers.questions import PairOptions, Question, ask, built_spec
from colloc.counts.grouping import GROUPS, deal
from colloc.counts.words import slice_word_counts
from colloc.errors import NotSeenError
from colloc.measures.intervals import Interval, jackknife
from colloc.measures.pmi import pmi
from colloc.measures.strata import breslow_day
from colloc.measures.subcorpora.periods import PeriodRates, period_rates
from colloc.measures.subcorpora.trends import trend_test
from colloc.measures.trend import Slope, mann_kendall, weighted_slope
from colloc.records import FloatArray, UInt32Array
from colloc.settings import DEFAULT_MEMORY
from colloc.store import slices
from colloc.store.connection import Store

SURE = 0.05


def drift(
    store: Store,
    first: str,
    second: str | None = None,
    *,
    by: str,
    bins: int | None = None,
    edges: Sequence[float] = (),
    width: float | None = None,
    options: PairOptions | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """How a word, or a pair and its association, fares over the periods.

    Parameters
    ----------
    by : str
        A metadata key with numbers.
    bins, edges, width
        How periods are made: so many, beginning at these values, or of this length; chosen when none is given.

    Returns
    -------
    Columns
        period, time (mean of its tokens), documents, tokens, count (``joint`` for a pair), held (documents with it),
        per_million (tokens), low, high (95 %, documents as the independent observations); for a pair also
        expected, pmi, pmi_low, pmi_high (bits, 95 %, jackknife over documents). In the settings the trend:
        tau and tau_p (Mann-Kendall over the periods), slope, slope_low, slope_high (bits, that is doublings, of the
        rate for one unit of the key; nan where a period holds a single document), document_z and document_p (trend
        over documents); for a pair also pmi_tau, pmi_tau_p, pmi_slope and its bounds, pmi_left_out (periods without
        a PMI and its interval, through which that slope does not go), and same_p (Breslow-Day: one odds ratio in all
        periods); and says.

    Raises
    ------
    NotSeenError
        A word never occurs, or the pair never in these documents.
    UsageError
        There are fewer than three periods.
    """
    options = options or PairOptions()
    where = slices.canonical(options.where)
    periods = make_periods(store, by, where=where, bins=bins, edges=edges, width=width)
    made = {"by": by, "bins": bins, "edges": list(edges), "width": width}
    if second is None:
        layer = options.layer or built_spec(store).layer
        counts = _word_counts(store, layer, first, by, where, periods, memory)
        settings = {"store": str(store.path), "layer": layer, "where": where, "first": first, **made}
        return _answer("count", periods, counts, {}, settings)
    question = ask(store, options, jobs=jobs, memory=memory, progress=progress)
    require_cells(question)
    one, other = term_numbers_of(store, question.layer, (first, second))
    counts = pair_counts_by_group(question, one, other, periods.groups)
    if not len(counts.items):
        raise NotSeenError(f"{store.path}: {first!r} and {second!r} never meet in documents with a number as {by!r}")
    columns, association = _association(question, one, other, periods)
    settings = question.settings(first=first, second=second, **made, **association)
    return _answer("joint", periods, counts, columns, settings)


def period_slices(by: str, periods: Periods, where: str) -> list[str]:
    """Each period as a slice."""
    names = [name if ".." in name else f"{name}..{name}" for name in periods.groups.names]
    return [slices.canonical([f"{slices.quoted(by)}={name}", *([where] if where else [])]) for name in names]


def _word_counts(
    store: Store, layer: str, word: str, by: str, where: str, periods: Periods, memory: int
) -> DocumentCounts:
    term = np.array([int(number[0]) for number in term_numbers_of(store, layer, (word,))], np.int64)
    held = slice_word_counts(store, layer, where).documents[term]
    sides = period_slices(by, periods, where)
    counts = next(word_counts_by_document(store, layer, sides, term, held, memory))[1]
    if not len(counts.items):
        raise NotSeenError(f"{store.path}: {word!r} never occurs in documents with a number as {by!r}")
    return counts


def _answer(
    name: str, periods: Periods, counts: DocumentCounts, more: dict[str, Any], settings: dict[str, Any]
) -> Columns:
    rates = rates_of(counts, len(periods))
    columns: dict[str, Any] = {
        "period": list(periods.groups.names),
        "time": periods.times,
        "documents": rates.documents,
        "tokens": rates.tokens,
        name: rates.count[0],
        "held": rates.held[0],
        "per_million": rates.rate[0] * 1e6,
        "low": rates.low[0] * 1e6,
        "high": rates.high[0] * 1e6,
        **more,
    }
    return Columns(columns, {**settings, **_trend(periods, counts, rates, settings)})


def rates_of(counts: DocumentCounts, n_periods: int) -> PeriodRates:
    """Rates by period, the sides of ``counts`` being the periods."""
    return period_rates(
        counts.items, counts.documents, counts.counts, counts.sizes, counts.side, counts.n_items, n_periods
    )


def _trend(periods: Periods, counts: DocumentCounts, rates: PeriodRates, settings: dict[str, Any]) -> dict[str, Any]:
    """The trend of the rate as plain numbers, and all trends in words."""
    monotone = mann_kendall(rates.rate[0])
    slope = rate_slope(rates.log2_rate[0], rates.log2_variance[0], periods)
    documents = trend_test(counts.rates, periods.times[counts.side])
    p = float(np.exp(documents.log_p[0]))
    z = float(documents.rank_z[0])
    low, high = float(slope.interval.low), float(slope.interval.high)
    alone = single_documents(periods)
    if alone:
        said = f"{alone} of {len(periods)} periods hold a single document: no slope and no verdict, make periods wider"
    else:
        said = _verdict("frequency", low, high, z if p <= SURE else 0.0)
        if "pmi_slope" in settings:
            bounds = settings["pmi_slope_low"], settings["pmi_slope_high"]
            steep = settings["pmi_slope"] if bounds[0] > 0 or bounds[1] < 0 else 0.0
            said += "; " + _verdict("association", *bounds, steep)
            if settings["pmi_left_out"]:
                said += f" ({settings['pmi_left_out']} of {len(periods)} periods have no PMI with an interval to go by)"
    return {
        "tau": float(monotone.tau),
        "tau_p": float(monotone.p),
        "slope": float(slope.slope),
        "slope_low": low,
        "slope_high": high,
        "document_z": z,
        "document_p": p,
        "says": said,
    }


def single_documents(periods: Periods) -> int:
    """How many periods hold one document only, from which no difference between documents can be told."""
    return int(np.count_nonzero(periods.groups.sizes < 2))


def rate_slope(log2_rate: FloatArray, log2_variance: FloatArray, periods: Periods) -> Slope:
    """The slope of rates (shape (..., n_periods)) over the periods.

    nan where a period holds a single document: it has no variance over documents, and a line through the other
    periods would not be the one of all.
    """
    if single_documents(periods):
        nothing = np.full(log2_rate.shape[:-1], np.nan)
        return Slope(nothing, Interval(nothing, nothing, nothing), nothing)
    return weighted_slope(log2_rate, log2_variance, periods.times)


def _verdict(what: str, low: float, high: float, direction: float) -> str:
    """A trend is one where the slope's interval leaves out 0 on the side of ``direction`` (0: not sure of one)."""
    if direction > 0 and low > 0:
        return f"{what}: rises, over documents too"
    if direction < 0 and high < 0:
        return f"{what}: falls, over documents too"
    if direction or low > 0 or high < 0:
        return f"{what}: no sure trend, the interval of the slope and the test over documents do not agree"
    return f"{what}: no trend beyond the differences between documents"


def _association(
    question: Question, one: UInt32Array, other: UInt32Array, periods: Periods
) -> tuple[dict[str, Any], dict[str, Any]]:
    """Columns of association by period, and its trend."""
    whole, parts, used = period_tables(question, one, other, periods)
    table = tuple(column[0] for column in whole)
    value = pmi(*table)
    low, high, se = (np.full(len(periods), np.nan) for _ in range(3))
    for row in range(len(periods)):
        if used[row] > 1:
            without = tuple(table[place][row] - parts[place][0, row, : used[row]] for place in range(4))
            interval = jackknife(value[row], pmi(*without))
            low[row], high[row], se[row] = interval.low, interval.high, interval.se
    monotone = mann_kendall(np.where(np.isnan(value), -np.inf, value))
    slope = rate_slope(value, se**2, periods)
    columns = {
        "expected": table[1] * table[2] / np.maximum(table[3], 1),
        "pmi": value,
        "pmi_low": low,
        "pmi_high": high,
    }
    trend = {
        "pmi_tau": float(monotone.tau),
        "pmi_tau_p": float(monotone.p),
        "pmi_slope": float(slope.slope),
        "pmi_slope_low": float(slope.interval.low),
        "pmi_slope_high": float(slope.interval.high),
        "pmi_left_out": int(np.count_nonzero(~(np.isfinite(value) & np.isfinite(se) & (se > 0)))),
        "same_p": float(breslow_day(*table).p),
    }
    return columns, trend


Cells = tuple[FloatArray, ...]
"""joint, first_total, second_total, total."""


def period_tables(
    question: Question, first: UInt32Array, second: UInt32Array, periods: Periods, parts: int = GROUPS
) -> tuple[Cells, Cells, list[int]]:
    """Tables of pairs by period, and by parts of each period into which its documents are dealt.

    Returns
    -------
    whole : four float64 arrays, shape (n, n_periods)
    parts : four float64 arrays, shape (n, n_periods, parts)
    used : list of int
        How many parts of each period have documents.
    """
    groups = periods.groups
    group = np.empty(len(groups.numbers), np.int64)
    used = []
    for place in range(len(groups)):
        members = np.flatnonzero(groups.group == place)
        dealt = deal(len(members), parts)
        group[members] = place * parts + dealt
        used.append(int(dealt.max(initial=-1)) + 1)
    names = tuple(f"{name}/{part}" for name in groups.names for part in range(parts))
    found = pairs_in_groups(question, first, second, Groups(names, groups.numbers, group))
    shape = (len(first), len(groups), parts)
    pieces = tuple(column.reshape(shape) for column in found.arguments)
    return tuple(piece.sum(axis=2) for piece in pieces), pieces, used
