"""The PPMI matrix against a dense one computed word by word, and against a published matrix."""

from __future__ import annotations

import json
import math
from collections import Counter
from pathlib import Path

import numpy as np
import pytest
import scipy.io
import scipy.sparse

import colloc
from colloc.errors import CannotCreateError, UsageError

SENTENCES = [
    "thick fog at dawn",
    "the fog horn sounded twice and thick fog came back",
    "heavy rain fell at dawn and heavy heavy rain fell again",
    "the ferry leaves at dawn",
]


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("matrix")
    (folder / "a.txt").write_text("\n".join(f"{sentence}." for sentence in SENTENCES), encoding="utf-8")
    colloc.build(folder / "s.colloc", str(folder / "a.txt"), tally=colloc.TallySpec(right=2), jobs=1)
    return folder / "s.colloc"


def dense(directed: bool, shift: float, smoothing: float) -> dict[tuple[str, str], float]:
    """max(log2(p(x,y) / (p(x) p_a(y))) - log2 shift, 0) from lists of words: Levy, Goldberg & Dagan (2015), 3.2."""
    cells: Counter[tuple[str, str]] = Counter()
    for words in map(str.split, SENTENCES):
        for i, first in enumerate(words):
            for second in words[i + 1 : i + 3]:
                cells[first, second] += 1
                if not directed:
                    cells[second, first] += 1
    total = cells.total()
    rows, columns = Counter[str](), Counter[str]()
    for (first, second), count in cells.items():
        rows[first] += count
        columns[second] += count
    mass = sum(count**smoothing for count in columns.values())
    values = {
        (x, y): math.log2(count / total / (rows[x] / total * (columns[y] ** smoothing / mass))) - math.log2(shift)
        for (x, y), count in cells.items()
    }
    return {cell: value for cell, value in values.items() if value > 1e-12}


@pytest.mark.parametrize("directed", [False, True])
@pytest.mark.parametrize(("shift", "smoothing"), [(1.0, 1.0), (2.0, 1.0), (1.0, 0.75), (3.0, 0.5)])
def test_matrix_is_the_dense_one(store: Path, tmp_path: Path, directed: bool, shift: float, smoothing: float) -> None:
    made = colloc.matrix(store, tmp_path / "m", directed=directed, shift=shift, smoothing=smoothing)
    expected = dense(directed, shift, smoothing)
    cells = made.values.tocoo()
    found = {
        (made.rows[row], made.columns[column]): value
        for row, column, value in zip(*cells.coords, cells.data, strict=True)
    }
    assert found.keys() == expected.keys()
    for cell, value in found.items():
        assert value == pytest.approx(expected[cell], abs=1e-12)


def test_the_files_are_read_back_equal(store: Path, tmp_path: Path) -> None:
    made = colloc.matrix(store, tmp_path / "m.x", shift=1.5)
    assert sorted(path.name for path in tmp_path.iterdir()) == [
        "m.x.mtx",
        "m.x.mtx.labels.json",
        "m.x.mtx.settings.json",
        "m.x.npz",
        "m.x.npz.labels.json",
        "m.x.npz.settings.json",
    ]
    loaded = scipy.sparse.load_npz(tmp_path / "m.x.npz")
    np.testing.assert_array_equal(loaded.toarray(), made.values.toarray())
    np.testing.assert_array_equal(scipy.io.mmread(tmp_path / "m.x.mtx").toarray(), made.values.toarray())
    labels = json.loads((tmp_path / "m.x.npz.labels.json").read_text())
    assert labels == {"rows": made.rows, "columns": made.columns}
    settings = json.loads((tmp_path / "m.x.mtx.settings.json").read_text())["settings"]
    assert (settings["shift"], settings["right"], settings["layer"]) == (1.5, 2, "fold")


def test_a_second_file_of_the_same_stem_leaves_the_labels_of_the_first(store: Path, tmp_path: Path) -> None:
    first = colloc.matrix(store, tmp_path / "m", rows=["fog", "heavy"])
    second = colloc.matrix(store, tmp_path / "m.mtx", rows=["dawn", "fog", "at"])
    for ending, made in (("npz", first), ("mtx", second)):
        labels = json.loads((tmp_path / f"m.{ending}.labels.json").read_text())
        assert labels == {"rows": made.rows, "columns": made.columns}
        settings = json.loads((tmp_path / f"m.{ending}.settings.json").read_text())["settings"]
        assert settings["rows"] == made.settings["rows"]
    assert scipy.sparse.load_npz(tmp_path / "m.npz").shape == (2, len(first.columns))


def test_thresholds_leave_the_margins(store: Path, tmp_path: Path) -> None:
    whole = colloc.matrix(store, tmp_path / "a")
    some = colloc.matrix(store, tmp_path / "b", min_count=2)
    assert 0 < some.values.nnz < whole.values.nnz
    places = [whole.rows.index(word) for word in some.rows]
    part = whole.values.toarray()[np.ix_(places, places)]
    kept = some.values.toarray()
    np.testing.assert_array_equal(kept[kept > 0], part[kept > 0])
    frequent = colloc.matrix(store, tmp_path / "c", min_row_count=3, min_context_count=3)
    assert frequent.rows
    assert set(frequent.rows) <= {"fog", "at", "dawn", "heavy", "and", "the"}
    nothing = colloc.matrix(store, tmp_path / "d", min_count=1000)
    assert nothing.values.shape == (0, 0)


def test_values_out_of_range(store: Path, tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="shift must be above 0"):
        colloc.matrix(store, tmp_path / "m", shift=0)
    with pytest.raises(UsageError, match="between 0 and 1"):
        colloc.matrix(store, tmp_path / "m", smoothing=1.5)
    with pytest.raises(CannotCreateError, match="cannot write"):
        colloc.matrix(store, tmp_path / "missing" / "m")
    assert list(tmp_path.iterdir()) == []
