"""Tallies against a plain dictionary: random changes, compaction, reopening; then each question on its own."""

from __future__ import annotations

import contextlib
import random
from collections import Counter
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from hypothesis.stateful import RuleBasedStateMachine, initialize, invariant, rule

from colloc.errors import StoreDamagedError, UsageError
from colloc.settings import TallySpec
from colloc.store import tallies
from colloc.store.opening import open_for_reading, open_for_writing
from colloc.store.pages import ORDERS, keys_of
from colloc.store.paging.runs import merge_blocks

from .making import Cells, block_of, cells_of, margins_of, store_of_terms, table_of, write_tally

TERMS = 12
SPEC = TallySpec(layer="form", right=3)
OTHER = TallySpec(layer="form", right=4)
CELLS = st.dictionaries(
    st.tuples(st.integers(0, TERMS - 1), st.integers(0, TERMS - 1)), st.integers(1, 2**40), min_size=1, max_size=40
)


class TallyAgainstDictionary(RuleBasedStateMachine):
    """Adds, removes, compacts and reopens; the dictionary does the same."""

    folder: Path

    @initialize(cells=CELLS, pages=st.integers(1, 9))
    def begin(self, cells: Cells, pages: int) -> None:
        self.store = store_of_terms(self.folder, TERMS)
        self.model: Counter[tuple[int, int]] = Counter(cells)
        self.pages = pages
        write_tally(self.store, SPEC, cells, pairs_a_page=pages)

    @rule(cells=CELLS)
    def add(self, cells: Cells) -> None:
        write_tally(self.store, SPEC, cells, delta=True, pairs_a_page=self.pages)
        self.model.update(cells)

    @rule(data=st.data())
    def remove(self, data: st.DataObject) -> None:
        present = {pair: count for pair, count in self.model.items() if count}
        if not present:
            return
        chosen = data.draw(st.lists(st.sampled_from(sorted(present)), min_size=1, unique=True))
        gone = {pair: -data.draw(st.integers(1, present[pair])) for pair in chosen}
        write_tally(self.store, SPEC, gone, delta=True, pairs_a_page=self.pages)
        self.model.update(gone)

    @rule(cells=CELLS)
    def merge(self, cells: Cells) -> None:
        write_tally(self.store, OTHER, cells)
        assert table_of(self.store, OTHER) == cells
        write_tally(self.store, SPEC, table_of(self.store, OTHER), delta=True)
        tallies.drop(self.store, OTHER)
        self.model.update(cells)

    @rule(share=st.sampled_from([0.0, 0.25, 1.0]))
    def compact(self, share: float) -> None:
        before = tallies.find(self.store, SPEC)
        assert before is not None
        with self.store.transaction():
            assert tallies.compact(self.store, SPEC, share) == (before.change_share > share)

    @rule()
    def reopen(self) -> None:
        path = self.store.path
        self.store.close()
        self.store = open_for_writing(path, "test")

    @invariant()
    def agrees(self) -> None:
        model = {pair: count for pair, count in self.model.items() if count}
        tally = tallies.find(self.store, SPEC)
        assert tally is not None
        assert tally.total == sum(model.values())
        first, second = margins_of(model)
        assert tally.first.tolist() == [first[term] for term in range(TERMS)]
        assert tally.second.tolist() == [second[term] for term in range(TERMS)]
        for order in ORDERS:
            blocks = list(tally.blocks(order))
            keys = [int(key) for block in blocks for key in keys_of(block, order)]
            assert keys == sorted(set(keys))
            assert Counter({pair: n for block in blocks for pair, n in cells_of(block).items()}) == Counter(model)
            assert all((block.forward != 0).any() or (block.backward != 0).any() for block in blocks)
        assert tally.n_pairs == len({(min(pair), max(pair)) for pair in model})
        for term in range(TERMS):
            assert cells_of(tally.around(term)) == {pair: n for pair, n in model.items() if term in pair}
        grid = [(low, high) for high in reversed(range(TERMS)) for low in range(high + 1)] * 2
        low, high = np.array(grid, dtype=np.uint32).T
        answer = tally.pairs(low, high)
        assert list(zip(answer.low.tolist(), answer.high.tolist(), strict=True)) == grid
        assert answer.forward.tolist() == [model.get((x, y), 0) for x, y in grid]
        assert answer.backward.tolist() == [model.get((y, x), 0) if x != y else 0 for x, y in grid]

    def teardown(self) -> None:
        if hasattr(self, "store"):
            self.store.close()


def test_tally_against_dictionary(tmp_path: Path) -> None:
    machine = type("Machine", (TallyAgainstDictionary,), {"folder": tmp_path})
    machine.TestCase.settings = settings(
        max_examples=10, stateful_step_count=8, suppress_health_check=list(HealthCheck)
    )
    machine.TestCase("runTest").runTest()


@given(st.lists(CELLS, max_size=4), st.sampled_from(ORDERS))
def test_merging_blocks_adds_cells(tables: list[Cells], order: str) -> None:
    total: Counter[tuple[int, int]] = Counter()
    for cells in tables:
        total.update(cells)
    assert cells_of(merge_blocks([block_of(cells) for cells in tables], order)) == dict(total)  # type: ignore[arg-type]


def test_pages_of_the_real_size(tmp_path: Path) -> None:
    generator = random.Random(3)
    pairs = {(generator.randrange(900), generator.randrange(900)) for _ in range(75_000)}
    cells = {pair: generator.choice([1, 1, 1, 2, 700]) for pair in pairs}
    store = store_of_terms(tmp_path, 900)
    write_tally(store, SPEC, cells, pairs_a_page=65_536)
    assert store.value("SELECT count(*) FROM tally_pages") == 4
    write_tally(store, SPEC, {pair: -cells[pair] for pair in list(cells)[:50]}, delta=True)
    for pair in list(cells)[:50]:
        del cells[pair]
    assert table_of(store, SPEC) == cells
    with store.transaction():
        assert tallies.compact(store, SPEC, 0.0)
    assert table_of(store, SPEC) == cells
    assert [entry.n_pairs for entry in tallies.tally_list(store)] == [len({(min(p), max(p)) for p in cells})]
    store.close()


def test_only_the_pages_needed_are_read(tmp_path: Path) -> None:
    store = store_of_terms(tmp_path, 100)
    write_tally(store, SPEC, {(x, y): 1 for x in range(100) for y in range(x, 100, 9)}, pairs_a_page=20)
    pages = store.value("SELECT count(*) FROM tally_pages")
    tally = tallies.find(store, SPEC)
    assert tally is not None
    read: list[str] = []
    store.connection.set_trace_callback(lambda sql: read.append(sql) if "FROM tally_pages" in sql else None)
    tally.around(50)
    tally.pairs(np.array([3], dtype=np.uint32), np.array([12], dtype=np.uint32))
    store.connection.set_trace_callback(None)
    assert 3 <= len(read) <= 6 < pages
    store.close()


def test_a_failed_write_leaves_the_old_table(tmp_path: Path) -> None:
    store = store_of_terms(tmp_path, 5)
    write_tally(store, SPEC, {(0, 1): 2})
    with contextlib.suppress(KeyboardInterrupt), store.transaction():
        writer = tallies.TallyWriter(store, SPEC)
        for order in ORDERS:
            writer.add_block(order, block_of({(3, 4): 1}, order))
        writer.finish(1)
        raise KeyboardInterrupt
    assert table_of(store, SPEC) == {(0, 1): 2}
    store.close()


def test_writing_again_takes_the_place_of_the_old_table(tmp_path: Path) -> None:
    store = store_of_terms(tmp_path, 5)
    write_tally(store, SPEC, {(0, 1): 2})
    write_tally(store, SPEC, {(0, 2): 1}, delta=True)
    write_tally(store, SPEC, {(3, 4): 1})
    assert table_of(store, SPEC) == {(3, 4): 1}
    assert store.value("SELECT count(*) FROM tally_runs") == 1
    assert store.value("SELECT count(*) FROM tally_pages") == 2
    store.close()


def test_a_change_needs_a_table_and_orders_must_agree(tmp_path: Path) -> None:
    store = store_of_terms(tmp_path, 5)
    with pytest.raises(UsageError, match="no such tally to change"):
        write_tally(store, SPEC, {(0, 1): 1}, delta=True)
    with pytest.raises(RuntimeError, match="inside a transaction"):
        tallies.TallyWriter(store, SPEC)
    with store.transaction():
        writer = tallies.TallyWriter(store, SPEC)
        writer.add_block("low", block_of({(0, 2): 1}))
        with pytest.raises(ValueError, match="must ascend"):
            writer.add_block("low", block_of({(0, 1): 1}))
        with pytest.raises(ValueError, match="two orders differ"):
            writer.finish(1)
    store.close()


def test_cache_limit_drops_the_least_recently_used(tmp_path: Path) -> None:
    store = store_of_terms(tmp_path, 5)
    specs = [TallySpec(layer="form", right=right) for right in (1, 2, 3, 4)]
    for number, spec in enumerate(specs):
        write_tally(store, spec, {(0, 1): 1, (1, 2): 300}, kept=number == 0)
        store.execute("UPDATE tallies SET last_used = ? WHERE spec = ?", (100 + number, spec.to_json()))
    store.execute("UPDATE tallies SET last_used = 200 WHERE spec = ?", (specs[1].to_json(),))
    size = tallies.tally_list(store)[0].n_bytes
    assert size == store.value(
        "SELECT (SELECT sum(length(data)) FROM tally_pages WHERE run = 1) "
        "+ (SELECT sum(length(numbers) + length(first) + length(second)) FROM margin_pages WHERE run = 1)"
    )
    assert tallies.limit_cache(store, 2 * size) == [specs[2]]
    assert tallies.limit_cache(store, 2 * size) == []
    tallies.set_kept(store, specs[3])
    assert tallies.limit_cache(store, 0) == [specs[1]]
    assert [entry.spec for entry in tallies.tally_list(store)] == [specs[0], specs[3]]
    store.close()


def test_using_a_cached_tally_is_noted_only_by_writers(tmp_path: Path) -> None:
    store = store_of_terms(tmp_path, 5)
    write_tally(store, SPEC, {(0, 1): 1})
    store.execute("UPDATE tallies SET last_used = 5")
    with open_for_reading(store.path) as reader:
        assert tallies.find(reader, SPEC) is not None
        assert reader.value("SELECT last_used FROM tallies") == 5
    tallies.find(store, SPEC)
    assert store.value("SELECT last_used FROM tallies") == 5, "kept for good: a look at it changes nothing"
    store.execute("UPDATE tallies SET kept = 0")
    tallies.find(store, SPEC)
    assert store.value("SELECT last_used FROM tallies") > 5
    store.close()


def test_terms_that_the_layer_does_not_have_are_damage(tmp_path: Path) -> None:
    store = store_of_terms(tmp_path, 5)
    write_tally(store, SPEC, {(0, 7): 1})
    tally = tallies.find(store, SPEC)
    assert tally is not None
    with pytest.raises(StoreDamagedError, match="terms that the layer does not have"):
        tally.around(0)
    with pytest.raises(StoreDamagedError, match="out of range"):
        _ = tally.first
    store.close()
