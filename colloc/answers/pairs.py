"""The strongest pairs of a store."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.questions import PairOptions, Question, ask, measure_names, resolve_spec
from colloc.answers.ranking import TopRows
from colloc.answers.spread import document_counts
from colloc.answers.tables import PairTable
from colloc.measures.catalogue import MEASURES
from colloc.measures.contingency import expected
from colloc.records import FloatArray, Int64Array
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT
from colloc.store import vocabulary
from colloc.store.connection import Store


def pairs(
    store: Store,
    *,
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
    """The pairs that rank highest by one measure.

    Parameters
    ----------
    measure : str
        Ranks; a name of the catalogue or ``joint``. NPMI when not given.
    show : sequence of str
        Measures shown besides.
    min_count, min_word_count, min_docs : int
        Least joint count, frequency of each word, and number of documents that
        hold the pair. They act on what is shown, never on the margins.
    repulsion : bool
        Pairs that meet as often as expected or less are left out unless this is set.
    limit : int
        Rows; 0 for all.

    Returns
    -------
    Columns
        first, second, joint, first_total, second_total, total, expected and the
        measures asked for; ties stand by joint count, then by word.
    """
    options = options or PairOptions()
    _, margins = resolve_spec(store, options)
    ranking, names = measure_names(measure, show, margins)
    question = ask(store, options, names, jobs=jobs, memory=memory, progress=progress)
    top = TopRows(0 if min_docs > 1 else limit, lambda: text_ranks(question))
    for table in question.reader.blocks():
        chosen = table.take(filtered(question, table, min_count, min_word_count, repulsion))
        if len(chosen):
            top.add(chosen, score(ranking, chosen))
    table, _, first, second = top.best(lambda terms: vocabulary.term_texts(store, question.layer, terms))
    documents: Int64Array | None = None
    if min_docs > 1:
        documents = document_counts(question, table.first, table.second)
        rows = np.flatnonzero(documents >= min_docs)[: limit or None]
        table, documents = table.take(rows), documents[rows]
        first, second = [first[row] for row in rows], [second[row] for row in rows]
    settings = question.settings(
        measure=ranking,
        min_count=min_count,
        min_word_count=min_word_count,
        min_docs=min_docs,
        repulsion=repulsion,
        limit=limit,
    )
    return as_columns(first, second, table, names, settings, documents)


def filtered(question: Question, table: PairTable, min_count: int, min_word_count: int, repulsion: bool) -> np.ndarray:
    """Mask of the rows that pass the thresholds."""
    keep = table.joint >= min_count
    if min_word_count > 1:
        tokens = question.words.tokens
        keep &= (tokens[table.first] >= min_word_count) & (tokens[table.second] >= min_word_count)
    if not repulsion:
        # Attraction: O > E without dividing, in float64 since products of margins overflow integers.
        product = table.first_total.astype(np.float64) * table.second_total
        keep &= table.joint * np.asarray(table.total, dtype=np.float64) > product
    mask: np.ndarray = keep
    return mask


def score(measure: str, table: PairTable) -> FloatArray:
    """The ranking value of each row, highest first: p-values and errors are negated."""
    if measure == "joint":
        return table.joint.astype(np.float64)
    chosen = MEASURES[measure]
    values = chosen.compute(*table.arguments)
    return -values if chosen.strongest == "lowest" else values


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
    documents: Int64Array | None = None,
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
    if documents is not None:
        columns["documents"] = documents
    for name in names:
        columns[name] = MEASURES[name].compute(*table.arguments)
    return Columns(columns, settings)
