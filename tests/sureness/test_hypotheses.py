"""q-values and avoidance equal what follows from listing every pair of words.

Oracles: scipy.stats for the tests of single tables, statsmodels for Benjamini & Hochberg (1995), and the whole cross
product of words, which the product never lists.
"""

from __future__ import annotations

from itertools import product
from pathlib import Path

import numpy as np
import pytest
from scipy import stats
from statsmodels.stats.multitest import multipletests

from colloc.answers.avoidance import avoided_by, avoiding_pairs, expected_pairs, shown_avoidance
from colloc.answers.questions import PairOptions, Question, ask
from colloc.answers.sureness.hypotheses import _may_be_below, all_pairs, pairs_of_words, two_sided
from colloc.answers.tables import PairTable
from colloc.errors import UsageError
from colloc.measures.contingency import expected
from colloc.settings import TallySpec
from colloc.store.opening import open_for_reading
from tests.sureness.simulating import CountedText, independent_text

WAYS = [
    pytest.param(PairOptions(), id="symmetric"),
    pytest.param(PairOptions(directed=True), id="directed"),
    pytest.param(PairOptions(left=1, right=3), id="unequal"),
    pytest.param(PairOptions(margins="positions"), id="positions"),
    pytest.param(PairOptions(unit=True), id="units"),
]


def every_pair(question: Question, least: int = 1) -> PairTable:
    """The tables of all pairs of words that occur at least so often."""
    words = np.flatnonzero(question.words.tokens >= least).tolist()
    pairs = list(product(words, repeat=2))
    if not question.reader.ordered:
        pairs = [(x, y) for x, y in pairs if x < y or (x == y and question.spec.kind != "unit")]
    first, second = np.array(pairs, np.uint32).T
    return question.reader.given(first, second)


def as_rows(table: PairTable, *, ordered: bool) -> list[tuple[int, ...]]:
    rows = zip(table.first.tolist(), table.second.tolist(), strict=True)
    return [row if ordered else tuple(sorted(row)) for row in rows]


@pytest.mark.parametrize("options", WAYS)
@pytest.mark.parametrize("least", [1, 40])
def test_q_values_are_those_of_all_pairs(made_store: Path, options: PairOptions, least: int) -> None:
    with open_for_reading(made_store) as store:
        question = ask(store, options)
        family = all_pairs(question, least)
        table = every_pair(question, least)
        # a pair that never met counts with p = 1
        p = np.where(table.joint > 0, np.exp(two_sided(table)), 1.0)
        q = multipletests(p, method="fdr_bh")[1]
        met = table.joint > 0
        assert family.number == len(table)
        assert np.allclose(family.q_values(table.take(met)), q[met])
        assert (q < 0.5).any()


def test_p_values_against_scipy(made_store: Path) -> None:
    with open_for_reading(made_store) as store:
        table = every_pair(ask(store, PairOptions(directed=True)))
        values = np.exp(two_sided(table))
    cells = np.array(table.arguments).T[::17].astype(int)
    for (joint, first, second, total), value in zip(cells.tolist(), values[::17].tolist(), strict=True):
        if first * second / total >= 5:
            # statistic of the likelihood ratio, one degree of freedom
            observed = np.array([[joint, first - joint], [second - joint, total - first - second + joint]])
            assert value == pytest.approx(
                stats.chi2_contingency(observed, correction=False, lambda_="log-likelihood").pvalue, rel=1e-6
            )
        else:
            # mid-p: tables as probable as the one seen count by half
            possible = np.arange(min(first, second) + 1)
            chance = stats.hypergeom.pmf(possible, total, first, second)
            own = chance[joint]
            tied = np.isclose(chance, own, rtol=1e-6)
            assert value == pytest.approx(
                min(1.0, chance[(chance < own) & ~tied].sum() + chance[tied].sum() / 2), rel=1e-6
            )


def test_the_bound_never_leaves_out_a_small_p_value() -> None:
    for seed in range(3):
        terms, units = independent_text(np.random.default_rng(seed), 4000, 400)
        question = CountedText(terms, units, 400, TallySpec(right=5)).question()
        for table in question.reader.blocks():
            log_p = two_sided(table)
            for limit in (-0.5, -2.0, -6.0, -12.0):
                left_out = ~_may_be_below(table, limit)
                assert (log_p[left_out] > limit).all()
            assert left_out.mean() > 0.9


@pytest.mark.parametrize("options", WAYS[:1])
def test_the_family_of_words(made_store: Path, options: PairOptions) -> None:
    with open_for_reading(made_store) as store:
        question = ask(store, options)
        terms = [3, 9]
        tables = [question.reader.around(term) for term in terms]
        family = pairs_of_words(question, tables, 1)
        words = np.flatnonzero(question.words.tokens)
        assert family.number == 2 * len(words)
        p = np.concatenate([np.exp(two_sided(table)) for table in tables])
        q = multipletests(np.append(p, np.ones(family.number - len(p))), method="fdr_bh")[1]
        assert np.allclose(np.concatenate([family.q_values(table) for table in tables]), q[: len(p)])


@pytest.mark.parametrize("options", WAYS)
def test_pairs_expected_often_are_found_from_the_margins(made_store: Path, options: PairOptions) -> None:
    with open_for_reading(made_store) as store:
        question = ask(store, options)
        every = every_pair(question)
        for least in (1.0, 5.0, 60.0):
            found = []
            for first, second in expected_pairs(question.reader, least, question.words.tokens > 0):
                table = question.reader.given(first, second)
                found += as_rows(table.take(expected(*table.arguments) >= least), ordered=question.reader.ordered)
            wanted = as_rows(every.take(expected(*every.arguments) >= least), ordered=question.reader.ordered)
            assert sorted(found) == sorted(wanted)
            assert len(wanted) > 2


@pytest.mark.parametrize("options", WAYS)
def test_avoidance_equals_the_whole_cross_product(made_store: Path, options: PairOptions) -> None:
    with open_for_reading(made_store) as store:
        question = ask(store, options)
        every = every_pair(question)
        enough = every.take(expected(*every.arguments) >= 5.0)
        # an independent lower tail where counts are whole; the diagonal of symmetric windows has halves
        p = np.array(
            [
                stats.hypergeom.cdf(joint, round(total), round(first), round(second))
                for joint, first, second, total in zip(*(column.tolist() for column in enough.arguments), strict=True)
            ]
        )
        q = multipletests(p, method="fdr_bh")[1]
        found = avoiding_pairs(question, 5.0, max_q=0.5)
        rows = as_rows(found.table, ordered=question.reader.ordered)
        known = dict(zip(as_rows(enough, ordered=question.reader.ordered), q.tolist(), strict=True))
        whole = {row for row in rows if row[0] != row[1]}
        avoiding = {row for row, value in known.items() if value <= 0.5 and row[0] != row[1]}
        assert whole == avoiding
        assert found.family.number == len(enough)
        shown = dict(zip(rows, found.family.q_values(found.table).tolist(), strict=True))
        for row in sorted(whole):
            assert shown[row] == pytest.approx(known[row], rel=0.02)
        assert found.table.joint.tolist() == [int(joint) for joint in found.table.joint]
        assert (found.table.joint < expected(*found.table.arguments)).all()


def test_what_one_word_avoids(made_store: Path) -> None:
    with open_for_reading(made_store) as store:
        for options, side in ((PairOptions(), "both"), (PairOptions(), "left"), (PairOptions(directed=True), "both")):
            question = ask(store, options)
            found = avoided_by(question, [0, 2], side, 5.0, max_q=1.0)  # type: ignore[arg-type]
            others = np.flatnonzero(question.words.tokens).astype(np.uint32)
            number = 0
            for term in (0, 2):
                # every other word, met or not, through the tally's own look-up
                head = np.full(len(others), term, np.uint32)
                low, high = np.minimum(head, others), np.maximum(head, others)
                block = question.reader.tally.pairs(low, high)
                after = np.where(head <= others, block.forward, block.backward)
                before = np.where(head < others, block.backward, block.forward)
                joint = (
                    before if side == "left" else after if question.reader.ordered else block.forward + block.backward
                )
                table = question.reader.counted(head, others, joint, side)  # type: ignore[arg-type]
                often = expected(*table.arguments)
                number += int((often >= 5).sum())
                wanted = table.take((often >= 5) & (table.joint < often))
                mine = found.table.take(found.table.first == term)
                assert mine.second.tolist() == wanted.second.tolist()
                assert mine.joint.tolist() == wanted.joint.tolist()
            assert found.family.number == number


def test_what_the_sample_could_have_shown() -> None:
    column = np.array
    table = PairTable(
        column([0, 1], np.uint32),
        column([1, 2], np.uint32),
        column([0, 4]),
        column([1000, 1000]),
        column([400, 500]),
        column([20000, 20000]),
    )
    text = CountedText(*independent_text(np.random.default_rng(0), 500, 20), 20, TallySpec(right=5))
    family = all_pairs(text.question(), 1)
    shown = shown_avoidance(table, family)
    # expected 20 and 25: met once would be log2(1/20), log2(1/25)
    assert np.allclose(shown["pmi_if_one"], np.log2([1 / 20, 1 / 25]))
    # upper limits of a Poisson mean at 95 %: 2.996 for 0, 9.154 for 4 (Garwood 1936, table)
    assert np.allclose(2 ** shown["pmi_at_most"] * [20, 25], [2.996, 9.154], atol=5e-4)


def test_refused() -> None:
    text = CountedText(*independent_text(np.random.default_rng(0), 500, 20), 20, TallySpec(right=5))
    with pytest.raises(UsageError, match="margins tokens does not have"):
        all_pairs(text.question("tokens"), 1)
