"""Pairs found document by document equal a plain count of each document (`brute.py`), for every kind of tally."""

from __future__ import annotations

from collections import Counter
from itertools import product
from pathlib import Path

import numpy as np
import pytest

from colloc.counts import candidates
from colloc.counts.candidates import occurrences
from colloc.counts.scanning import feeding
from colloc.errors import UsageError
from colloc.settings import TallySpec
from colloc.store.opening import open_for_reading
from tests.counts import brute
from tests.counts.placed import Placed, random_documents, write_store


@pytest.fixture(autouse=True, params=[0, 10**9], ids=["around", "everywhere"])
def sparse(request: pytest.FixtureRequest, monkeypatch: pytest.MonkeyPatch) -> None:
    """Windows looked at only around the words in question, and everywhere."""
    monkeypatch.setattr(feeding, "_SPARSE", request.param)


N_TERMS = 20
MADE = random_documents(seed=3, n=40, n_terms=N_TERMS, longest=90)
REMOVED = (4, 17)
SPECS = [
    TallySpec(right=1),
    TallySpec(right=5),
    TallySpec(right=5, inside="document"),
    TallySpec(kind="span", left=2, right=4),
    TallySpec(kind="positions", left=3, right=2),
    TallySpec(kind="positions", left=5, right=5, inside="document"),
    TallySpec(kind="unit", right=0),
    TallySpec(kind="unit", right=0, inside="document"),
    TallySpec(right=5, where="genre=b"),
    TallySpec(kind="unit", right=0, where="genre=b"),
]


@pytest.fixture(scope="module")
def store_path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("candidates") / "made.colloc"
    write_store(path, MADE, N_TERMS, block=53, removed=REMOVED)
    return path


def cells_of(document: Placed, spec: TallySpec) -> brute.Cells:
    starts = document.sentences if spec.inside == "sentence" else []
    if spec.kind == "unit":
        return brute.units(document.terms, starts)
    if spec.kind == "positions":
        return brute.positions(document.terms, starts, spec.left, spec.right)
    return brute.windows(document.terms, starts, spec.left, spec.right)


def expected_counts(spec: TallySpec, wanted: list[tuple[int, int]], *, directed: bool) -> dict[tuple[int, int], int]:
    """(index of the pair, document) -> count."""
    counts: Counter[tuple[int, int]] = Counter()
    for number, document in enumerate(MADE):
        if number in REMOVED or (spec.where and document.genre != "b"):
            continue
        cells = cells_of(document, spec)
        for index, (x, y) in enumerate(wanted):
            counts[index, number] += cells.get((x, y), 0)
            if not directed and x != y:
                counts[index, number] += cells.get((y, x), 0)
    return {key: count for key, count in counts.items() if count}


def found_counts(path: Path, spec: TallySpec, wanted: list[tuple[int, int]], *, directed: bool) -> dict:
    first, second = np.array(wanted, np.uint32).T
    counts: dict[tuple[int, int], int] = {}
    with open_for_reading(path) as store:
        for part in occurrences(store, spec, first, second, directed=directed):
            for index, number, count in zip(
                part.pair.tolist(), part.document.tolist(), part.count.tolist(), strict=True
            ):
                assert (index, number) not in counts
                counts[index, number] = count
    return counts


@pytest.mark.parametrize(
    "spec", SPECS, ids=lambda spec: f"{spec.kind}-{spec.left}-{spec.right}-{spec.inside}{spec.where}"
)
@pytest.mark.parametrize("directed", [False, True])
def test_every_pair_in_every_document(store_path: Path, spec: TallySpec, directed: bool) -> None:
    if spec.kind == "unit":
        directed = False
    wanted = list(product(range(N_TERMS), repeat=2))
    assert found_counts(store_path, spec, wanted, directed=directed) == expected_counts(spec, wanted, directed=directed)


def test_few_and_repeated_pairs(store_path: Path) -> None:
    wanted = [(3, 0), (0, 3), (3, 0), (1, 1), (19, 18), (2, 7)]
    for directed in (False, True):
        expected = expected_counts(SPECS[1], wanted, directed=directed)
        assert found_counts(store_path, SPECS[1], wanted, directed=directed) == expected


def test_counted_in_many_small_parts(store_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    wanted = list(product(range(N_TERMS), repeat=2))
    expected = expected_counts(SPECS[1], wanted, directed=False)
    monkeypatch.setattr(candidates, "WAITING", 10)
    monkeypatch.setattr(feeding, "PIECE", 17)
    assert found_counts(store_path, SPECS[1], wanted, directed=False) == expected


def test_no_pairs(store_path: Path) -> None:
    nothing = np.empty(0, np.uint32)
    with open_for_reading(store_path) as store:
        assert list(occurrences(store, SPECS[0], nothing, nothing, directed=False)) == []


def test_relations_need_annotated_text(store_path: Path) -> None:
    pair = np.array([1], np.uint32)
    with open_for_reading(store_path) as store, pytest.raises(UsageError, match="annotated text"):
        list(occurrences(store, TallySpec(kind="relation", right=0), pair, pair, directed=True))
