"""How sure a pair is: intervals, p-value, q-value."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.evidence.occurring import PairOccurrences
from colloc.answers.questions import Question
from colloc.answers.sureness.documents import SOUND_DOCUMENTS, SOUND_JOINT
from colloc.answers.sureness.hypotheses import all_pairs, family_size, two_sided
from colloc.answers.tables import PairTable
from colloc.counts.grouping import GROUPS, deal
from colloc.measures.contingency import expected
from colloc.measures.exact import EXACT_BELOW
from colloc.measures.intervals import Interval, jackknife, log_odds_interval, pmi_interval
from colloc.measures.odds import log_odds
from colloc.measures.pmi import pmi

EXACT_UP_TO = 500_000
"""Pairs of a table up to which all of them are tested to give the exact q-value; else it is bounded."""


def interval_rows(seen: PairOccurrences, table: PairTable) -> Columns:
    """95 % intervals of PMI and of the log odds ratio: asymptotic, and by leaving groups of documents out.

    A pair that never met has none over documents: whichever are left out, it still never met, and what would vary is
    the 0.5 that the log odds ratio adds.
    """
    values = {"pmi": pmi(*table.arguments)}
    asymptotic = {"pmi": pmi_interval(*table.arguments)}
    if seen.question.convention.margins != "tokens":
        values["log_odds"] = log_odds(*table.arguments)
        asymptotic["log_odds"] = log_odds_interval(*table.arguments)
    resampled, groups = _resampled(seen, values if table.joint[0] else {})
    documents = int(np.count_nonzero(seen.joint))
    sound = int(table.joint[0]) >= SOUND_JOINT and documents >= SOUND_DOCUMENTS and groups == GROUPS
    rows: list[tuple[str, str, float, Interval, bool]] = []
    for name, value in values.items():
        rows.append((name, "asymptotic", float(value[0]), asymptotic[name], False))
        if name in resampled:
            rows.append((name, "documents", float(value[0]), resampled[name], sound))
    return Columns(
        {
            "measure": [row[0] for row in rows],
            "method": [row[1] for row in rows],
            "value": np.array([row[2] for row in rows]),
            "low": np.array([row[3].low.reshape(-1)[0] for row in rows]),
            "high": np.array([row[3].high.reshape(-1)[0] for row in rows]),
            "trusted": np.array([row[4] for row in rows], np.bool_),
        }
    )


def _resampled(seen: PairOccurrences, values: dict[str, Any]) -> tuple[dict[str, Interval], int]:
    """Delete-a-group jackknife over documents; with fewer than two documents there is none."""
    groups = deal(len(seen.documents))
    n_groups = int(groups.max(initial=-1)) + 1
    if n_groups < 2:
        return {}, n_groups
    tables = [seen.table(groups != group).arguments for group in range(n_groups)]
    columns = [np.concatenate([table[place] for table in tables]) for place in range(4)]
    computed = {"pmi": pmi, "log_odds": log_odds}
    return {
        name: jackknife(value, computed[name](*columns).reshape(n_groups, 1)) for name, value in values.items()
    }, n_groups


def tests_of(question: Question, table: PairTable, progress: Any) -> dict[str, Any]:
    """Two-sided p-value (mid-p of Fisher's exact test where the expected count is below 5, else G2) and q-value."""
    if question.convention.margins == "tokens":
        return {}
    log_p = float(two_sided(table)[0])
    exact = question.reader.tally.n_pairs <= EXACT_UP_TO
    if exact:
        family = all_pairs(question, 1, progress)
        hypotheses = family.number
        q = float(family.q_of(np.array([log_p]))[0])
    else:
        hypotheses = family_size(question, 1)
        q = math.exp(min(log_p + math.log(hypotheses), 0.0))
    few = expected(*table.arguments)[0] < EXACT_BELOW
    return {
        "test": "mid-p of Fisher's exact test" if few else "G2",
        "p": math.exp(log_p),
        "log10_p": log_p / math.log(10),
        "q": q,
        "q_is": "exact" if exact else "at most",
        "hypotheses": hypotheses,
    }
