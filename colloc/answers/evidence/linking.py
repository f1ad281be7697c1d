"""What a picture of an answer needs beside its rows: the chance floors, and how partners hold together."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.questions import Question
from colloc.answers.sureness.floors import SHUFFLES, Floors, find_floors
from colloc.answers.tables import Convention, TableReader
from colloc.counts.tallying import obtain_tally
from colloc.counts.words import slice_word_counts
from colloc.measures.catalogue import MEASURES
from colloc.settings import TallySpec
from colloc.store import vocabulary
from colloc.store.connection import Store


def question_of(store: Store, settings: Mapping[str, Any]) -> Question:
    """The question an answer of ``pairs`` or ``around`` was given to, from its settings."""
    spec = TallySpec(**{field.name: settings[field.name] for field in dataclasses.fields(TallySpec)})
    convention = Convention(margins=settings["margins"], directed=settings["directed"], spanned=settings["spanned"])
    words = slice_word_counts(store, spec.layer, spec.where)
    return Question(store, spec, convention, TableReader(obtain_tally(store, spec), convention, words), words)


def kept_floors(question: Question) -> list[Floors]:
    """The chance floors that the store keeps for a question."""
    found = [find_floors(question, shuffle) for shuffle in SHUFFLES]
    return [floors for floors in found if floors is not None]


def partner_links(
    question: Question, answer: Columns, measure: str, most: int, least: int
) -> dict[tuple[int, int], float]:
    """The measure between the partners of a word, in the first ``most`` rows of an answer of ``around``.

    Parameters
    ----------
    least : int
        Joint count from which a link is one.

    Returns
    -------
    dict of (row, later row) to float
        Only pairs that attract each other.
    """
    words = answer["second"][:most].tolist()
    terms = vocabulary.term_numbers(question.store, question.layer, words).astype(np.uint32)
    own = vocabulary.term_numbers(question.store, question.layer, answer["first"][:1].tolist())
    one, other = np.triu_indices(len(terms), 1)
    if not len(one):
        return {}
    # The word itself may be among its company; its links are the spokes already.
    apart = ~(np.isin(terms[one], own) | np.isin(terms[other], own))
    one, other = one[apart], other[apart]
    table = question.reader.given(terms[one], terms[other])
    values = MEASURES[measure].compute(*table.arguments)
    often = table.first_total.astype(np.float64) * table.second_total / table.total
    linked = np.flatnonzero((table.joint >= least) & (table.joint > often) & np.isfinite(values))
    return {(int(one[row]), int(other[row])): float(values[row]) for row in linked}
