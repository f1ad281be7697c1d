"""Counts and scores of given pairs and expressions, of whatever kinds and layers they are."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from colloc.answers.concordance import finding, matching
from colloc.answers.judging.matters import OPEN, Matter
from colloc.answers.questions import PairOptions, Question, ask, built_spec, chosen_spec
from colloc.answers.sureness.documents import document_evidence
from colloc.counts.words import slice_word_counts
from colloc.errors import NotSeenError
from colloc.measures.catalogue import compute_all
from colloc.measures.contingency import expected
from colloc.measures.multivariate import specific_correlation
from colloc.settings import DEFAULT_MEMORY
from colloc.store import slices, vocabulary
from colloc.store.connection import Store

EXPRESSION_SCORE = "specific_correlation"
"""For expressions: log2 of p(all words in a row) over the product of the words' shares, in bits."""
Value = int | float | None


@dataclass(frozen=True, slots=True)
class Figures:
    """What the store says of one matter.

    Attributes
    ----------
    joint : int
        How often the words meet, or the expression stands; 0 where a word is not in the store.
    documents : int
        How many documents hold it.
    word_counts : tuple of int
        Frequency of each word; 0 for an open place.
    table : dict
        first_total, second_total, total and expected of a pair.
    scores : dict
        By measure, for an expression `EXPRESSION_SCORE`; only what can be computed.
    """

    joint: int
    documents: int
    word_counts: tuple[int, ...]
    table: dict[str, Value]
    scores: dict[str, float]


def figures(
    store: Store,
    matters: Sequence[Matter],
    measures: Sequence[str],
    options: PairOptions | None = None,
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> list[Figures]:
    """Counts and scores of each matter, in their order.

    Parameters
    ----------
    measures : sequence of str
        For pairs; names of the catalogue.
    options : PairOptions
        How pairs are counted; the layer and, for directed pairs, the direction are those of the matter.
    """
    options = options or PairOptions()
    found: dict[int, Figures] = {}
    groups: dict[tuple[str, str], list[int]] = {}
    for row, matter in enumerate(matters):
        groups.setdefault((matter.layer, matter.kind), []).append(row)
    for (layer, kind), rows in groups.items():
        chosen = [matters[row] for row in rows]
        settled = replace(options, layer=layer, directed=options.directed or kind == "directed")
        if kind == "expression":
            answers = [_of_expression(store, matter, settled) for matter in chosen]
        else:
            question = ask(store, settled, tuple(measures), jobs=jobs, memory=memory, progress=progress)
            answers = _of_pairs(question, chosen, measures)
        found.update(zip(rows, answers, strict=True))
    return [found[row] for row in range(len(matters))]


def _of_pairs(question: Question, matters: Sequence[Matter], measures: Sequence[str]) -> list[Figures]:
    terms = [
        vocabulary.term_numbers(question.store, question.layer, [matter.words[place] for matter in matters])
        for place in (0, 1)
    ]
    there = np.flatnonzero((terms[0] >= 0) & (terms[1] >= 0))
    table = question.reader.given(terms[0][there].astype(np.uint32), terms[1][there].astype(np.uint32))
    scores = compute_all(measures, *table.arguments)
    documents = document_evidence(question, table, intervals=False).documents if len(there) else np.zeros(0, np.int64)
    columns = {
        "first_total": table.first_total,
        "second_total": table.second_total,
        "total": table.total,
        "expected": expected(*table.arguments),
    }
    answers = [Figures(0, 0, _word_counts(question, matter), dict.fromkeys(columns), {}) for matter in matters]
    for place, row in enumerate(there.tolist()):
        answers[row] = Figures(
            int(table.joint[place]),
            int(documents[place]),
            answers[row].word_counts,
            {name: values[place].item() for name, values in columns.items()},
            {name: float(values[place]) for name, values in scores.items() if not np.isnan(values[place])},
        )
    return answers


def _word_counts(question: Question, matter: Matter) -> tuple[int, ...]:
    numbers = vocabulary.term_numbers(question.store, question.layer, list(matter.words)).tolist()
    return tuple(int(question.words.tokens[number]) if number >= 0 else 0 for number in numbers)


def _of_expression(store: Store, matter: Matter, options: PairOptions) -> Figures:
    where = slices.canonical(options.where)
    words = slice_word_counts(store, matter.layer, where)
    numbers = vocabulary.term_numbers(store, matter.layer, list(matter.words)).tolist()
    counts = tuple(int(words.tokens[number]) if number >= 0 else 0 for number in numbers)
    inside = chosen_spec(options, built_spec(store), "pairs").inside
    try:
        search = matching.prepare(store, matter.layer, [matter.text])
    except NotSeenError:
        return Figures(0, 0, counts, {}, {})
    hits = finding.find(store, search, left=0, right=0, inside=inside, where=where)
    scores: dict[str, float] = {}
    tokens = int(words.tokens.sum())
    closed = [count for word, count in zip(matter.words, counts, strict=True) if word != OPEN]
    if len(hits) and len(closed) > 1:
        scores[EXPRESSION_SCORE] = float(specific_correlation(len(hits), np.array(closed), tokens))
    return Figures(len(hits), len(np.unique(hits.documents)), counts, {}, scores)
