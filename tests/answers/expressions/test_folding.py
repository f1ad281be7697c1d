"""Boundaries on small tables written by hand: each rule by itself."""

from __future__ import annotations

import numpy as np
import pytest

from colloc.answers.expressions.folding import completeness, edge_rates, folded_into, wholes
from colloc.answers.expressions.gathering import Gathered
from colloc.counts.sequences.levels import Spread

A, B, C, D = range(4)
NAN = float("nan")


def table(
    counts: dict[tuple[int, ...], int],
    *,
    documents: dict[tuple[int, ...], int] | None = None,
    opening: dict[tuple[int, ...], int] | None = None,
    closing: dict[tuple[int, ...], int] | None = None,
    total: int = 1000,
    units: int = 100,
) -> Gathered:
    """A table of these sequences; what is not said lies in ten documents and never at the edge of a sentence."""
    single = [(term,) for term in range(4)]
    longer = sorted(counts, key=lambda terms: (len(terms), terms))
    rows = {terms: row for row, terms in enumerate([*single, *longer])}
    longest = max(map(len, longer))
    edges = [0, *np.cumsum([sum(len(terms) == n for terms in rows) for n in range(1, longest + 1)]).tolist()]

    def column(values: dict[tuple[int, ...], int] | None, default: int) -> np.ndarray:
        return np.array([(values or {}).get(terms, default) for terms in longer])

    some = column(documents, 10)
    spread = Spread(some, some, some * NAN, some * NAN, some * NAN, column(opening, 0), column(closing, 0))
    return Gathered(
        (),
        np.zeros(0, np.int64),
        tuple(edges),
        np.array([-1] * 4 + [rows[terms[:-1]] for terms in longer]),
        np.array([-1] * 4 + [rows[terms[1:]] for terms in longer]),
        np.array([100] * 4 + [counts[terms] for terms in longer]),
        spread,
        total,
        units,
    )


def folded(made: Gathered, counts: dict[tuple[int, ...], int], eligible: np.ndarray | None = None) -> dict:
    """The whole of each sequence, by its words."""
    longer = sorted(counts, key=lambda terms: (len(terms), terms))
    everything = np.ones(len(longer), bool) if eligible is None else eligible
    return {longer[n]: longer[row - 4] for n, row in enumerate(wholes(made, everything).tolist())}


NEVER_OPEN = {"opening": {(B, C): 50, (A, B): 50, (A, B, C): 50}, "closing": {(B, C): 50, (A, B): 50, (A, B, C): 50}}


@pytest.mark.parametrize(("inside", "folds"), [(75, True), (74, False)])
def test_three_quarters_make_a_fragment(inside: int, folds: bool) -> None:
    counts = {(A, B): 200, (B, C): 100, (A, B, C): inside}
    found = folded(table(counts, **NEVER_OPEN), counts)
    assert found[B, C] == ((A, B, C) if folds else (B, C))
    assert found[A, B] == (A, B)


@pytest.mark.parametrize(("inside", "folds"), [(50, True), (49, False)])
def test_half_is_enough_on_an_open_side(inside: int, folds: bool) -> None:
    counts = {(A, B): 200, (B, C): 100, (A, B, C): inside}
    # expected openings are 10: one in place of none counts 1/11 of the usual
    found = folded(table(counts, closing=NEVER_OPEN["closing"]), counts)
    assert found[B, C] == ((A, B, C) if folds else (B, C))


def test_a_chain_must_keep_its_share_of_the_fragment_it_began_with() -> None:
    counts = {(A, B): 90, (B, C): 100, (C, D): 90, (A, B, C): 80, (B, C, D): 60, (A, B, C, D): 62}
    found = folded(table(counts, opening=dict.fromkeys(counts, 50), closing=dict.fromkeys(counts, 50)), counts)
    # 62 of 80 would do for the step, 62 of 100 does not for the whole way
    assert found[A, B, C] == (A, B, C, D)
    assert found[B, C] == (A, B, C)


def test_what_one_book_repeats_and_what_is_not_eligible_are_no_wholes() -> None:
    counts = {(A, B): 200, (B, C): 100, (A, B, C): 90}
    assert folded(table(counts, documents={(A, B, C): 4}), counts)[B, C] == (B, C)
    assert folded(table(counts, documents={(A, B, C): 5}), counts)[B, C] == (A, B, C)
    assert folded(table(counts), counts, np.array([True, True, False]))[B, C] == (B, C)


def test_completeness_by_the_edges_of_sentences() -> None:
    counts = {(A, B): 100, (B, C): 100, (C, D): 100, (A, D): 2}
    # a tenth of all tokens ends a sentence, so 10 of 100 are usual
    made = table(counts, closing={(A, B): 10, (A, D): 0}, opening={(B, C): 40})
    opening, closing = edge_rates(made)
    order = sorted(counts)
    assert closing[order.index((A, B))] == 1.0
    assert opening[order.index((B, C))] == pytest.approx(41 / 11)
    value = dict(zip(order, completeness(made).tolist(), strict=True))
    assert value[A, B] == 1.0
    assert value[B, C] == 0.5
    assert value[C, D] == pytest.approx(1 / 11)
    assert value[A, D] == pytest.approx(1 / 1.2)  # two occurrences are no evidence


def test_the_whole_takes_over_from_its_strongest_fragment() -> None:
    first = 4
    fragment, strength, fragments = folded_into(np.array([6, 6, 6, 7]), np.array([5.0, 9.0, 7.0, 1.0]), first)
    assert fragment.tolist() == [-1, -1, 5, -1]
    assert strength.tolist() == [5.0, 9.0, 9.0, 1.0]
    assert fragments.tolist() == [0, 0, 2, 0]
