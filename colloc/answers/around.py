"""What stands around a word."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.pairs import as_columns, filtered, score, text_ranks
from colloc.answers.questions import PairOptions, Question, ask, measure_names, resolve_spec
from colloc.answers.ranking import TopRows
from colloc.answers.spread import document_counts
from colloc.answers.tables import PairTable, Side, joined
from colloc.errors import NotSeenError, UsageError
from colloc.records import Int64Array
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT
from colloc.store import vocabulary
from colloc.store.connection import Store


def around(
    store: Store,
    words: Sequence[str],
    *,
    side: Side = "both",
    measure: str | None = None,
    show: Sequence[str] | None = None,
    options: PairOptions | None = None,
    min_count: int = DEFAULT_MIN_COUNT,
    min_word_count: int = 1,
    min_docs: int = 1,
    repulsion: bool = False,
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """The company of each word, strongest first; ``limit`` rows a word.

    The word asked for is always ``first``; with ``side`` only what stands left
    (before) or right (after) of it is counted, with the margins of that side.

    Raises
    ------
    NotSeenError
        When none of the words is in the store.
    """
    if side not in ("both", "left", "right"):
        raise UsageError(f"side must be both, left or right, not {side!r}")
    options = options or PairOptions()
    _, margins = resolve_spec(store, options)
    ranking, names = measure_names(measure, show, margins)
    question = ask(store, options, names, jobs=jobs, memory=memory, progress=progress)
    if side != "both" and question.reader.ordered:
        raise UsageError(
            "side divides a symmetric window: leave it out with directed, left/right, positions or relation"
        )
    if side != "both" and question.spec.kind == "unit":
        raise UsageError("units that hold both words have no sides: leave out side")
    terms = headwords(store, question.layer, words)
    found: list[tuple[PairTable, list[str], list[str], Int64Array | None]] = []
    for term in terms:
        table = question.reader.around(term, side)
        table = table.take(filtered(question, table, min_count, min_word_count, repulsion))
        found.append(_ranked(question, table, ranking, min_docs, limit))
    settings = question.settings(
        words=list(words),
        side=side,
        measure=ranking,
        min_count=min_count,
        min_word_count=min_word_count,
        min_docs=min_docs,
        repulsion=repulsion,
        limit=limit,
    )
    documents = np.concatenate([part[3] for part in found if part[3] is not None]) if min_docs > 1 else None
    return as_columns(
        [text for part in found for text in part[1]],
        [text for part in found for text in part[2]],
        joined([part[0] for part in found]),
        names,
        settings,
        documents,
    )


def headwords(store: Store, layer: str, words: Sequence[str]) -> list[int]:
    """Term numbers of the words that the store knows, in the order given.

    Raises
    ------
    NotSeenError
        When none is known.
    """
    numbers = vocabulary.term_numbers(store, layer, list(words))
    known = [int(number) for number in numbers if number >= 0]
    if not known:
        listed = ", ".join(repr(word) for word in words[:5])
        raise NotSeenError(f"{store.path}: {listed} never occurs in layer {layer!r}; `colloc words` lists what does")
    return known


def _ranked(
    question: Question, table: PairTable, ranking: str, min_docs: int, limit: int
) -> tuple[PairTable, list[str], list[str], Int64Array | None]:
    top = TopRows(0 if min_docs > 1 else limit, lambda: text_ranks(question))
    if len(table):
        top.add(table, score(ranking, table))
    best, _, first, second = top.best(lambda numbers: vocabulary.term_texts(question.store, question.layer, numbers))
    if min_docs <= 1:
        return best, first, second, None
    documents = document_counts(question, best.first, best.second)
    rows = np.flatnonzero(documents >= min_docs)[: limit or None]
    return best.take(rows), [first[row] for row in rows], [second[row] for row in rows], documents[rows]
