"""Counts and scores of given pairs and expressions, of whatever kinds and layers they are."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.concordance import finding, matching
from colloc.answers.expressions.given import LONGEST_GIVEN, OPEN_TERM, given_expressions
from colloc.answers.expressions.measures import SCORES
from colloc.answers.expressions.settings import ExpressionOptions
from colloc.answers.judging.matters import OPEN, Matter
from colloc.answers.questions import PairOptions, Question, ask, built_spec, chosen_spec
from colloc.answers.sureness.documents import document_evidence
from colloc.counts.words import slice_word_counts
from colloc.measures.catalogue import compute_all
from colloc.measures.contingency import expected
from colloc.measures.multivariate import specific_correlation
from colloc.records import WordCounts
from colloc.settings import DEFAULT_MEMORY, Inside
from colloc.store import slices, vocabulary
from colloc.store.connection import Store

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
        By measure, for an expression `colloc.answers.expressions.measures.SCORES`; only what can be computed.
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
            answers = _of_expressions(store, chosen, settled, jobs=jobs, memory=memory, progress=progress)
        else:
            question = ask(store, settled, tuple(measures), jobs=jobs, memory=memory, progress=progress)
            answers = _of_pairs(question, chosen, measures)
        found.update(zip(rows, answers, strict=True))
    return [found[row] for row in range(len(matters))]


def occurrences(store: Store, matter: Matter) -> int:
    """The joint count of a pair, or how often an expression stands in the text; soon told, since without scores.

    Of an expression of more than `MOST_PARTS` words so many are looked for, the first ones.
    """
    # Annotated words may have blanks in them, which a search takes for borders of words.
    if matter.kind != "expression" or any(len(word.split()) > 1 for word in matter.words):
        return figures(store, [matter], ())[0].joint
    inside = chosen_spec(PairOptions(), built_spec(store), "pairs").inside
    search = matching.prepare(store, matter.layer, [" ".join(matter.words[: matching.MOST_PARTS])])
    return len(finding.find(store, search, left=0, right=0, inside=inside, where=""))


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
    answers = [
        Figures(0, 0, _word_counts(question.store, question.words, matter), dict.fromkeys(columns), {})
        for matter in matters
    ]
    for place, row in enumerate(there.tolist()):
        answers[row] = Figures(
            int(table.joint[place]),
            int(documents[place]),
            answers[row].word_counts,
            {name: values[place].item() for name, values in columns.items()},
            {name: float(values[place]) for name, values in scores.items() if not np.isnan(values[place])},
        )
    return answers


def _word_counts(store: Store, words: WordCounts, matter: Matter) -> tuple[int, ...]:
    numbers = vocabulary.term_numbers(store, matter.layer, list(matter.words)).tolist()
    return tuple(int(words.tokens[number]) if number >= 0 else 0 for number in numbers)


def figures_of_expressions(store: Store, matters: Sequence[Matter], answer: Columns, where: str) -> list[Figures]:
    """Figures from an answer about expressions that has a row with every measure for each matter.

    Parameters
    ----------
    where : str
        Canonical slice that the answer counts in.
    """
    layers = {matter.layer for matter in matters}
    words = {layer: slice_word_counts(store, layer, where) for layer in layers}
    found = []
    for matter, row in zip(matters, answer.to_dicts(), strict=True):
        scores = {name: float(row[name]) for name in SCORES if not np.isnan(row.get(name, np.nan))}
        counts = _word_counts(store, words[matter.layer], matter)
        found.append(Figures(row["count"], row["documents"], counts, {}, scores))
    return found


def _of_expressions(store: Store, matters: Sequence[Matter], options: PairOptions, **resources: Any) -> list[Figures]:
    """Expressions of one layer: looked up among all that are frequent, by the default rules of their ranking."""
    where, layer = slices.canonical(options.where), matters[0].layer
    inside = chosen_spec(options, built_spec(store), "pairs").inside
    words = slice_word_counts(store, layer, where)
    answers: dict[int, Figures] = {}
    grown: dict[int, list[int]] = {}
    for place, matter in enumerate(matters):
        terms = vocabulary.term_numbers(store, layer, list(matter.words)).tolist()
        closed = [word != OPEN for word in matter.words]
        if any(wanted and term < 0 for wanted, term in zip(closed, terms, strict=True)):
            answers[place] = Figures(0, 0, _word_counts(store, words, matter), {}, {})
        elif closed[0] and closed[-1] and len(terms) <= LONGEST_GIVEN:
            grown[place] = [term if wanted else OPEN_TERM for wanted, term in zip(closed, terms, strict=True)]
        else:
            answers[place] = _searched(store, matter, words, inside, where)
    if grown:
        asked = ExpressionOptions(layer=layer, where=options.where, inside=inside)
        found = given_expressions(store, list(grown.values()), asked, **resources)
        of_grown = figures_of_expressions(store, [matters[place] for place in grown], found, where)
        answers.update(zip(grown, of_grown, strict=True))
    return [answers[place] for place in range(len(matters))]


def _searched(store: Store, matter: Matter, words: WordCounts, inside: Inside, where: str) -> Figures:
    """An expression that is too long to be grown, or begins or ends with an open place: found in the text."""
    counts = _word_counts(store, words, matter)
    search = matching.prepare(store, matter.layer, [matter.text])
    hits = finding.find(store, search, left=0, right=0, inside=inside, where=where)
    closed = [count for word, count in zip(matter.words, counts, strict=True) if word != OPEN]
    scores: dict[str, float] = {}
    if len(hits) and len(closed) > 1:
        tokens = int(words.tokens.sum())
        scores["specific_correlation"] = float(specific_correlation(len(hits), np.array(closed), tokens))
    return Figures(len(hits), len(np.unique(hits.documents)), counts, {}, scores)
