"""Matrices of chosen words, of weighted windows and of other values, against counts made word by word."""

from __future__ import annotations

import json
import math
from collections import Counter
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.io import mmread
from scipy.sparse import load_npz

import colloc
from colloc.answers.spaces.rows import RowCells, cells_by_row
from colloc.answers.spaces.weighting import distance_weights
from colloc.errors import UsageError
from colloc.exports.matrices import write_matrix
from colloc.records import PairBlock

SENTENCES = [
    "thick fog at dawn and thick fog at sea",
    "the fog horn sounded twice and thick fog came back",
    "heavy rain fell at dawn and heavy heavy rain fell again",
    "the ferry leaves at dawn for the sea",
]
WINDOW = 4


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("choices")
    (folder / "a.txt").write_text("\n".join(f"{sentence}." for sentence in SENTENCES), encoding="utf-8")
    colloc.build(folder / "s.colloc", str(folder / "a.txt"), tally=colloc.TallySpec(right=WINDOW), jobs=1)
    return folder / "s.colloc"


def weighted_counts(weights: list[float], directed: bool) -> Counter[tuple[str, str]]:
    """M[x, y], or M + transpose(M), with weights for the distances."""
    cells: Counter[tuple[str, str]] = Counter()
    for words in map(str.split, SENTENCES):
        for i, first in enumerate(words):
            for distance, second in enumerate(words[i + 1 : i + 1 + WINDOW], 1):
                cells[first, second] += weights[distance - 1]  # type: ignore[assignment]
                if not directed:
                    cells[second, first] += weights[distance - 1]  # type: ignore[assignment]
    return cells


def as_cells(made: object) -> dict[tuple[str, str], float]:
    cells = made.values.tocoo()  # type: ignore[attr-defined]
    rows, columns = made.rows, made.columns  # type: ignore[attr-defined]
    return {(rows[r], columns[c]): v for r, c, v in zip(*cells.coords, cells.data.tolist(), strict=True)}


WEIGHTS = {
    "flat": [1.0, 1.0, 1.0, 1.0],
    "harmonic": [1.0, 1 / 2, 1 / 3, 1 / 4],
    "linear": [1.0, 3 / 4, 2 / 4, 1 / 4],
}


@pytest.mark.parametrize("weighting", WEIGHTS)
@pytest.mark.parametrize("directed", [False, True])
def test_counts_and_ppmi_of_weighted_windows(store: Path, weighting: str, directed: bool) -> None:
    counts = weighted_counts(WEIGHTS[weighting], directed)
    found = as_cells(colloc.matrix(store, value="count", weighting=weighting, directed=directed))
    assert found == pytest.approx(dict(counts), abs=1e-12)
    total = sum(counts.values())
    rows, columns = Counter[str](), Counter[str]()
    for (first, second), count in counts.items():
        rows[first] += count
        columns[second] += count
    mass = sum(count**0.75 for count in columns.values())
    expected = {
        (x, y): math.log2(count / total / (rows[x] / total * columns[y] ** 0.75 / mass))
        for (x, y), count in counts.items()
    }
    made = as_cells(colloc.matrix(store, weighting=weighting, directed=directed, smoothing=0.75))
    for cell, value in expected.items():
        assert made.get(cell, 0.0) == pytest.approx(max(value, 0.0), abs=1e-12)


def test_unequal_reach_may_be_weighted(store: Path) -> None:
    """left 1, right 3, harmonic: x before y at distances 1 to 3, and after it at distance 1."""
    expected: Counter[tuple[str, str]] = Counter()
    for words in map(str.split, SENTENCES):
        for i, first in enumerate(words):
            for distance in range(1, 4):
                if i + distance < len(words):
                    expected[first, words[i + distance]] += 1 / distance  # type: ignore[assignment]
            if i:
                expected[first, words[i - 1]] += 1
    found = as_cells(colloc.matrix(store, value="count", weighting="harmonic", left=1, right=3))
    assert found == pytest.approx(dict(expected), abs=1e-12)


def test_weights_by_distance() -> None:
    assert [float(weight) for weight in distance_weights("harmonic", 4)] == WEIGHTS["harmonic"]
    assert [float(weight) for weight in distance_weights("linear", 4)] == WEIGHTS["linear"]
    with pytest.raises(UsageError, match="weighting must be one of flat, harmonic, linear"):
        distance_weights("steep", 4)


@pytest.mark.parametrize("value", ["npmi", "g2"])
def test_other_values_are_those_of_pairs(store: Path, value: str) -> None:
    rows = colloc.pairs(store, min_count=1, limit=0, show=[value], any_strength=True)
    found = as_cells(colloc.matrix(store, value=value))
    for row in rows:
        if row[value]:
            assert found[row["first"], row["second"]] == row[value]
            assert found[row["second"], row["first"]] == pytest.approx(row[value], abs=1e-12)
    off = sum(1 for row in rows if row["first"] != row["second"] and row[value])
    assert len(found) == 2 * off + sum(1 for row in rows if row["first"] == row["second"] and row[value])


def test_lists_keep_their_order_and_unknown_words_have_empty_rows(store: Path) -> None:
    whole = as_cells(colloc.matrix(store))
    rows, contexts = ["sea", "whale", "fog"], ["at", "Thick", "kraken"]
    made = colloc.matrix(store, rows=rows, contexts=contexts)
    assert (made.rows, made.columns) == (rows, contexts)
    dense = made.values.toarray()
    for i, row in enumerate(rows):
        for j, column in enumerate(contexts):
            assert dense[i, j] == whole.get((row, column.lower()), 0.0)
    assert dense.any()
    with pytest.raises(UsageError, match="'Fog' and 'fog' are one word in the layer 'fold'"):
        colloc.matrix(store, rows=["Fog", "fog"])
    with pytest.raises(UsageError, match="the list names 'fog' twice"):
        colloc.matrix(store, rows=["fog", "fog"])
    with pytest.raises(UsageError, match="by a list or by frequency"):
        colloc.matrix(store, rows=["fog"], most_rows=3)


def test_frequency_chooses_rows_and_contexts(store: Path) -> None:
    whole = as_cells(colloc.matrix(store))
    frequency = Counter(word for sentence in SENTENCES for word in sentence.split())
    made = colloc.matrix(store, min_row_count=3, most_contexts=2)
    often = {word for word, count in frequency.items() if count >= 3}
    two = {"fog", "at"}  # 4 times each: the first two by frequency, then by first appearance
    assert [frequency[word] for word in sorted(two)] == [4, 4]
    assert as_cells(made) == {cell: v for cell, v in whole.items() if cell[0] in often and cell[1] in two}


def test_thresholds_of_cells(store: Path) -> None:
    whole = as_cells(colloc.matrix(store))
    counts = weighted_counts(WEIGHTS["flat"], False)
    assert as_cells(colloc.matrix(store, min_value=1.5)) == {c: v for c, v in whole.items() if v >= 1.5}
    halved = {cell: count / 2 if cell[0] == cell[1] else count for cell, count in counts.items()}
    assert as_cells(colloc.matrix(store, min_count=2)) == {c: v for c, v in whole.items() if halved[c] >= 2}


def test_what_does_not_go_together(store: Path) -> None:
    with pytest.raises(UsageError, match="shift and smoothing belong to ppmi"):
        colloc.matrix(store, value="npmi", smoothing=0.75)
    with pytest.raises(UsageError, match="g2 needs counts that are not weighted"):
        colloc.matrix(store, value="g2", weighting="linear")
    with pytest.raises(UsageError, match="is for windows"):
        colloc.matrix(store, unit=True, weighting="linear")
    with pytest.raises(UsageError, match="value must be one of"):
        colloc.matrix(store, value="pmi")  # type: ignore[arg-type]


@pytest.mark.parametrize("ending", ["npz", "mtx", "arrow"])
def test_one_file_by_its_ending(store: Path, tmp_path: Path, ending: str) -> None:
    import pyarrow as pa

    made = colloc.matrix(store, smoothing=0.75)
    paths = write_matrix(made, tmp_path / f"m.{ending}")
    assert sorted(path.name for path in tmp_path.iterdir()) == sorted(path.name for path in paths)
    assert {path.name for path in paths} == {f"m.{ending}{beside}" for beside in ("", ".labels.json", ".settings.json")}
    dense = made.values.toarray()
    if ending == "npz":
        found = load_npz(tmp_path / "m.npz").toarray()
    elif ending == "mtx":
        found = mmread(tmp_path / "m.mtx").toarray()
    else:
        with pa.ipc.open_file(str(tmp_path / "m.arrow")) as file:
            cells = file.read_all().to_pydict()
        found = np.zeros_like(dense)
        found[cells["row"], cells["column"]] = cells["value"]
    np.testing.assert_array_equal(found, dense)
    assert json.loads((tmp_path / f"m.{ending}.settings.json").read_text())["settings"]["smoothing"] == 0.75


@given(
    st.lists(st.tuples(st.integers(0, 12), st.integers(0, 12), st.integers(1, 9), st.integers(0, 9)), max_size=60),
    st.booleans(),
    st.integers(1, 7),
)
def test_cells_come_in_the_order_of_a_matrix(drawn: list[tuple[int, int, int, int]], ordered: bool, size: int) -> None:
    """Pages of any size, rows that go over several pages, in either order: against a dense table."""
    pairs = {(min(a, b), max(a, b)): (f, 0 if a == b else r) for a, b, f, r in drawn}
    dense = np.zeros((13, 13))
    for (low, high), (forward, backward) in pairs.items():
        if ordered:
            dense[low, high] += forward
            dense[high, low] += backward
        else:
            dense[low, high] = dense[high, low] = forward + backward

    class Pages:
        def blocks(self, order: str = "low") -> object:
            rows = sorted(pairs, key=lambda pair: pair if order == "low" else pair[::-1])
            for start in range(0, len(rows), size):
                part = rows[start : start + size]
                low, high = np.array(part, np.uint32).T
                forward, backward = np.array([pairs[pair] for pair in part]).T
                yield PairBlock(low, high, forward, backward)

    found: list[RowCells] = list(cells_by_row(Pages(), ordered, False))  # type: ignore[arg-type]
    places = [(int(r), int(c)) for part in found for r, c in zip(part.rows, part.columns, strict=True)]
    assert places == sorted(places)
    assert places == [tuple(place) for place in np.argwhere(dense > 0).tolist()]
    assert [int(v) for part in found for v in part.joint] == dense[dense > 0].tolist()
