"""From a pair of words to its evidence card."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from colloc.answers.avoidance import sample_limits
from colloc.answers.columns import Columns
from colloc.answers.evidence import wording
from colloc.answers.evidence.byslice import slice_tables
from colloc.answers.evidence.card import Evidence
from colloc.answers.evidence.occurring import PairOccurrences, occurrences_of
from colloc.answers.evidence.related import relation_rows
from colloc.answers.evidence.seen import examples_and_forms
from colloc.answers.evidence.similar import similar_pairs
from colloc.answers.evidence.tested import interval_rows, tests_of
from colloc.answers.questions import PairOptions, Question, ask
from colloc.answers.spelling import not_seen
from colloc.answers.sureness.floors import SHUFFLES, find_floors, floor_measures
from colloc.answers.tables import TOKEN_MARGIN_MEASURES, PairTable
from colloc.errors import NotSeenError, UsageError
from colloc.measures.catalogue import MEASURES, compute_all
from colloc.measures.contingency import expected
from colloc.measures.dispersion import dispersion
from colloc.settings import DEFAULT_MEMORY
from colloc.store import documents, vocabulary
from colloc.store.connection import Store

EXAMPLES = 4


def explain(
    store: Store,
    first: str,
    second: str,
    *,
    options: PairOptions | None = None,
    examples: int = EXAMPLES,
    seed: int = 0,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Evidence:
    """The evidence card of a pair.

    Parameters
    ----------
    first, second : str
        Single words of the layer.
    options : PairOptions
        How pairs are counted, as elsewhere.
    examples : int
        Example lines; none where the store keeps no text.
    seed : int
        Of the sample that examples are chosen from where there are very many lines.

    Raises
    ------
    NotSeenError
        When a word never occurs; the message says what to try.
    UsageError
        For syntactic relations, which cannot be followed through the text.
    """
    question = ask(store, options or PairOptions(), jobs=jobs, memory=memory, progress=progress)
    if question.spec.kind == "relation":
        raise UsageError("explain follows words through the text, not relations: give window, or left and right")
    one, two = _terms(question, first, second)
    seen = occurrences_of(question, one, two)
    table = seen.table()
    similar = similar_pairs(question, int(table.joint[0]))
    names = measures_of(question)
    values = compute_all(names, *table.arguments)
    places = similar.places(names, table)
    texts = vocabulary.term_texts(store, question.layer, [one, two])
    spread, by_document = _spread(question, seen)
    lines, forms = examples_and_forms(seen, one, two, examples, seed)
    parts: dict[str, Any] = {
        "first": texts[0],
        "second": texts[1],
        "settings": question.settings(first=texts[0], second=texts[1], examples=examples, seed=seed),
        "table": _totals(table),
        "cells": _cells(question, table),
        "cases": {
            "cases": int(seen.cases.sum()),
            "with_second": int(seen.with_second.sum()),
            "left": seen.left,
            "right": seen.right,
        },
        "information": _information(texts, table),
        "mutual_information": _mutual(question, table, similar.information),
        "measures": Columns(
            {
                "measure": list(names),
                "title": [MEASURES[name].title for name in names],
                "value": np.array([values[name][0] for name in names], np.float64),
                "unit": [MEASURES[name].unit for name in names],
                "rank": places,
                "compared": np.full(len(names), len(similar.table)),
            }
        ),
        "compared": {
            "low": similar.low,
            "high": similar.high,
            "pairs": similar.n_pairs,
            "compared": len(similar.table),
        },
        "intervals": interval_rows(seen, table),
        "tests": tests_of(question, table, progress),
        "avoidance": _avoidance(question, table),
        "floors": _floors(question, table),
        "spread": spread,
        "by_document": by_document,
        "positions": Columns({"offset": seen.offsets, "count": seen.profile}),
        "relations": relation_rows(question, one, two),
        "slices": slice_tables(seen),
        "forms": forms,
        "examples": lines,
    }
    return Evidence(**parts, statements=wording.statements(question, parts))


def measures_of(question: Question) -> tuple[str, ...]:
    """All measures that the margins can bear."""
    return TOKEN_MARGIN_MEASURES if question.convention.margins == "tokens" else tuple(MEASURES)


def _terms(question: Question, first: str, second: str) -> tuple[int, int]:
    numbers = vocabulary.term_numbers(question.store, question.layer, [first, second]).tolist()
    for word, number in zip((first, second), numbers, strict=True):
        if number < 0 or not question.words.tokens[number]:
            if number < 0 and len(word.split()) == 1:
                raise NotSeenError(not_seen(question.store, question.layer, word))
            said = f"{question.store.path}: {word!r} never occurs in layer {question.layer!r}"
            if number >= 0:
                raise NotSeenError(f"{said} in documents where {question.spec.where}")
            phrases = f"`colloc lines {question.store.path} '{word}'` looks for phrases"
            raise NotSeenError(f"{said}; explain takes two single words; {phrases}")
    return numbers[0], numbers[1]


def _totals(table: PairTable) -> dict[str, int | float]:
    names = ("joint", "first_total", "second_total", "total")
    totals: dict[str, int | float] = {}
    for name, column in zip(names, table.arguments, strict=True):
        value = column[0].item()
        totals[name] = int(value) if float(value).is_integer() else float(value)
    totals["expected"] = float(expected(*table.arguments)[0])
    return totals


def _cells(question: Question, table: PairTable) -> Columns:
    """The four cells; margins of tokens are no sums of cells, and give the first only."""
    a, r, c, n = (float(column[0]) for column in table.arguments)
    observed = [a, r - a, c - a, n - r - c + a]
    if question.convention.margins == "tokens":
        observed[1:] = [float("nan")] * 3
    return Columns(
        {
            "first": ["yes", "yes", "no", "no"],
            "second": ["yes", "no", "yes", "no"],
            "observed": np.array(observed),
            "expected": np.array([r * c, r * (n - c), (n - r) * c, (n - r) * (n - c)]) / n if n else np.full(4, np.nan),
        }
    )


def _information(texts: Sequence[str], table: PairTable) -> Columns:
    """Prior and posterior of each word given the other, and what the other takes off its surprisal."""
    joint, first, second, total = (column.astype(np.float64) for column in table.arguments)
    with np.errstate(divide="ignore", invalid="ignore"):
        prior = np.concatenate([second / total, first / total])
        posterior = np.concatenate([joint / first, joint / second])
        return Columns(
            {
                "of": [texts[1], texts[0]],
                "given": [texts[0], texts[1]],
                "prior": prior,
                "posterior": posterior,
                "ratio": posterior / prior,
                "bits": np.log2(posterior / prior),
                "surprisal_before": -np.log2(prior),
                "surprisal_after": -np.log2(posterior),
            }
        )


def _mutual(question: Question, table: PairTable, information: float | None) -> dict[str, float] | None:
    """The part of the table's mutual information that the pair carries, in both of its cells where it has two."""
    if information is None:
        return None
    joint, first, second, total = (float(column[0]) for column in table.arguments)
    bits = joint / total * np.log2(joint * total / (first * second)) if joint else 0.0
    if not question.reader.ordered and table.first[0] != table.second[0]:
        bits *= 2
    return {
        "pair_bits": float(bits),
        "table_bits": information,
        "share": float(bits / information) if information > 0 else float("nan"),
    }


def _avoidance(question: Question, table: PairTable) -> dict[str, float] | None:
    """What the sample could have shown of a pair that is met less often than expected."""
    if question.convention.margins == "tokens" or table.joint[0] >= expected(*table.arguments)[0]:
        return None
    return {name: float(values[0]) for name, values in sample_limits(table).items()}


def _floors(question: Question, table: PairTable) -> Columns:
    rows: list[tuple[str, str, float, float]] = []
    often = expected(*table.arguments)
    for shuffle in SHUFFLES:
        floors = find_floors(question, shuffle)
        if floors is None:
            continue
        for name in floor_measures(question):
            value = float(MEASURES[name].compute(*table.arguments)[0])
            rows.append((shuffle, name, value, float(floors.at(name, often)[0])))
    return Columns(
        {
            "shuffle": [row[0] for row in rows],
            "measure": [row[1] for row in rows],
            "value": np.array([row[2] for row in rows], np.float64),
            "floor": np.array([row[3] for row in rows], np.float64),
            "above": np.array([None if row[3] != row[3] else row[2] > row[3] for row in rows], object),
        }
    )


def _spread(question: Question, seen: PairOccurrences) -> tuple[dict[str, Any], Columns]:
    sizes = seen.tokens
    there = np.flatnonzero(seen.joint)
    order = there[np.lexsort((there, -seen.joint[there]))]
    rows = [documents.document(question.store, number) for number in seen.documents[order].tolist()]
    by_document = Columns(
        {
            "document": [row.identifier for row in rows],
            "joint": seen.joint[order],
            "tokens": sizes[order],
        }
    )
    spread: dict[str, Any] = {
        "documents": len(there),
        "of_documents": len(seen.documents),
        "tokens": int(sizes.sum()),
        "dp": float("nan"),
        "dp_norm": float("nan"),
        "largest_share": float("nan"),
        "largest_document": rows[0].identifier if rows else None,
    }
    if len(there):
        found = dispersion(np.zeros(len(there), np.int64), there, seen.joint[there], sizes, 1)
        spread["dp"] = float(found.dp[0])
        spread["dp_norm"] = float(found.dp_norm[0])
        spread["largest_share"] = float(found.largest_share[0])
    return spread, by_document
