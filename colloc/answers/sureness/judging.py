"""Rows of an answer held against chance and against the documents."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.answers.questions import Question
from colloc.answers.sureness.documents import DocumentEvidence, document_evidence
from colloc.answers.sureness.floors import Floors, Shuffle, find_floors, floor_measures, obtain_floors
from colloc.answers.sureness.hypotheses import Hypotheses, all_pairs
from colloc.answers.sureness.wishes import DOCUMENT_COLUMNS, INTERVAL_COLUMNS, Q_COLUMNS, Wishes
from colloc.answers.tables import PairTable, Side, TableReader
from colloc.counts.grouping import GROUPS
from colloc.measures.catalogue import MEASURES
from colloc.measures.contingency import expected
from colloc.measures.intervals import pmi_interval
from colloc.records import FloatArray
from colloc.settings import DEFAULT_MEMORY

Progress = Callable[[float, int, str], None]


def sided(question: Question, side: Side) -> Question:
    """The question that one side of a symmetric window asks: the same table, read with a direction."""
    if side == "both" or question.reader.ordered:
        return question
    convention = replace(question.convention, directed=True)
    reader = TableReader(question.reader.tally, convention, question.words)
    return replace(question, convention=convention, reader=reader)


class Judge:
    """Says of rows what was asked about their sureness.

    Parameters
    ----------
    question : Question
    wishes : Wishes
    ranking : str
        The measure that ranks; floors are in its unit where there are floors of it, else in that of PMI.
    min_word_count : int
        The word threshold, which decides which pairs are tested.
    family : Hypotheses or None
        The tests that q-values are among; all pairs of the store when not given.
    floors : dict or None
        Where floors are kept once they are there; judges of the two sides of a word share one.
    """

    def __init__(
        self,
        question: Question,
        wishes: Wishes,
        ranking: str,
        min_word_count: int,
        *,
        side: Side = "both",
        family: Hypotheses | None = None,
        floors: dict[Shuffle, Floors] | None = None,
        jobs: int | None = None,
        memory: int = DEFAULT_MEMORY,
        progress: Progress | None = None,
    ) -> None:
        self._question, self._wishes, self._side = question, wishes, side
        self._min_word_count = min_word_count
        self._given_family = family
        self._jobs, self._memory = jobs, memory
        self._progress = progress
        self._floors: dict[Shuffle, Floors] = {} if floors is None else floors
        self._made: set[Shuffle] = set()
        self.columns = wishes.shown(question.convention.margins, question.spec.kind)
        self.floor_measure = ranking if ranking in floor_measures(question) else "pmi"

    def settings(self) -> dict[str, Any]:
        """What decides which rows are shown, and how the columns of sureness were made."""
        wishes = self._wishes
        found: dict[str, Any] = {
            "min_docs": wishes.least_documents,
            "max_q": wishes.max_q,
            "above_chance": wishes.above_chance,
            "interval_above": wishes.interval_above,
        }
        if "q_value" in self.columns:
            found["hypotheses"] = self._family.number
        if any(name in self.columns for name in INTERVAL_COLUMNS):
            found["groups_of_documents"] = GROUPS
        for shuffle, floors in self._floors.items():
            kept = " (made for this answer; colloc floors keeps it)" if shuffle in self._made else ""
            found[f"{shuffle}_floor"] = f"99th percentile of {self.floor_measure}, seed {floors.seed}{kept}"
        return {name: value for name, value in found.items() if value is not None}

    @cached_property
    def _family(self) -> Hypotheses:
        return self._given_family or all_pairs(self._question, self._min_word_count, self._progress)

    def floors(self, shuffle: Shuffle) -> Floors:
        """One of the chance floors, made when it is first asked for."""
        if shuffle not in self._floors:
            question = sided(self._question, self._side)
            if find_floors(question, shuffle) is None and not question.store.writable:
                self._made.add(shuffle)
            self._floors[shuffle] = obtain_floors(
                question,
                shuffle,
                progress=self._progress,
                jobs=self._jobs,
                memory=self._memory,
            )
        return self._floors[shuffle]

    def passing(self, table: PairTable) -> NDArray[np.bool_]:
        """Which rows pass what can be told from counts alone: ``max_q`` and ``above_chance``.

        Of ``min_docs`` only what follows for each word: no pair is in more documents than either of its words.
        """
        keep = np.ones(len(table), np.bool_)
        if self._wishes.least_documents > 1:
            held = self._question.words.documents >= self._wishes.least_documents
            keep &= held[table.first] & held[table.second]
        if self._wishes.above_chance is not None:
            keep &= self._above(table, self._wishes.above_chance)
        if self._wishes.max_q is not None:
            keep[keep] = self._family.q_values(table.take(keep)) <= self._wishes.max_q
        return keep

    def evidence(self, table: PairTable) -> DocumentEvidence | None:
        """What the documents say, where anything was asked that needs it; one pass over the text."""
        intervals = any(name in self.columns for name in INTERVAL_COLUMNS)
        if not intervals and not any(name in self.columns for name in DOCUMENT_COLUMNS):
            return None
        return document_evidence(self._question, table, self._side, intervals=intervals)

    def late_passing(self, evidence: DocumentEvidence) -> NDArray[np.bool_]:
        """Which rows pass ``min_docs`` and ``interval_above``."""
        keep = evidence.documents >= self._wishes.least_documents
        if self._wishes.interval_above is not None and evidence.interval is not None:
            keep &= evidence.interval.low > self._wishes.interval_above
        return keep

    def shown(self, table: PairTable, evidence: DocumentEvidence | None) -> dict[str, NDArray[np.generic]]:
        """The columns asked for beside measures, for rows that are shown."""
        found: dict[str, NDArray[np.generic]] = {}
        tokens = self._question.words.tokens
        found |= {"first_count": tokens[table.first], "second_count": tokens[table.second]}
        if evidence is not None:
            found |= {"documents": evidence.documents, "dp_norm": evidence.dp_norm, "sound": evidence.sound}
            if evidence.interval is not None:
                found |= {"pmi_low": evidence.interval.low, "pmi_high": evidence.interval.high}
        if "formula_low" in self.columns or "formula_high" in self.columns:
            formula = pmi_interval(*table.arguments)
            found |= {"formula_low": formula.low, "formula_high": formula.high}
        if any(name in self.columns for name in Q_COLUMNS):
            found["q_value"] = self._family.q_values(table)
        for shuffle in ("corpus", "order"):
            if f"{shuffle}_floor" in self.columns or f"above_{shuffle}" in self.columns:
                found[f"{shuffle}_floor"] = self._floor(table, shuffle)
                found[f"above_{shuffle}"] = self._told_above(table, shuffle)
        return {name: found[name] for name in self.columns}

    def _floor(self, table: PairTable, shuffle: Shuffle) -> FloatArray:
        return self.floors(shuffle).at(self.floor_measure, expected(*table.arguments))

    def _above(self, table: PairTable, shuffle: Shuffle) -> NDArray[np.bool_]:
        above: NDArray[np.bool_] = MEASURES[self.floor_measure].compute(*table.arguments) > self._floor(table, shuffle)
        return above

    def _told_above(self, table: PairTable, shuffle: Shuffle) -> NDArray[np.generic]:
        """Whether each row is above its floor; None where there is none to hold it against."""
        above = self._above(table, shuffle)
        unknown = np.isnan(self._floor(table, shuffle))
        if not unknown.any():
            return above
        told = above.astype(object)
        told[unknown] = None
        return told
