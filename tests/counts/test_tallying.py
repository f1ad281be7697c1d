"""Tallies counted from a stored stream equal the definitions, however the work is cut."""

from __future__ import annotations

import dataclasses
import gc
from collections import Counter
from pathlib import Path

import numpy as np
import pytest

from colloc.counts import counting, tallying
from colloc.counts.budget import Budget
from colloc.counts.tallying import count_change, obtain_tally
from colloc.errors import UsageError
from colloc.records import NO_TERM, PairBlock
from colloc.settings import TallySpec
from colloc.store import documents, tallies, visibility
from colloc.store.connection import Store
from colloc.store.opening import open_for_reading
from colloc.store.tallies import Tally
from colloc.store.vocabulary import word_counts
from tests.counts import brute, stores

pytestmark = pytest.mark.usefixtures("loops")

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
    n_terms = text.n_types if spec.layer == "form" else text.n_types // 2
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


@pytest.mark.usefixtures("workers_for_small_texts")
@pytest.mark.parametrize("jobs", [1, 2])
def test_small_parts_count_the_same(
    tmp_path: Path, text: stores.Text, monkeypatch: pytest.MonkeyPatch, jobs: int
) -> None:
    """Many runs, many ranges, hardly any table: what a large corpus does with little memory."""
    monkeypatch.setattr(tallying, "plan_memory", lambda *_: Budget(pending=97, cells=50, entries=300))
    monkeypatch.setattr(counting, "_LARGEST_SHARE", 500)
    monkeypatch.setattr(counting, "_LEAST_RANGE", 16)
    with stores.make_store(tmp_path / "s", text, [512, 700, 1900]) as store:
        for spec in (SPECS[2], SPECS[5], SPECS[7], SPECS[9]):
            check(obtain_tally(store, spec, jobs=jobs), text)


def test_no_text_no_counts(tmp_path: Path) -> None:
    empty = stores.Text(np.empty(0, np.uint32), stores.NOTHING, stores.NOTHING, stores.NOTHING, 4)
    with stores.make_store(tmp_path / "s", empty) as store:
        for spec in SPECS:
            tally = obtain_tally(store, spec)
            assert (tally.total, tally.n_pairs, tally.first.tolist()) == (0, 0, [0] * len(tally.first))


def test_found_again_not_counted_again(tmp_path: Path, text: stores.Text, monkeypatch: pytest.MonkeyPatch) -> None:
    with stores.make_store(tmp_path / "s", text) as store:
        obtain_tally(store, SPECS[2], keep=False)
        assert [entry.kept for entry in tallies.tally_list(store)] == [False]
        monkeypatch.setattr(tallying, "count_tally", None)
        check(obtain_tally(store, SPECS[2], keep=True), text)
        assert [entry.kept for entry in tallies.tally_list(store)] == [True]


def test_where_the_store_is_only_read_the_tally_lies_aside(tmp_path: Path, text: stores.Text) -> None:
    stores.make_store(tmp_path / "s", text).close()
    before = (tmp_path / "s").read_bytes()
    with open_for_reading(tmp_path / "s") as store:
        tally = obtain_tally(store, SPECS[2])
        check(tally, text)
        assert len(temporary(tmp_path)) == 1
        del tally
        gc.collect()
        assert temporary(tmp_path) == []
    tally = obtain_tally(tmp_path / "s", SPECS[3], temp=tmp_path)
    check(tally, text)
    del tally
    gc.collect()
    assert temporary(tmp_path) == []
    assert (tmp_path / "s").read_bytes() == before


def test_a_slice_counts_its_documents_only(tmp_path: Path, text: stores.Text) -> None:
    chosen = text.types.copy()
    for number, (begin, stop) in enumerate(text.document_bounds()):
        if number % 2:
            chosen[begin:stop] = NO_TERM
    with stores.make_store(tmp_path / "s", text, [700, 1500]) as store:
        for spec in SPECS:
            tally = obtain_tally(store, dataclasses.replace(spec, where="half=a"), jobs=1)
            check(tally, dataclasses.replace(text, types=chosen))


def test_unknown_slices_and_layers_are_refused(tmp_path: Path, text: stores.Text) -> None:
    with stores.make_store(tmp_path / "s", text) as store:
        with pytest.raises(UsageError, match="nonsense"):
            obtain_tally(store, TallySpec(where="nonsense=1"))
        with pytest.raises(UsageError, match="layer"):
            obtain_tally(store, TallySpec(layer="nonsense"))
        with pytest.raises(UsageError, match="annotated text"):
            obtain_tally(store, TallySpec(kind="relation", right=0))
        with pytest.raises(UsageError, match="memory must be at least 64 MB"):
            obtain_tally(store, TallySpec(), memory=1000)
        assert tallies.tally_list(store) == []
        assert temporary(tmp_path) == []


def grow(store: Store, more: stores.Text, specs: list[TallySpec]) -> None:
    with store.transaction():
        stores.append(store, more, [400])
    count_change(store, specs, visibility.uncounted(store), sign=1, finish=lambda: visibility.show_all(store))


def whole(one: stores.Text, other: stores.Text) -> stores.Text:
    parts = [
        np.concatenate([getattr(one, name), getattr(other, name) + len(one.types)])
        for name in ("sentences", "paragraphs", "documents")
    ]
    return stores.Text(np.concatenate([one.types, other.types]), *parts, one.n_types)


def check_words(store: Store, text: stores.Text, terms: list[int]) -> None:
    """Word counts of `fold` by plain counting."""
    counts = word_counts(store, "fold")
    tokens = Counter(term for term in terms if term != NO_TERM)
    holding = Counter(
        term for begin, stop in text.document_bounds() for term in set(terms[begin:stop]) if term != NO_TERM
    )
    assert counts.tokens.tolist() == [tokens[term] for term in range(60)]
    assert counts.documents.tolist() == [holding[term] for term in range(60)]


def test_two_halves_are_the_whole_and_the_first_half_again(tmp_path: Path, text: stores.Text) -> None:
    more = stores.random_text(seed=12, tokens=900, types=120, n_documents=5)
    both = whole(text, more)
    with stores.make_store(tmp_path / "s", text, [700]) as store:
        count_change(store, SPECS, np.arange(14), sign=1, finish=lambda: None)
        check_words(store, text, stores.folded(text))
        obtain_tally(store, TallySpec(right=7), keep=False)
        grow(store, more, SPECS)
        assert [entry.spec for entry in tallies.tally_list(store)] == SPECS, "what nobody asked for would be stale"
        for spec in SPECS:
            check(obtain_tally(store, spec), both)
        check_words(store, both, stores.folded(both))

        added = np.arange(14, 19)

        def remove() -> None:
            for number in added.tolist():
                documents.remove_document(store, number)

        count_change(store, SPECS, added, sign=-1, finish=remove)
        for spec in SPECS:
            check(obtain_tally(store, spec), text)
        check_words(store, text, stores.folded(text))
        # counted afresh from what is left of the stream
        for spec in SPECS:
            tallies.drop(store, spec)
            check(obtain_tally(store, spec), text)
        assert temporary(tmp_path) == []


def test_slices_that_are_kept_follow_changes(tmp_path: Path, text: stores.Text) -> None:
    more = stores.random_text(seed=13, tokens=900, types=120, n_documents=4)
    spec = TallySpec(where="half=b")
    with stores.make_store(tmp_path / "s", text) as store:
        count_change(store, [spec], np.arange(14), sign=1, finish=lambda: None)
        grow(store, more, [spec])
        changed = table(obtain_tally(store, spec))
        tallies.drop(store, spec)
        assert changed == table(obtain_tally(store, spec)) != {}


def test_documents_still_being_added_are_not_counted(tmp_path: Path, text: stores.Text) -> None:
    more = stores.random_text(seed=12, tokens=900, types=120, n_documents=5)
    with stores.make_store(tmp_path / "s", text) as store:
        with store.transaction():
            stores.append(store, more)
        check(obtain_tally(store, SPECS[2]), text)


def test_progress_runs_to_the_end(tmp_path: Path, text: stores.Text) -> None:
    told: list[tuple[float, int, str]] = []
    with stores.make_store(tmp_path / "s", text) as store:
        obtain_tally(store, SPECS[2], progress=lambda *facts: told.append(facts))
    shares = [done for done, _, _ in told]
    assert shares == sorted(shares)
    assert (shares[0], shares[-1], told[-1][1]) == (0.0, 1.0, 3000)
    assert {phase for _, _, phase in told} == {"counting", "merging"}
