"""Spread over documents and jackknife intervals equal what follows from plain counts of each document.

Oracles: the definitions of the counts (`tests/counts/brute.py`), tables by the conventions written
out here, Student's t of scipy.stats, and the dispersion measures, which have published checks of their own.
"""

from __future__ import annotations

from itertools import product
from math import log2
from pathlib import Path

import numpy as np
import pytest
from scipy import stats

from colloc.answers.questions import PairOptions, ask
from colloc.answers.sureness import documents
from colloc.answers.sureness.documents import document_evidence
from colloc.answers.tables import Side
from colloc.counts.grouping import deal
from colloc.measures.dispersion import dispersion
from colloc.store.opening import open_for_reading
from tests.counts import brute
from tests.counts.placed import Placed, write_store
from tests.sureness.conftest import N_TERMS

Table = tuple[float, float, float, float]
PAIRS = [(x, y) for x, y in product(range(N_TERMS), repeat=2) if (x + 2 * y) % 5 == 0]


def matrices(document: Placed, way: str) -> tuple[np.ndarray, np.ndarray, int]:
    """Cells, word frequencies and units of one document; for units the cells are those that hold both words."""
    cells = np.zeros((N_TERMS, N_TERMS))
    words = np.bincount(np.array(document.terms, int), minlength=N_TERMS)
    if way == "unit":
        units = [set(unit) for unit in brute.units_of(document.terms, document.sentences) if unit]
        for unit in units:
            for x, y in product(unit, repeat=2):
                cells[x, y] += 1
        return cells, words, len(units)
    if way == "positions":
        found = brute.positions(document.terms, document.sentences, 5, 5)
    else:
        found = brute.windows_fast(document.terms, document.sentences, 0, 5)
    for cell, count in found.items():
        cells[cell] = count
    return cells, words, 0


def table_of(documents: list[tuple[np.ndarray, np.ndarray, int]], x: int, y: int, way: str) -> Table:
    """joint, first_total, second_total, total of one pair, by the definition of each way to count."""
    cells, words = (np.sum([document[part] for document in documents], axis=0) for part in (0, 1))
    total = cells.sum()
    if way == "unit":
        return cells[x, y], cells[x, x], cells[y, y], sum(document[2] for document in documents)
    if way == "positions":
        return cells[x, y], words[x], cells[:, y].sum(), words.sum()
    if way in ("directed", "right"):
        return cells[x, y], cells[x].sum(), cells[:, y].sum(), total
    if way == "left":
        return cells[y, x], cells[:, x].sum(), cells[y].sum(), total
    both = cells + cells.T
    if way == "tokens":
        scale = 2 * total / words.sum()
        return both[x, y], words[x] * scale, words[y] * scale, 2 * total
    half = 2.0 if x == y else 1.0
    return both[x, y] / half, both[x].sum() / half, both[y].sum() / half, 2 * total / half


def pmi_of(table: Table) -> float:
    joint, first, second, total = table
    return log2(joint * total / (first * second)) if joint else -np.inf


WAYS: list[tuple[str, PairOptions, Side]] = [
    ("symmetric", PairOptions(), "both"),
    ("directed", PairOptions(directed=True), "both"),
    ("left", PairOptions(), "left"),
    ("right", PairOptions(), "right"),
    ("positions", PairOptions(margins="positions"), "both"),
    ("tokens", PairOptions(margins="tokens"), "both"),
    ("unit", PairOptions(unit=True), "both"),
]


@pytest.mark.parametrize(("way", "options", "side"), WAYS, ids=[way for way, _, _ in WAYS])
def test_intervals_by_leaving_out_groups(
    made_store: Path, made: list[Placed], way: str, options: PairOptions, side: Side
) -> None:
    pairs = [(x, y) for x, y in PAIRS if way != "unit" or x != y][::3]
    counted = [matrices(document, way) for document in made]
    first, second = np.array(pairs, np.uint32).T
    with open_for_reading(made_store) as store:
        question = ask(store, options)
        joint = np.array([table_of(counted, x, y, way)[0] for x, y in pairs]).astype(np.int64)
        if way == "tokens":
            # margins of tokens show a word beside itself twice
            joint = np.where(first == second, joint // 2, joint)
        table = question.reader.counted(first, second, joint, side)
        evidence = document_evidence(question, table, side)
    groups = deal(len(made))
    for row, (x, y) in enumerate(pairs):
        whole = table_of(counted, x, y, way)
        assert np.allclose([column[row] for column in table.arguments], whole)
        left_out = [
            pmi_of(table_of([counted[d] for d in np.flatnonzero(groups != group)], x, y, way)) for group in range(20)
        ]
        if np.isfinite([pmi_of(whole), *left_out]).all():
            error = np.sqrt(19 / 20 * np.sum((np.array(left_out) - np.mean(left_out)) ** 2))
            half = stats.t.ppf(0.975, 19) * error
            assert evidence.interval is not None
            assert evidence.interval.low[row] == pytest.approx(pmi_of(whole) - half)
            assert evidence.interval.high[row] == pytest.approx(pmi_of(whole) + half)
        else:
            assert evidence.interval is not None
            assert evidence.interval.low[row] == -np.inf
            assert evidence.interval.high[row] == np.inf


def test_spread_over_documents(made_store: Path, made: list[Placed]) -> None:
    first, second = np.array(PAIRS, np.uint32).T
    counts = np.zeros((len(PAIRS), len(made)), np.int64)
    for number, document in enumerate(made):
        cells = brute.windows_fast(document.terms, document.sentences, 0, 5)
        for row, (x, y) in enumerate(PAIRS):
            counts[row, number] = cells.get((x, y), 0) + (cells.get((y, x), 0) if x != y else 0)
    with open_for_reading(made_store) as store:
        question = ask(store, PairOptions())
        evidence = document_evidence(question, question.reader.given(first, second))
        quick = document_evidence(question, question.reader.given(first, second), intervals=False)
    pair, document = np.nonzero(counts)
    sizes = np.array([len(document.terms) for document in made])
    known = dispersion(pair, document, counts[pair, document], sizes, len(PAIRS))
    assert evidence.documents.tolist() == (counts > 0).sum(axis=1).tolist()
    met = counts.sum(axis=1) > 0
    assert np.allclose(evidence.dp_norm[met], known.dp_norm[met])
    assert np.allclose(evidence.largest_share[met], known.largest_share[met])
    assert np.isnan(evidence.dp_norm[~met]).all()
    expected = (counts.sum(axis=1) >= 20) & ((counts > 0).sum(axis=1) >= 10)
    assert evidence.sound.tolist() == expected.tolist()
    assert expected.any()
    assert not expected.all()
    assert np.array_equal(quick.dp_norm, evidence.dp_norm, equal_nan=True)
    assert quick.interval is None
    assert not quick.sound.any()


def test_many_rows_take_several_passes(made_store: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    first, second = np.array(PAIRS, np.uint32).T
    with open_for_reading(made_store) as store:
        question = ask(store, PairOptions())
        table = question.reader.given(first, second)
        for intervals in (True, False):
            whole = document_evidence(question, table, intervals=intervals)
            monkeypatch.setattr(documents, "ROWS", 13)
            parts = document_evidence(question, table, intervals=intervals)
            monkeypatch.undo()
            assert parts.documents.tolist() == whole.documents.tolist()
            assert np.array_equal(parts.dp_norm, whole.dp_norm, equal_nan=True)
            assert parts.sound.tolist() == whole.sound.tolist()
            if whole.interval is None or parts.interval is None:
                assert not intervals
            else:
                assert parts.interval.low.tolist() == whole.interval.low.tolist()
                assert parts.interval.high.tolist() == whole.interval.high.tolist()
        nothing = document_evidence(question, table.take(np.arange(0)))
        assert len(nothing.documents) == 0


def test_few_documents(tmp_path: Path, made: list[Placed]) -> None:
    for n, finite in ((1, False), (3, True)):
        path = tmp_path / f"few-{n}.colloc"
        write_store(path, [document for document in made if document.terms][:n], N_TERMS, block=700)
        with open_for_reading(path) as store:
            question = ask(store, PairOptions())
            table = question.reader.given(np.array([0], np.uint32), np.array([1], np.uint32))
            evidence = document_evidence(question, table)
        assert evidence.interval is not None
        assert np.isfinite(evidence.interval.low[0]) == finite
        assert not evidence.sound[0]


def test_groups_are_even_and_always_the_same() -> None:
    groups = deal(103)
    assert np.bincount(groups).tolist() == [6] * 3 + [5] * 17
    assert np.array_equal(groups, deal(103))
    assert deal(7).max() == 6
    assert len(deal(0)) == 0
