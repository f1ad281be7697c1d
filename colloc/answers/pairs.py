"""The strongest pairs of a store, or those that avoid each other most."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from colloc.answers.avoidance import avoiding_pairs, check_avoidance, shown_avoidance
from colloc.answers.columns import Columns
from colloc.answers.questions import PairOptions, Question, ask, measure_names, resolve_spec
from colloc.answers.ranking import TopRows
from colloc.answers.stopping import StopWords
from colloc.answers.sureness.judging import Judge
from colloc.answers.sureness.wishes import Wishes, divided, settled
from colloc.answers.tables import PairTable
from colloc.answers.wordclasses import TwoWords
from colloc.errors import UsageError
from colloc.measures.catalogue import MEASURES
from colloc.measures.contingency import expected
from colloc.records import FloatArray, Int64Array
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT, DEFAULT_MIN_EXPECTED
from colloc.store import vocabulary
from colloc.store.connection import Store

FIRST_REACH = 4
"""How many times the rows wanted are looked up in the text at first, where documents decide which rows are shown."""


def pairs(
    store: Store,
    *,
    measure: str | None = None,
    show: Sequence[str] | None = None,
    options: PairOptions | None = None,
    min_count: int | None = None,
    min_word_count: int = 1,
    wishes: Wishes | None = None,
    any_strength: bool = False,
    avoid: bool = False,
    min_expected: float = DEFAULT_MIN_EXPECTED,
    upos: str | None = None,
    stop: Sequence[str] = (),
    no_self: bool = False,
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """The pairs that rank highest by one measure; with ``avoid`` those that meet much less than chance.

    Parameters
    ----------
    measure : str
        Ranks; a name of the catalogue or ``joint``. NPMI when not given; for avoidance signed G2, lowest first.
    show : sequence of str
        Measures, and columns of sureness, shown besides.
    min_count, min_word_count : int
        Least joint count and frequency of each word. They act on what is shown, never on the margins.
        ``min_count`` is 5 when not given, and 0 for avoidance.
    wishes : Wishes
        Columns of sureness, and what rows must reach in them; ``min_docs`` is `settled` when not given.
    any_strength : bool
        Also pairs that meet as often as expected or less; otherwise only those that meet more often.
    avoid : bool
        Only pairs, met or not, that meet less often than expected, with a q-value of at most 0.05 (or ``max_q``).
    min_expected : float
        Avoidance is claimed for pairs with at least this expected count.
    upos : str
        A pattern of word classes (`colloc.answers.tagpatterns`) that the two words follow: directed, next to each
        other unless a window is given, and in the layer ``lemma/upos`` unless another is given that tells word
        classes. It acts on what is shown, never on the margins.
    stop : sequence of str
        Pairs with these words are not shown: `colloc.answers.stopping.StopWords`.
    no_self : bool
        Pairs of a word with itself are not shown.
    limit : int
        Rows; 0 for all.

    Returns
    -------
    Columns
        first, second, joint, first_total, second_total, total, expected, the measures asked for and the columns of
        sureness (`colloc.answers.sureness.wishes`); for avoidance those of `colloc.answers.avoidance`. Ties stand
        by joint count, then by word.
    """
    options = options or PairOptions()
    if upos is not None:
        options = following(options)
    _, margins = resolve_spec(store, options)
    show, wishes = divided(show, wishes)
    ranking, names = measure_names(measure or ("g2" if avoid else None), show, margins)
    question = ask(store, options, names, jobs=jobs, memory=memory, progress=progress)
    least = (0 if avoid else DEFAULT_MIN_COUNT) if min_count is None else min_count
    by_default = wishes.min_docs is None
    usual = bool(limit) and not avoid and least >= DEFAULT_MIN_COUNT
    wishes = settled(wishes, store, question.spec.where, usual)
    pattern = TwoWords(store, question.layer, upos) if upos is not None else None
    stopped = StopWords(question, stop) if stop else None
    if avoid:
        check_avoidance(question, wishes, min_expected, any_strength)
        found = avoiding_pairs(question, min_expected, min_word_count, wishes.max_q)
        family, tables = found.family, [found.table.take(found.table.joint >= least)]
    else:
        family, tables = None, []
    judge = Judge(question, wishes, ranking, min_word_count, family=family, jobs=jobs, memory=memory, progress=progress)
    reach = FIRST_REACH * limit if wishes.late else limit
    while True:
        top = TopRows(reach, lambda: text_ranks(question))
        for table in tables or question.reader.blocks():
            chosen = table if avoid else table.take(filtered(question, table, least, min_word_count, any_strength))
            chosen = chosen if pattern is None else chosen.take(pattern.mask(chosen))
            chosen = chosen if stopped is None else chosen.take(stopped.shown(chosen))
            chosen = chosen.take(chosen.first != chosen.second) if no_self else chosen
            chosen = chosen.take(judge.passing(chosen)) if len(chosen) else chosen
            if len(chosen):
                top.add(chosen, score(ranking, chosen, avoid=avoid))
        table, _, first, second = top.best(lambda terms: vocabulary.term_texts(store, question.layer, terms))
        evidence = judge.evidence(table)
        if evidence is None or not wishes.late:
            break
        rows = np.flatnonzero(judge.late_passing(evidence))[: limit or None]
        if not limit or len(rows) == limit or len(table) < reach:
            table, evidence = table.take(rows), evidence.take(rows)
            first, second = [first[row] for row in rows], [second[row] for row in rows]
            break
        reach *= 8
    sureness = judge.shown(table, evidence)
    settings = question.settings(
        measure=ranking,
        min_count=least,
        min_word_count=min_word_count,
        any_strength=any_strength,
        **judge.settings(),
        **({"min_docs_by_default": True} if by_default and wishes.least_documents > 1 else {}),
        **({"avoid": True, "min_expected": min_expected} if avoid else {}),
        **({"upos": upos} if upos is not None else {}),
        **({"stop": list(stop)} if stop else {}),
        **({"no_self": True} if no_self else {}),
        limit=limit,
    )
    columns = as_columns(first, second, table, names, settings)
    if family is not None:
        columns = columns.adding(shown_avoidance(table, family))
    return columns.adding(sureness)


def following(options: PairOptions) -> PairOptions:
    """Options for words that follow each other in a pattern: what they leave open is filled in."""
    reaches = options.window is not None or options.left is not None or options.relation is not None
    if options.unit:
        raise UsageError("upos is a pattern of words that follow each other, which unit does not count: leave one out")
    return replace(
        options,
        layer=options.layer or "lemma/upos",
        window=options.window if reaches else 1,
        directed=True,
    )


def filtered(
    question: Question, table: PairTable, min_count: int, min_word_count: int, any_strength: bool
) -> np.ndarray:
    """Mask of the rows that pass the thresholds and, unless any strength will do, meet more often than expected."""
    keep = table.joint >= min_count
    if min_word_count > 1:
        tokens = question.words.tokens
        keep &= (tokens[table.first] >= min_word_count) & (tokens[table.second] >= min_word_count)
    if not any_strength:
        # Attraction: O > E without dividing, in float64 since products of margins overflow integers.
        product = table.first_total.astype(np.float64) * table.second_total
        keep &= table.joint * np.asarray(table.total, dtype=np.float64) > product
    mask: np.ndarray = keep
    return mask


def score(measure: str, table: PairTable, *, avoid: bool = False) -> FloatArray:
    """The ranking value of each row, highest first: p-values and errors are negated.

    With ``avoid`` the weakest association ranks highest; small p-values and errors remain the best.
    """
    turned = -1.0 if avoid else 1.0
    if measure == "joint":
        return turned * table.joint.astype(np.float64)
    chosen = MEASURES[measure]
    values = chosen.compute(*table.arguments)
    return -values if chosen.strongest == "lowest" else turned * values


def text_ranks(question: Question) -> Int64Array:
    """For every term its place among all terms sorted by text."""
    texts = vocabulary.term_texts(question.store, question.layer)
    ranks = np.empty(len(texts), dtype=np.int64)
    ranks[sorted(range(len(texts)), key=texts.__getitem__)] = np.arange(len(texts))
    return ranks


def as_columns(
    first: list[str],
    second: list[str],
    table: PairTable,
    names: Sequence[str],
    settings: dict[str, Any],
) -> Columns:
    """The columns every answer about pairs has, in their documented order."""
    columns: dict[str, Any] = {
        "first": first,
        "second": second,
        "joint": table.joint,
        "first_total": table.first_total,
        "second_total": table.second_total,
        "total": table.total,
        "expected": expected(*table.arguments),
    }
    for name in names:
        columns[name] = MEASURES[name].compute(*table.arguments)
    return Columns(columns, settings)
