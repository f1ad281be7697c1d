"""Pairs with a label: what was accepted or rejected, or every pair of the store beside a list."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.answers.judging.listing import standing
from colloc.answers.questions import PairOptions, Question, ask
from colloc.answers.tables import PairTable, joined
from colloc.errors import NotSeenError, UsageError
from colloc.measures.catalogue import MEASURES, compute_all
from colloc.records import FloatArray
from colloc.settings import DEFAULT_MEMORY
from colloc.store import vocabulary
from colloc.store.connection import Store
from colloc.store.decisions import Decision, Key


@dataclass(frozen=True, slots=True)
class Labelled:
    """Candidates, which of them are wanted, and where the numbers come from.

    Attributes
    ----------
    question : Question
    table : PairTable
    wanted : bool array, shape (n,)
    listed : int
        Pairs of the list, or decisions of the kind asked about, whether or not the store has them as candidates.
    passed_over : int
        Of those, how many are no candidates: too rare, never met, or undecided.
    """

    question: Question
    table: PairTable
    wanted: NDArray[np.bool_]
    listed: int
    passed_over: int

    def scores(self, measures: Sequence[str]) -> dict[str, FloatArray]:
        """Ranking value of each candidate by each measure, highest first; ``joint`` is frequency."""
        return ranking_values(self.table, measures)


def ranking_values(table: PairTable, measures: Sequence[str]) -> dict[str, FloatArray]:
    """Measures turned so that the strongest end is the highest."""
    named = [name for name in measures if name != "joint"]
    computed = compute_all(named, *table.arguments)
    turned = {name: -values if MEASURES[name].strongest == "lowest" else values for name, values in computed.items()}
    if "joint" in measures:
        turned["joint"] = table.joint.astype(np.float64)
    return {name: turned[name] for name in measures}


def from_list(
    store: Store, listed: Sequence[Sequence[str]], options: PairOptions, min_count: int, **resources: Any
) -> Labelled:
    """Every pair that meets at least ``min_count`` times; those of the list are wanted.

    Entries of the list that are no pairs of words are passed over.
    """
    question = ask(store, options, (), **resources)
    pairs = [tuple(words) for words in listed if len(words) == 2]
    if not pairs:
        raise UsageError("the list holds no pair of two words")
    terms = [vocabulary.term_numbers(store, question.layer, [pair[place] for pair in pairs]) for place in (0, 1)]
    known = (terms[0] >= 0) & (terms[1] >= 0)
    gold = np.unique(pair_codes(question, terms[0][known], terms[1][known]))
    table = joined(list(_frequent(question, min_count)))
    if not len(table):
        raise NotSeenError(f"{store.path}: no pair meets {min_count} times or more")
    codes = pair_codes(question, table.first, table.second)
    wanted = np.isin(codes, gold)
    return Labelled(question, table, wanted, len(set(pairs)), len(set(pairs)) - len(np.unique(codes[wanted])))


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


def from_decisions(
    store: Store, options: PairOptions, judge: str | None, *, jobs: int | None = None, memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Labelled:  # fmt: skip
    """The pairs that were accepted (wanted) or rejected; where judges disagree, or are unsure, a pair is passed over.

    Pairs of the layer asked about; directed ones where the question is directed, else those without direction.
    """
    question = ask(store, options, (), jobs=jobs, memory=memory, progress=progress)
    kind = "directed" if options.directed else "pair"
    verdicts: dict[Key, set[str]] = {}
    words: dict[Key, Decision] = {}
    for one in standing(store, judge):
        if one.kind == kind and one.layer == question.layer:
            verdicts.setdefault(one.key, set()).add(one.verdict)
            words[one.key] = one
    decided = [key for key, found in verdicts.items() if len(found & {"accept", "reject"}) == 1]
    terms = [
        vocabulary.term_numbers(store, question.layer, [words[key].words[place] for key in decided]) for place in (0, 1)
    ]
    known = (terms[0] >= 0) & (terms[1] >= 0)
    table = question.reader.given(terms[0][known].astype(np.uint32), terms[1][known].astype(np.uint32))
    wanted = np.array(["accept" in verdicts[key] for key in decided], np.bool_)[known]
    if wanted.all() or not wanted.any():
        what = "accepted" if not wanted.any() else "rejected"
        raise UsageError(
            f"{store.path}: no {kind} of layer {question.layer!r} was {what}: accept some and reject some, "
            "or give a list with --gold"
        )
    return Labelled(question, table, wanted, len(verdicts), len(verdicts) - len(table))
