"""Tallies counted from a stored stream equal the definitions, however the work is cut."""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import pytest

from colloc.counts import tallying
from colloc.counts.tallying import obtain_tally
from colloc.records import NO_TERM, PairBlock
from colloc.settings import TallySpec
from colloc.store.tallies import Tally
from tests.counts import brute, stores

SPECS = [
    TallySpec(right=1),
    TallySpec(right=2, inside="paragraph"),
    TallySpec(right=5),
    TallySpec(right=5, layer="form"),
    TallySpec(right=10, inside="document"),
    TallySpec(kind="span", left=3, right=1),
    TallySpec(kind="span", left=0, right=4, inside="document"),
    TallySpec(kind="positions", left=2, right=5),
    TallySpec(kind="positions", left=4, right=4, inside="document"),
    TallySpec(kind="unit", inside="sentence"),
    TallySpec(kind="unit", inside="paragraph"),
    TallySpec(kind="unit", inside="document"),
]


@pytest.fixture
def text() -> stores.Text:
    return stores.random_text(seed=11, tokens=3000, types=120, n_documents=14)


@pytest.fixture
def workers_for_small_texts(monkeypatch: pytest.MonkeyPatch) -> None:
    """Worker processes even where they are not worth starting."""
    monkeypatch.setattr(tallying, "_WORTH_A_PROCESS", 1)


def as_cells(block: PairBlock) -> brute.Cells:
    """Directed cells of pairs, zeros left out."""
    cells: brute.Cells = {}
    for low, high, forward, backward in zip(block.low, block.high, block.forward, block.backward, strict=True):
        assert low <= high
        if forward:
            cells[int(low), int(high)] = int(forward)
        if backward:
            assert low < high
            cells[int(high), int(low)] = int(backward)
    return cells


def table(tally: Tally) -> brute.Cells:
    """All cells; both orders of the pages must agree."""
    low = [as_cells(block) for block in tally.blocks("low")]
    high = [as_cells(block) for block in tally.blocks("high")]
    cells = {pair: count for part in low for pair, count in part.items()}
    assert sum(map(len, low)) == len(cells)
    assert cells == {pair: count for part in high for pair, count in part.items()}
    return cells


def expected(text: stores.Text, spec: TallySpec, terms: list[int]) -> tuple[brute.Cells, list[int], list[int], int]:
    """Cells, margins and total by the definitions."""
    starts = text.starts(spec.inside)
    n_terms = 120 if spec.layer == "form" else 60
    if spec.kind == "unit":
        cells = brute.units(terms, starts)
        cells |= {(y, x): count for (x, y), count in cells.items()}
        units = [{term for term in unit if term != NO_TERM} for unit in brute.units_of(terms, starts)]
        holding = Counter(term for unit in units for term in unit)
        margin = [holding[term] for term in range(n_terms)]
        return cells, margin, margin, sum(map(bool, units))
    if spec.kind == "positions":
        cells = brute.positions(terms, starts, spec.left, spec.right)
        seen = Counter(term for term in terms if term != NO_TERM)
        total = sum(seen.values())
        first = [seen[term] for term in range(n_terms)]
    else:
        cells = brute.windows_fast(terms, starts, spec.left, spec.right)
        total = sum(cells.values())
        first = [0] * n_terms
        for (x, _), count in cells.items():
            first[x] += count
    second = [0] * n_terms
    for (_, y), count in cells.items():
        second[y] += count
    return cells, first, second, total


def check(tally: Tally, text: stores.Text, terms: list[int] | None = None) -> None:
    """The tally is what the definitions give."""
    if terms is None:
        terms = text.types.tolist() if tally.spec.layer == "form" else stores.folded(text)
    cells, first, second, total = expected(text, tally.spec, terms)
    assert table(tally) == cells
    assert tally.first.tolist() == first
    assert tally.second.tolist() == second
    assert tally.total == total
    assert tally.n_pairs == len({(min(pair), max(pair)) for pair in cells})


def temporary(folder: Path) -> list[str]:
    """What lies beside a store and does not belong there."""
    return [path.name for path in folder.iterdir() if ".tmp-" in path.name]


@pytest.mark.parametrize("spec", SPECS, ids=TallySpec.to_json)
def test_counts_are_those_of_the_definition(tmp_path: Path, text: stores.Text, spec: TallySpec) -> None:
    with stores.make_store(tmp_path / "s", text, [700, 701, 1900]) as store:
        check(obtain_tally(store, spec, jobs=1), text)
        assert temporary(tmp_path) == []


@pytest.mark.usefixtures("workers_for_small_texts")
@pytest.mark.parametrize("jobs", [2, 3])
@pytest.mark.parametrize("spec", [SPECS[2], SPECS[8], SPECS[11]], ids=TallySpec.to_json)
def test_workers_count_the_same(tmp_path: Path, text: stores.Text, spec: TallySpec, jobs: int) -> None:
    with stores.make_store(tmp_path / "s", text, [700, 1900, 1901]) as store:
        check(obtain_tally(store, spec, jobs=jobs), text)
        assert temporary(tmp_path) == []
