"""Pairs with a label: what was accepted or rejected, or every pair of the store beside a list."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray

from colloc.answers.appraisal.labelled import Labelled, Scores, check_both, decided
from colloc.answers.columns import Columns
from colloc.answers.pairs import text_ranks
from colloc.answers.questions import PairOptions, Question, ask
from colloc.answers.ranking import TopRows
from colloc.answers.tables import TOKEN_MARGIN_MEASURES, PairTable, joined
from colloc.errors import NotSeenError, UsageError
from colloc.measures.catalogue import MEASURES, compute_all, find_ranking
from colloc.records import FloatArray, Int64Array
from colloc.store import vocabulary
from colloc.store.connection import Store
from colloc.store.decisions import Kind


@dataclass(frozen=True)
class LabelledPairs(Labelled):
    """Pairs of words; see `Labelled`."""

    what: ClassVar[str] = "pairs"
    question: Question
    table: PairTable
    wanted: NDArray[np.bool_]
    listed: int
    passed_over: int

    @property
    def groups(self) -> Int64Array:  # type: ignore[override]
        """The first word of each pair."""
        return self.table.first.astype(np.int64)

    def measures(self, names: Sequence[str] | None) -> list[str]:
        """``joint`` and all that can rank and that the margins can bear when not given.

        A p-value ranks as its logarithm does, but is 0 for the strongest pairs: only the logarithm is held against.
        """
        if names is not None:
            return [name if name == "joint" else find_ranking(name).name for name in dict.fromkeys(names)]
        bearable = TOKEN_MARGIN_MEASURES if self.question.convention.margins == "tokens" else tuple(MEASURES)
        doubled = {name.replace("_log10_p", "_p") for name in MEASURES if name.endswith("_log10_p")}
        return ["joint", *(one for one in bearable if MEASURES[one].tells != "error" and one not in doubled)]

    def scores(self, measures: Sequence[str]) -> Scores:
        """Ranking values; ``joint`` is frequency."""
        return ranking_values(self.table, measures)

    def turned(self, measure: str) -> bool:
        """As the catalogue says."""
        return measure in MEASURES and MEASURES[measure].strongest == "lowest"

    def settings(self, **more: Any) -> dict[str, Any]:
        """Those of the question."""
        return self.question.settings(**more)

    def ranked(
        self, measures: Sequence[str], odds: Callable[[Scores], FloatArray], min_count: int, limit: int
    ) -> Columns:
        """first, second, joint, combined and wanted, of the pairs that meet at least ``min_count`` times."""
        question = self.question
        top = TopRows(limit, lambda: text_ranks(question))
        for table in question.reader.blocks():
            chosen = table.take(table.joint >= max(min_count, 1))
            if len(chosen):
                top.add(chosen, odds(ranking_values(chosen, measures)))
        table, values, first, second = top.best(
            lambda terms: vocabulary.term_texts(question.store, question.layer, terms)
        )
        accepted = pair_codes(question, self.table.first, self.table.second)[self.wanted]
        columns = {
            "first": first,
            "second": second,
            "joint": table.joint,
            "combined": values,
            "wanted": np.isin(pair_codes(question, table.first, table.second), accepted).astype(np.int64),
        }
        return Columns(columns, question.settings(min_count=min_count, limit=limit))


def ranking_values(table: PairTable, measures: Sequence[str]) -> Scores:
    """Measures turned so that the strongest end is the highest."""
    named = [name for name in measures if name != "joint"]
    computed = compute_all(named, *table.arguments)
    turned = {name: -values if MEASURES[name].strongest == "lowest" else values for name, values in computed.items()}
    if "joint" in measures:
        turned["joint"] = table.joint.astype(np.float64)
    return {name: turned[name] for name in measures}


def from_list(
    store: Store, listed: Sequence[Sequence[str]], options: PairOptions, min_count: int, **resources: Any
) -> LabelledPairs:
    """Every pair that meets at least ``min_count`` times; those of the list are wanted.

    Entries of the list that are no pairs of words are passed over.
    """
    question = ask(store, options, (), **resources)
    pairs = [tuple(words) for words in listed if len(words) == 2]
    if not pairs:
        raise UsageError("the list holds no pair of two words; longer ones are for --items expressions")
    terms = [vocabulary.term_numbers(store, question.layer, [pair[place] for pair in pairs]) for place in (0, 1)]
    known = (terms[0] >= 0) & (terms[1] >= 0)
    gold = np.unique(pair_codes(question, terms[0][known], terms[1][known]))
    table = joined(list(_frequent(question, min_count)))
    if not len(table):
        raise NotSeenError(f"{store.path}: no pair meets {min_count} times or more")
    codes = pair_codes(question, table.first, table.second)
    wanted = np.isin(codes, gold)
    return LabelledPairs(question, table, wanted, len(set(pairs)), len(set(pairs)) - len(np.unique(codes[wanted])))


def _frequent(question: Question, min_count: int) -> Iterator[PairTable]:
    empty = np.zeros(0, np.uint32)
    yield question.reader.given(empty, empty)
    for table in question.reader.blocks():
        yield table.take(table.joint >= max(min_count, 1))


def pair_codes(question: Question, first: NDArray[Any], second: NDArray[Any]) -> NDArray[np.uint64]:
    """One number a pair; both orders of a pair without direction have the same."""
    one, two = first.astype(np.uint64), second.astype(np.uint64)
    if not question.reader.ordered:
        one, two = np.minimum(one, two), np.maximum(one, two)
    return one << np.uint64(32) | two


def from_decisions(store: Store, options: PairOptions, judge: str | None, **resources: Any) -> LabelledPairs:
    """The pairs that were accepted (wanted) or rejected.

    Pairs of the layer asked about; directed ones where the question is directed, else those without direction.
    """
    question = ask(store, options, (), **resources)
    kind: Kind = "directed" if options.directed else "pair"
    matters, wanted, listed = decided(store, kind, question.layer, judge)
    terms = [vocabulary.term_numbers(store, question.layer, [one.words[place] for one in matters]) for place in (0, 1)]
    known = (terms[0] >= 0) & (terms[1] >= 0)
    table = question.reader.given(terms[0][known].astype(np.uint32), terms[1][known].astype(np.uint32))
    wanted = wanted[known]
    check_both(store, wanted, kind, question.layer)
    return LabelledPairs(question, table, wanted, listed, listed - len(table))
