"""One pair over many slices: whether its association is the same in all, and whether it is there within them at all."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.contrasts.card import term_numbers_of
from colloc.answers.contrasts.grouped import groups_by_value, pairs_in_groups
from colloc.answers.contrasts.pairs import require_cells
from colloc.answers.questions import PairOptions, ask
from colloc.errors import NotSeenError
from colloc.measures.contingency import expected
from colloc.measures.intervals import Interval, log_odds_interval
from colloc.measures.odds import log_odds
from colloc.measures.pmi import pmi
from colloc.measures.strata import breslow_day, mantel_haenszel, mantel_haenszel_test, tells_nothing, woolf
from colloc.settings import DEFAULT_MEMORY
from colloc.store.connection import Store

SURE = 0.05
WEAKER = 0.5
"""A log odds ratio of less than this share of that of all documents is called weaker."""


@dataclass(frozen=True, slots=True)
class _Line:
    slice: str
    documents: float = np.nan
    joint: float = np.nan
    expected: float = np.nan
    pmi: float = np.nan
    log_odds: float = np.nan
    low: float = np.nan
    high: float = np.nan
    statistic: float = np.nan
    df: float = np.nan
    p: float = np.nan


def contrast_strata(
    store: Store,
    first: str,
    second: str,
    *,
    by: str,
    options: PairOptions | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """The association of a pair in the documents of each value of a metadata key, and over all values.

    Returns
    -------
    Columns
        slice, documents (that hold the pair), joint, expected, pmi (bits), log_odds (nats), low, high (95 %),
        statistic, df, p. After the values of the key come: all documents as one; pooled within the slices
        (Mantel-Haenszel with the test of no association, Woolf); and whether the slices agree (Breslow-Day, the same
        with Tarone's adjustment, Woolf). ``settings["says"]`` is the verdict in plain words. Slices where the pair
        never met and less than one meeting was expected have no log_odds and no part in Woolf's; the other tests take
        them as they are. ``settings["left_out_by_woolf"]`` counts them.

    Raises
    ------
    UsageError
        No document has the key, or all have one value.
    NotSeenError
        Either word does not occur, or they never meet in these documents.
    """
    options = options or PairOptions()
    groups = groups_by_value(store, by, options.where)
    question = ask(store, options, jobs=jobs, memory=memory, progress=progress)
    require_cells(question)
    one, other = term_numbers_of(store, question.layer, (first, second))
    found = pairs_in_groups(question, one, other, groups)
    table = tuple(column[0] for column in found.arguments)
    if not table[0].sum():
        raise NotSeenError(f"{store.path}: {first!r} and {second!r} never meet in documents with a {by!r}")
    whole = tuple(np.array([column.sum()]) for column in table)
    lines = _values(groups.names, found.documents[:, 0], table)
    lines.append(_line_of("all as one", float(found.documents.sum()), whole))
    tests, says = _tests(table, whole)
    names = [name for name in _Line.__dataclass_fields__ if name != "slice"]
    columns = {name: np.array([getattr(line, name) for line in [*lines, *tests]], np.float64) for name in names}
    silent = int(np.count_nonzero(tells_nothing(*table)))
    if silent:
        says += (
            f"; {silent} of {len(groups.names)} slices, without the pair and with less than one expected, have no odds"
        )
        says += " ratio and no part in Woolf's"
    settings = question.settings(first=first, second=second, by=by, left_out_by_woolf=silent, says=says)
    return Columns({"slice": [line.slice for line in [*lines, *tests]], **columns}, settings)


def _values(names: Sequence[str], documents: np.ndarray, table: tuple[np.ndarray, ...]) -> list[_Line]:
    return [
        _line_of(name, float(documents[row]), tuple(column[row : row + 1] for column in table))
        for row, name in enumerate(names)
    ]


def _line_of(name: str, documents: float, table: tuple[np.ndarray, ...]) -> _Line:
    interval = log_odds_interval(*table)
    possible = 0 < float(table[1][0]) < float(table[3][0]) and 0 < float(table[2][0]) < float(table[3][0])
    told = possible and not tells_nothing(*table)[0]
    value = (log_odds(*table)[0], interval.low[0], interval.high[0]) if told else (np.nan,) * 3
    strength = (float(expected(*table)[0]), float(pmi(*table)[0]))
    return _Line(name, documents, float(table[0][0]), *strength, *map(float, value))


def _tests(table: tuple[np.ndarray, ...], whole: tuple[np.ndarray, ...]) -> tuple[list[_Line], str]:
    pooled, no_association = mantel_haenszel(*table), mantel_haenszel_test(*table)
    weighted, woolf_same = woolf(*table)
    same, adjusted = breslow_day(*table, tarone=False), breslow_day(*table)

    def line(name: str, value: Any = None, interval: Interval | None = None, test: Any = None) -> _Line:
        bounds = (float(interval.low), float(interval.high)) if interval is not None else (np.nan, np.nan)
        tested = (float(test.statistic), float(test.df), float(test.p)) if test is not None else (np.nan,) * 3
        return _Line(
            name,
            log_odds=float(value) if value is not None else np.nan,
            low=bounds[0],
            high=bounds[1],
            statistic=tested[0],
            df=tested[1],
            p=tested[2],
        )

    lines = [
        line("within the slices (Mantel-Haenszel)", pooled.log_odds, pooled.interval, no_association),
        line("within the slices (Woolf)", weighted.log_odds, weighted.interval),
        line("same in all slices? (Breslow-Day)", test=same),
        line("same in all slices? (Breslow-Day, Tarone)", test=adjusted),
        line("same in all slices? (Woolf)", test=woolf_same),
    ]
    crude = log_odds_interval(*whole)
    says = verdict(
        float(log_odds(*whole)[0]),
        (float(crude.low[0]), float(crude.high[0])),
        float(pooled.log_odds),
        (float(pooled.interval.low), float(pooled.interval.high)),
        float(adjusted.p),
    )
    return lines, says


def verdict(
    crude: float, crude_bounds: tuple[float, float], pooled: float, pooled_bounds: tuple[float, float], same_p: float
) -> str:
    """What the whole and the slices say together.

    Parameters
    ----------
    crude, pooled : float
        Log odds ratio in all documents as one, and pooled within the slices, each with its interval.
    same_p : float
        p-value of the test that all slices have the same odds ratio.
    """
    associated = crude_bounds[0] > 0 or crude_bounds[1] < 0
    within = pooled_bounds[0] > 0 or pooled_bounds[1] < 0
    parts = []
    if associated and not within:
        parts.append("vanishes within the slices: the slices make the association, not the words")
    elif associated and within and crude * pooled < 0:
        parts.append("turns round within the slices: what all documents together show holds in none")
    elif associated and abs(pooled) < WEAKER * abs(crude):
        parts.append(f"weaker within the slices: {pooled:.2f} instead of {crude:.2f} nats")
    elif within:
        parts.append("holds within the slices")
    else:
        parts.append("no association beyond chance")
    if same_p <= SURE:
        parts.append("its strength differs between them")
    return "; ".join(parts)
