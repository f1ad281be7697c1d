"""The company of two words set side by side: what goes with one and not with the other."""

from __future__ import annotations

from typing import Any, Literal, get_args

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.contrasts.card import term_numbers_of
from colloc.answers.contrasts.pairs import require_cells
from colloc.answers.contrasts.saying import both_directions
from colloc.answers.questions import PairOptions, Question, ask
from colloc.answers.sureness.documents import document_evidence
from colloc.answers.tables import Side
from colloc.errors import NotSeenError, UsageError
from colloc.measures.contrast import as_table, keyness_g2, t_of_difference
from colloc.measures.discoveries import log_q_values
from colloc.measures.exact import association_log_p
from colloc.measures.intervals import log_odds_interval
from colloc.measures.odds import log_odds
from colloc.records import Int64Array
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT
from colloc.store import vocabulary
from colloc.store.connection import Store

CompanyOrder = Literal["bound", "t", "log_odds", "g2"]


def contrast_company(
    store: Store,
    this: str,
    that: str,
    *,
    side: Side = "both",
    options: PairOptions | None = None,
    min_count: int = DEFAULT_MIN_COUNT,
    min_docs: int = 1,
    sort: CompanyOrder = "bound",
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """Words that keep company with one of two words rather than with the other.

    Each of the two words has a company: the words that stand in reach of it. A word's share of the one company is
    compared with its share of the other.

    Parameters
    ----------
    side : {"both", "left", "right"}
        Which side of the two words the company stands on.
    min_count : int
        Least count in both companies together; all such words are tested.
    min_docs : int
        Least number of documents that hold the word in either company; acts on what is shown.
    sort : {"bound", "t", "log_odds", "g2"}
        By the end of the interval of the log odds difference that is nearer to 0; by t; ...

    Returns
    -------
    Columns
        word, log_odds_difference, formula_low, formula_high (nats, 95 %, by formula), joint_this, joint_that,
        documents_this, documents_that, t (Church et al. 1991: for counts as they are, so it favours the more frequent
        of the two words), g2, q. Words that prefer this come first.

    Raises
    ------
    NotSeenError
        Either word never occurs, or no word stands in both companies often enough.
    UsageError
        The two words are the same in this layer, or the options fit no such question.
    """
    if sort not in get_args(CompanyOrder):
        raise UsageError(f"two words' company is sorted by one of {', '.join(get_args(CompanyOrder))}, not {sort!r}")
    question = ask(store, options or PairOptions(), jobs=jobs, memory=memory, progress=progress)
    require_cells(question)
    if side != "both" and (question.reader.ordered or question.spec.kind == "unit"):
        raise UsageError("side divides a symmetric window: leave it out with directed, left/right, positions or unit")
    one, other = (int(term[0]) for term in term_numbers_of(store, question.layer, (this, that)))
    if one == other:
        raise UsageError(f"{this!r} and {that!r} are the same word in layer {question.layer!r}")
    words, joint, sizes = _companies(question, one, other, side)
    keep = joint[0] + joint[1] >= max(min_count, 1)
    words, joint = words[keep], joint[:, keep]
    if not len(words):
        raise NotSeenError(
            f"{store.path}: no word stands {min_count} times by {this!r} and {that!r}; lower --min-count"
        )
    arguments = (joint[0], sizes[0], joint[1], sizes[1])
    table = as_table(*arguments)
    gap, interval = log_odds(*table), log_odds_interval(*table)
    t, g2 = t_of_difference(joint[0], joint[1]), keyness_g2(*arguments)
    log_q = log_q_values(association_log_p(*table))
    scores = {
        "bound": np.where(gap >= 0, interval.low, -interval.high),
        "t": np.abs(t),
        "log_odds": np.abs(gap),
        "g2": np.abs(g2),
    }
    held = _documents(question, (one, other), words, side)
    shown = np.flatnonzero(held[0] + held[1] >= min_docs)
    toward = t >= 0 if sort == "t" else gap >= 0
    rows = shown[both_directions(scores[sort][shown], [np.abs(g2[shown])], toward[shown], limit)]
    settings = question.settings(
        words=[this, that],
        side=side,
        min_count=min_count,
        min_docs=min_docs,
        sort=sort,
        limit=limit,
        tested=len(words),
        company_this=int(sizes[0]),
        company_that=int(sizes[1]),
    )
    return Columns(
        {
            "word": vocabulary.term_texts(store, question.layer, words[rows]),
            "log_odds_difference": gap[rows],
            "formula_low": interval.low[rows],
            "formula_high": interval.high[rows],
            "joint_this": joint[0][rows],
            "joint_that": joint[1][rows],
            "documents_this": held[0][rows],
            "documents_that": held[1][rows],
            "t": t[rows],
            "g2": g2[rows],
            "q": np.exp(log_q[rows]),
        },
        settings,
    )


def _companies(question: Question, one: int, other: int, side: Side) -> tuple[Int64Array, Int64Array, Int64Array]:
    """Words of either company, their counts beside each of the two, and the sizes of the companies."""
    tables = [question.reader.around(term, side) for term in (one, other)]
    words = np.union1d(*(table.second for table in tables)).astype(np.int64)
    joint = np.zeros((2, len(words)), np.int64)
    for row, table in enumerate(tables):
        joint[row, np.searchsorted(words, table.second)] = table.joint
    return words, joint, joint.sum(axis=1)


def _documents(question: Question, terms: tuple[int, int], words: Int64Array, side: Side) -> list[Int64Array]:
    """How many documents hold each word on that side of either term."""
    others = words.astype(np.uint32)
    counts = []
    for term in terms:
        itself = np.full(len(words), term, np.uint32)
        table = question.reader.counted(itself, others, np.ones(len(words), np.int64), side)
        counts.append(document_evidence(question, table, side, intervals=False).documents)
    return counts
