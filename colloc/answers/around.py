"""What stands around a word, or is missing there."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import partial
from typing import Any, Literal, get_args

import numpy as np

from colloc.answers.avoidance import avoided_by, check_avoidance, shown_avoidance
from colloc.answers.columns import Columns
from colloc.answers.pairs import FIRST_REACH, as_columns, filtered, score, text_ranks
from colloc.answers.questions import PairOptions, Question, ask, measure_names, resolve_spec
from colloc.answers.ranking import TopRows
from colloc.answers.spelling import NAMED, named_unknown, not_seen, spelled_like
from colloc.answers.stopping import StopWords
from colloc.answers.sureness.documents import DocumentEvidence
from colloc.answers.sureness.floors import Floors, Shuffle
from colloc.answers.sureness.hypotheses import Hypotheses, pairs_of_words
from colloc.answers.sureness.judging import Judge
from colloc.answers.sureness.wishes import USUAL_DOCUMENTS, Wishes, divided, settled
from colloc.answers.tables import PairTable, Side, joined
from colloc.answers.wordclasses import Classes, in_classes, word_classes
from colloc.errors import NotSeenError, UsageError
from colloc.records import Int64Array
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT, DEFAULT_MIN_EXPECTED
from colloc.store import vocabulary
from colloc.store.connection import Store

Sides = Literal["both", "left", "right", "each"]
ROLES: dict[Side, str] = {"right": "head", "left": "dependent"}
"""What the word asked for is in a relation, by the side that its company stands on in the table."""


def around(
    store: Store,
    words: Sequence[str],
    *,
    side: Sides = "both",
    upos: Sequence[str] = (),
    measure: str | None = None,
    show: Sequence[str] | None = None,
    options: PairOptions | None = None,
    min_count: int | None = None,
    min_word_count: int = 1,
    wishes: Wishes | None = None,
    any_strength: bool = False,
    avoid: bool = False,
    min_expected: float = DEFAULT_MIN_EXPECTED,
    stop: Sequence[str] = (),
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """The company of each word, strongest first; ``limit`` rows a word (and side, and word class).

    The word asked for is always ``first``; with ``side`` only what stands left
    (before) or right (after) of it is counted, with the margins of that side.

    Parameters
    ----------
    side : {"both", "left", "right", "each"}
        ``each``: both sides apart, with a column ``side``. Of relations: ``right`` are the words that depend on the
        word asked for, ``left`` those it depends on; the column ``role`` says what the word asked for is.
    upos : sequence of str
        Only companions of these word classes, each apart, with a column ``upos``; the layer must tell word classes.
    avoid : bool
        Only words that stand there much less often than expected, or never.

    stop : sequence of str
        Companions that are not shown: `colloc.answers.stopping.StopWords`.

    The other parameters are those of `colloc.answers.pairs.pairs`; the q-values are among all pairs of a word asked
    for with any other word.

    Returns
    -------
    Columns
        Its setting ``unknown``, where there is one, lists the words asked for that the store does not know, and
        ``near`` what the first of them may have meant.

    Raises
    ------
    NotSeenError
        When none of the words is in the store.
    """
    if side not in get_args(Sides):
        raise UsageError(f"side must be one of {', '.join(get_args(Sides))}, not {side!r}")
    options = options or PairOptions()
    _, margins = resolve_spec(store, options)
    show, wishes = divided(show, wishes)
    ranking, names = measure_names(measure or ("g2" if avoid else None), show, margins)
    question = ask(store, options, names, jobs=jobs, memory=memory, progress=progress)
    least = (0 if avoid else DEFAULT_MIN_COUNT) if min_count is None else min_count
    by_default = wishes.min_docs is None
    sides = _sides(question, side, avoid)
    if avoid:
        check_avoidance(question, wishes, min_expected, any_strength)
    known, unknown = headwords(store, question.layer, words)
    terms = list(dict.fromkeys(known))
    # The company of words that so many documents do not hold would be empty.
    spread = bool((question.words.documents[terms] >= USUAL_DOCUMENTS).any())
    usual = bool(limit) and not avoid and least >= DEFAULT_MIN_COUNT and spread
    wishes = settled(wishes, store, question.spec.where, usual)
    classes = word_classes(store, question.layer, upos)
    stopped = StopWords(question, stop) if stop else None
    parts: list[Columns] = []
    floors: dict[Shuffle, Floors] = {}
    for one_side in sides:
        family: Hypotheses | None = None
        if avoid:
            found = avoided_by(question, terms, one_side, min_expected, min_word_count, wishes.max_q)
            family, rows = found.family, found.table
        else:
            tables = [question.reader.around(term, one_side) for term in terms]
            if wishes.tests(margins):
                family = pairs_of_words(question, tables, min_word_count)
            rows = joined(tables)
            rows = rows.take(filtered(question, rows, least, min_word_count, any_strength))
        rows = rows.take(rows.joint >= least)
        rows = rows if stopped is None else rows.take(stopped.shown(rows, first=False))
        judge = Judge(
            question,
            wishes,
            ranking,
            min_word_count,
            side=one_side,
            family=family,
            floors=floors,
            jobs=jobs,
            memory=memory,
            progress=progress,
        )
        rows = rows.take(judge.passing(rows))
        rank = partial(_ranked, question, terms=terms, ranking=ranking, avoid=avoid)
        looked_up: DocumentEvidence | None = None
        if wishes.late:
            rows, looked_up = _passing_late(judge, rows, classes, rank, limit)
        for upos_name, kept in in_classes(rows, classes):
            table, first, second = rank(kept, limit=limit)
            evidence = judge.evidence(table) if looked_up is None else looked_up.take(_places(table, rows))
            columns = as_columns(first, second, table, names, {})
            if question.spec.kind == "relation":
                columns = Columns({"role": [ROLES[one_side]] * len(table), **columns.data})
            elif side == "each":
                columns = Columns({"side": [one_side] * len(table), **columns.data})
            if upos_name is not None:
                columns = Columns({"upos": [upos_name] * len(table), **columns.data})
            if avoid and family is not None:
                columns = columns.adding(shown_avoidance(table, family))
            parts.append(columns.adding(judge.shown(table, evidence)))
    settings = question.settings(
        words=list(words),
        side=side,
        upos=list(upos),
        measure=ranking,
        min_count=least,
        min_word_count=min_word_count,
        any_strength=any_strength,
        **judge.settings(),
        **({"min_docs_by_default": True} if by_default and wishes.least_documents > 1 else {}),
        **({"avoid": True, "min_expected": min_expected} if avoid else {}),
        **({"stop": list(stop)} if stop else {}),
        **({"unknown": unknown, "near": spelled_like(store, question.layer, unknown)} if unknown else {}),
        limit=limit,
    )
    return Columns({name: np.concatenate([part[name] for part in parts]) for name in parts[0].names}, settings)


def _sides(question: Question, side: Sides, avoid: bool) -> tuple[Side, ...]:
    """The sides that are asked one after the other."""
    kind = question.spec.kind
    if kind == "relation":
        if avoid and side != "right":
            raise UsageError("what a word avoids in a relation is asked of heads only: add side right")
        return ("right", "left") if side == "both" or side == "each" else (side,)
    if side != "both" and question.reader.ordered:
        raise UsageError("side divides a symmetric window: leave it out with directed, left/right or positions")
    if side != "both" and kind == "unit":
        raise UsageError("units that hold both words have no sides: leave out side")
    return ("left", "right") if side == "each" else (side,)


def headwords(store: Store, layer: str, words: Sequence[str]) -> tuple[list[int], list[str]]:
    """Term numbers of the words that the store knows, in the order given, and the words that it does not know.

    Raises
    ------
    NotSeenError
        When none is known.
    """
    numbers = vocabulary.term_numbers(store, layer, list(words)).tolist()
    known = [number for number in numbers if number >= 0]
    unknown = list(dict.fromkeys(word for word, number in zip(words, numbers, strict=True) if number < 0))
    if not known:
        if len(unknown) == 1:
            raise NotSeenError(not_seen(store, layer, unknown[0]))
        more = ", ..." if len(unknown) > NAMED else ""
        listed = ", ".join(named_unknown(unknown, spelled_like(store, layer, unknown)))
        raise NotSeenError(f"{store.path}: none of these occurs in layer {layer!r}: {listed}{more}")
    return known, unknown


def _passing_late(
    judge: Judge, rows: PairTable, classes: Classes, rank: Callable[..., Any], limit: int
) -> tuple[PairTable, DocumentEvidence | None]:
    """Rows that pass what only the text can tell, with what it says of them: the strongest, until lists are full."""
    reach = FIRST_REACH * limit
    while True:
        strongest = joined([rank(kept, limit=reach)[0] for _, kept in in_classes(rows, classes)])
        evidence = judge.evidence(strongest)
        if evidence is None:
            return rows, None
        passing = np.flatnonzero(judge.late_passing(evidence))
        found = strongest.take(passing)
        if not reach or _full(rows, found, classes, limit, reach):
            return found, evidence.take(passing)
        reach *= 8


def _full(rows: PairTable, found: PairTable, classes: Classes, limit: int, reach: int) -> bool:
    """Whether every word has its ``limit`` rows of those found, or had no more rows than were looked up."""
    return all(
        np.count_nonzero(good.first == term) >= limit or np.count_nonzero(kept.first == term) <= reach
        for (_, kept), (_, good) in zip(in_classes(rows, classes), in_classes(found, classes), strict=True)
        for term in np.unique(kept.first).tolist()
    )


def _places(table: PairTable, among: PairTable) -> Int64Array:
    """Where the rows of one table stand in another that has them all."""
    wanted, there = (rows.first.astype(np.uint64) << np.uint64(32) | rows.second for rows in (table, among))
    order = np.argsort(there)
    places: Int64Array = order[np.searchsorted(there[order], wanted)]
    return places


def _ranked(
    question: Question, rows: PairTable, *, terms: list[int], ranking: str, avoid: bool, limit: int
) -> tuple[PairTable, list[str], list[str]]:
    """The best rows of each word, in the order of the words."""
    tables: list[PairTable] = []
    first: list[str] = []
    second: list[str] = []
    for term in terms:
        own = rows.take(rows.first == term)
        top = TopRows(limit, lambda: text_ranks(question))
        if len(own):
            top.add(own, score(ranking, own, avoid=avoid))
        best, _, one, two = top.best(lambda numbers: vocabulary.term_texts(question.store, question.layer, numbers))
        tables.append(best)
        first += one
        second += two
    return joined(tables), first, second
