"""Vectors against numpy's dense decomposition and a textbook's matrix; likeness and agreement against scipy."""

from __future__ import annotations

import dataclasses
import json
from pathlib import Path

import numpy as np
import pytest
from scipy.sparse import block_diag, csr_array, random_array
from scipy.spatial.distance import cosine
from scipy.stats import spearmanr
from sklearn.utils.extmath import randomized_svd

import colloc
from colloc.answers.spaces.choosing import Choice, reliable_count
from colloc.answers.spaces.judged import judged_pairs
from colloc.answers.spaces.likeness import Space, similar
from colloc.answers.spaces.matrix import Matrix
from colloc.answers.spaces.reducing import leading_vectors, powers
from colloc.answers.spaces.vectors import VectorOptions, reduced
from colloc.errors import DataError, NoInputError, NotSeenError, UsageError
from colloc.exports.vectors import read_vectors, write_vectors
from colloc.measures.pmi import shifted_ppmi, smoothed_totals

CORPORA = Path(__file__).resolve().parents[3] / "corpora_demo"

# Jurafsky & Martin, Speech and Language Processing, 3rd edition draft, chapter on vector semantics.
COUNTS = np.array([[2, 8, 9, 442, 25], [0, 0, 1, 60, 19], [1670, 1683, 85, 5, 4], [3325, 3982, 378, 5, 13]])
ROWS = ["cherry", "strawberry", "digital", "information"]
COLUMNS = ["computer", "data", "result", "pie", "sugar"]


def textbook(shift: float = 1.0, smoothing: float = 1.0) -> Matrix:
    totals = smoothed_totals(COUNTS.sum(axis=0), smoothing)
    values = shifted_ppmi(COUNTS, COUNTS.sum(axis=1)[:, np.newaxis], totals, COUNTS.sum(), shift)
    return Matrix(csr_array(values), ROWS, COLUMNS, {"layer": "fold"})


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("vectors") / "demo.colloc"
    colloc.build(path, [str(CORPORA / "logbooks.jsonl")], jobs=1)
    return path


def test_the_textbook_matrix_in_fewer_dimensions() -> None:
    # Singular values and cosines were computed for the textbook's matrix with another program; four decimals.
    made = reduced(textbook(), VectorOptions(dimensions=4, power=1))
    np.testing.assert_allclose(made.singular, [8.7072, 1.2155, 0.2980, 0.1833], atol=5e-5)
    space = Space(made)
    cosines = space.cosines(np.array([0, 2]), np.array([1, 3]))
    np.testing.assert_allclose(cosines, [0.9598, 0.0786], atol=5e-5)
    np.testing.assert_allclose(Space(textbook()).cosines(np.array([0, 2]), np.array([1, 3])), cosines, atol=1e-12)


@pytest.mark.parametrize(
    ("shift", "smoothing", "cells"),
    [
        # Levy & Goldberg's shifted PPMI with k = 5, and alpha = 0.75, of the same matrix, computed likewise.
        (5.0, 1.0, {(0, 3): 2.0574, (0, 4): 0.9826, (1, 3): 1.7792, (1, 4): 3.1895}),
        (
            1.0,
            0.75,
            {
                (0, 3): 3.6434, (0, 4): 1.8013, (1, 3): 3.3653, (1, 4): 4.0082,
                (2, 0): 0.2697, (2, 1): 0.1436, (3, 0): 0.1031, (3, 1): 0.2260,
            },
        ),
    ],
)  # fmt: skip
def test_shifted_and_smoothed(shift: float, smoothing: float, cells: dict[tuple[int, int], float]) -> None:
    dense = textbook(shift, smoothing).values.toarray()
    for cell, value in cells.items():
        assert dense[cell] == pytest.approx(value, abs=5e-5)
    if shift == 5:
        assert np.count_nonzero(dense) == len(cells)


@pytest.mark.parametrize("shape", [(40, 60), (70, 25), (30, 30)])
@pytest.mark.parametrize("dimensions", [1, 7, 25])
def test_small_matrices_equal_numpys_decomposition(shape: tuple[int, int], dimensions: int) -> None:
    matrix = random_array(shape, density=0.3, rng=np.random.default_rng(sum(shape)), format="csr")
    left, values, right = leading_vectors(matrix, dimensions)
    u, s, v = np.linalg.svd(matrix.toarray(), full_matrices=False)
    np.testing.assert_allclose(values, s[:dimensions], atol=1e-10)
    np.testing.assert_allclose(np.abs((u[:, :dimensions] * left).sum(axis=0)), 1, atol=1e-8)
    np.testing.assert_allclose(np.abs((v[:dimensions] * right).sum(axis=1)), 1, atol=1e-8)
    largest = right[np.arange(dimensions), np.abs(right).argmax(axis=1)]
    assert (largest > 0).all()


def slow_spectrum(n: int) -> tuple[csr_array, np.ndarray]:
    """A sparse matrix with known singular values that fall slowly, as those of PPMI matrices do."""
    random = np.random.default_rng(5)
    values = np.arange(1, n + 1) ** -0.3
    return csr_array((values, (random.permutation(n), random.permutation(n))), shape=(n, n)), values


def test_large_matrices_come_as_close_as_the_reference_solver() -> None:
    """Energy kept, beside scikit-learn's solver; the exact rank-k matrix keeps most (Eckart & Young 1936)."""
    matrix, known = slow_spectrum(1500)
    exact = known[:40]
    left, values, right = leading_vectors(matrix, 40, seed=3)
    theirs = randomized_svd(matrix, 40, random_state=3)[1]
    assert (values**2).sum() <= (exact**2).sum() * (1 + 1e-9)
    assert (values**2).sum() >= (theirs**2).sum() * (1 - 1e-6)
    np.testing.assert_allclose(values[:10], exact[:10], rtol=0.01)
    np.testing.assert_allclose(left.T @ left, np.eye(40), atol=1e-6)
    np.testing.assert_allclose(right @ right.T, np.eye(40), atol=1e-6)


def test_equal_seeds_give_equal_vectors() -> None:
    matrix, _ = slow_spectrum(800)
    one, again, other = (leading_vectors(matrix, 10, seed=seed)[0] for seed in (1, 1, 2))
    np.testing.assert_array_equal(one, again)
    assert not np.array_equal(one, other)
    np.testing.assert_allclose(np.abs((one * other).sum(axis=0))[:3], 1, atol=1e-3)


def test_dimensions_that_are_not_there() -> None:
    with pytest.raises(UsageError, match="dimensions must be between 1 and 4"):
        reduced(textbook(), VectorOptions(dimensions=5))
    with pytest.raises(UsageError, match="power must be between 0 and 1"):
        VectorOptions(power=2)
    np.testing.assert_array_equal(powers(np.array([4.0, 1.0, 1e-17]), 0), [1, 1, 0])
    np.testing.assert_array_equal(powers(np.array([4.0, 1.0, 0.0]), 0.5), [2, 1, 0])


@pytest.mark.parametrize("power", [0, 0.5, 1])
def test_power_and_joined_contexts(demo: Path, power: float) -> None:
    made = colloc.matrix(demo, smoothing=0.75, most_rows=150, most_contexts=150)
    u, s, v = np.linalg.svd(made.values.toarray(), full_matrices=False)
    plain = colloc.vectors(demo, dimensions=8, power=power, most_rows=150, most_contexts=150)
    both = colloc.vectors(demo, dimensions=8, power=power, join_contexts=True, most_rows=150, most_contexts=150)
    assert plain.words == made.rows
    ours = u[:, :8] * s[:8] ** power
    np.testing.assert_allclose(plain.values @ plain.values.T, ours @ ours.T, atol=1e-6)
    joined = ours + v[:8].T * s[:8] ** power
    np.testing.assert_allclose(both.values @ both.values.T, joined @ joined.T, atol=1e-6)
    with pytest.raises(UsageError, match="is a row but no context"):
        colloc.vectors(demo, dimensions=2, most_contexts=5, join_contexts=True)


def test_written_vectors_come_back(demo: Path, tmp_path: Path) -> None:
    made = colloc.vectors(demo, tmp_path / "v", dimensions=6)
    beside = ("", ".labels.json", ".settings.json")
    assert sorted(p.name for p in tmp_path.iterdir()) == [f"v.{end}{more}" for end in ("npy", "txt") for more in beside]
    np.testing.assert_array_equal(np.load(tmp_path / "v.npy"), made.values.astype(np.float32))
    back = read_vectors(tmp_path / "v.npy")
    assert (back.words, back.settings) == (made.words, json.loads(json.dumps(made.settings)))
    lines = (tmp_path / "v.txt").read_text(encoding="utf-8").splitlines()
    assert len(lines) == len(made)
    word, *numbers = lines[7].split(" ")
    assert word == made.words[7]
    np.testing.assert_allclose(np.array(numbers, float), made.values[7], rtol=1e-5, atol=1e-6)
    paths = write_vectors(made, tmp_path / "w.txt")
    assert [path.name for path in paths] == [f"w.txt{more}" for more in beside]
    (tmp_path / "v.npy.labels.json").write_text('{"rows": ["a"]}', encoding="utf-8")
    with pytest.raises(DataError, match="numbers for 1 labels"):
        read_vectors(tmp_path / "v.npy")
    with pytest.raises(NoInputError, match=r"w\.npy: no such file"):
        read_vectors(tmp_path / "w.npy")
    np.save(tmp_path / "w.npy", np.array([{}], dtype=object), allow_pickle=True)
    with pytest.raises(DataError, match="not vectors"):
        read_vectors(tmp_path / "w.npy")


def test_nearest_words_by_scipys_cosine(demo: Path) -> None:
    made = colloc.matrix(demo, smoothing=0.75, min_row_count=5, min_context_count=5)
    dense = made.values.toarray()
    number = made.rows.index("fog")
    distances = [(cosine(dense[number], row), word) for row, word in zip(dense, made.rows, strict=True)]
    expected = [(word, 1 - distance) for distance, word in sorted(distances) if word != "fog"][:6]
    found = colloc.similar(demo, "Fog", limit=6)
    assert found["similar"].tolist() == [word for word, _ in expected]
    np.testing.assert_allclose(found["cosine"], [value for _, value in expected], atol=1e-12)
    # The first shared context has the largest product of values.
    best = made.columns[int((dense[number] * dense[made.rows.index(expected[0][0])]).argmax())]
    assert found["shared"][0].split(", ")[0] == best
    with pytest.raises(NotSeenError, match="'kraken' never occurs in layer 'fold'"):
        colloc.similar(demo, ["fog", "kraken"])
    by_vectors = colloc.similar(demo, "fog", vectors=colloc.vectors(demo, dimensions=20), limit=0)
    assert len(by_vectors) == len(made.rows) - 1
    assert (np.diff(by_vectors["cosine"]) <= 0).all()


def test_words_that_never_occur_are_told_from_rare_ones(demo: Path) -> None:
    with pytest.raises(NotSeenError, match=r"'kraken' never occurs in layer 'fold'; `colloc words .* 'kra\*'`"):
        colloc.similar(demo, "kraken")
    with pytest.raises(NotSeenError, match="'foggg' never occurs in layer 'fold'; did you mean 'fog'"):
        colloc.similar(demo, "foggg", vectors=colloc.vectors(demo, dimensions=5))
    few = colloc.vectors(demo, dimensions=5, most_rows=30)
    rare = next(row["word"] for row in colloc.words(demo, limit=0) if row["count"] == 3)
    with pytest.raises(NotSeenError, match=r"has no vector: .* 30 most frequent; make the vectors anew"):
        colloc.similar(demo, rare, vectors=few)


def test_contexts_of_another_store_are_not_shown_beside_vectors(demo: Path, tmp_path: Path) -> None:
    other = tmp_path / "other.colloc"
    text = tmp_path / "a.txt"
    text.write_text("The fog lay thick on the sea. " * 30, encoding="utf-8")
    colloc.build(other, [str(text)], jobs=1)
    made = colloc.vectors(demo, tmp_path / "v", dimensions=10)
    answer = colloc.similar(other, "fog", vectors=tmp_path / "v.npy", limit=4)
    own = colloc.similar(demo, "fog", vectors=tmp_path / "v.npy", limit=4)
    assert answer.names == ("word", "similar", "cosine")
    assert own.names == ("word", "similar", "cosine", "shared")
    assert answer["similar"].tolist() == own["similar"].tolist()
    assert answer.settings["store"] == own.settings["store"] == str(demo)
    assert answer.settings["shared"] == f"left out: the vectors were made from {demo}, not from {other}"
    unnamed = dataclasses.replace(made, settings={"layer": "fold"})
    assert "an unnamed store" in colloc.similar(demo, "fog", vectors=unnamed).settings["shared"]


def test_ties_stand_by_word() -> None:
    values = csr_array(np.array([[1.0, 0], [0, 1], [0, 2], [0, 3]]))
    made = Matrix(values, ["q", "c", "a", "b"], ["x", "y"], {"layer": "form"})
    assert similar(Space(made), ["c"], limit=2)["similar"].tolist() == ["a", "b"]
    assert similar(Space(made), ["q"], limit=2)["similar"].tolist() == ["a", "b"]


def test_agreement_is_scipys_spearman(demo: Path) -> None:
    made = colloc.matrix(demo, smoothing=0.75, min_row_count=5, min_context_count=5)
    random = np.random.default_rng(2)
    words = [str(word) for word in random.choice(made.rows, 80)]
    rows = [(words[i], words[i + 1], float(random.integers(0, 11))) for i in range(0, 80, 2)]
    answer = colloc.agreement(made, {"some": [*rows, ("kraken", "fog", 5.0)], "few": rows[:5]})
    cosines = Space(made).cosines(*(np.array([made.rows.index(row[k]) for row in rows]) for k in (0, 1)))
    scores = np.array([row[2] for row in rows])
    assert answer["spearman"][0] == pytest.approx(spearmanr(cosines, scores).statistic, abs=1e-12)
    assert (answer["pairs"][0], answer["covered"][0], answer["coverage"][0]) == (41, 40, 40 / 41)
    assert answer["low"][0] < answer["spearman"][0] < answer["high"][0]
    # The interval is about what Fisher's transformation gives for 40 pairs (Bonett & Wright 2000: variance 1.06/(n-3)).
    half = 1.96 * np.sqrt(1.06 / 37)
    width = np.tanh(np.arctanh(answer["spearman"][0]) + half) - np.tanh(np.arctanh(answer["spearman"][0]) - half)
    assert answer["high"][0] - answer["low"][0] == pytest.approx(width, rel=0.35)
    again = colloc.agreement(made, {"some": [*rows, ("kraken", "fog", 5.0)], "few": rows[:5]})
    assert answer == again
    with pytest.raises(UsageError, match="at least 3 are needed"):
        colloc.agreement(made, {"none": [("kraken", "fog", 5.0)]})


@pytest.mark.parametrize(
    "text",
    [
        "sea\tship\t7.5\nsea\tfog\t3\n",
        "Word 1,Word 2,Human (mean)\nsea,ship,7.5\n\nsea,fog,3\n",
        "# x\nsea ship 7.5 n\nsea fog 3",
    ],
)
def test_lists_of_judged_pairs(text: str) -> None:
    judged = judged_pairs("x", text.splitlines())
    assert (list(judged.pairs), judged.scores.tolist()) == ([("sea", "ship"), ("sea", "fog")], [7.5, 3.0])


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("sea ship 1\nsea ship\n", "x:2: a line holds two words and a number"),
        ("sea ship 1\nsea ship high\n", "x:2: a line"),
        ("a b c\n", "no line"),
    ],
)
def test_lists_that_are_none(text: str, message: str) -> None:
    with pytest.raises(DataError, match=message):
        judged_pairs("x", text.splitlines())


def test_listed_rows_need_no_frequency(demo: Path) -> None:
    made = colloc.vectors(demo, dimensions=2, rows=["fog", "tea", "rope"])
    assert made.words == ["fog", "tea", "rope"]
    assert len(colloc.vectors(demo, dimensions=2).words) < len(
        colloc.vectors(demo, dimensions=2, min_row_count=1).words
    )


def test_equal_and_missing_singular_values() -> None:
    """Where a Lanczos method misses some, or does not end: 300 blocks alike, and a rank below what is asked."""
    alike = block_diag([np.ones((5, 5))] * 300, format="csr")
    left, values, right = leading_vectors(csr_array(alike), 250)
    np.testing.assert_allclose(values, 5.0, rtol=1e-6)
    np.testing.assert_allclose(right @ right.T, np.eye(250), atol=1e-6)
    np.testing.assert_allclose(left.T @ left, np.eye(250), atol=1e-6)
    random = np.random.default_rng(8)
    low = random_array((900, 20), density=0.1, rng=random) @ random_array((20, 800), density=0.1, rng=random)
    values = leading_vectors(csr_array(low), 30)[1]
    np.testing.assert_allclose(values[:20], np.linalg.svd(low.toarray(), compute_uv=False)[:20], rtol=1e-4)
    assert (values[20:] < 1e-4 * values[0]).all()


def test_how_often_words_are_seen_that_are_compared() -> None:
    """50 times, and 20 where fewer than 1,000 words are seen 50 times."""
    assert reliable_count(np.array([50] * 1000)) == 50
    assert reliable_count(np.array([50] * 999 + [49] * 5000)) == 20
    assert reliable_count(np.zeros(0, np.int64)) == 20
    with pytest.raises(UsageError, match="by a list or by frequency"):
        Choice(words=("fog",), min_count=None)


def test_rare_words_are_not_compared_unless_asked_for(demo: Path) -> None:
    seen = {row["word"]: row["count"] for row in colloc.words(demo, limit=0)}
    assert sum(count >= 50 for count in seen.values()) < 1000
    answer = colloc.similar(demo, "fog", limit=0)
    assert set(answer["similar"]) == {word for word, count in seen.items() if count >= 20} - {"fog"}
    assert answer.settings["rows"] == answer.settings["contexts"] == "seen 20 times or more"
    rare = next(word for word, count in seen.items() if 2 <= count < 20)
    with pytest.raises(
        NotSeenError, match="has no row: compared are only words seen 20 times or more; lower --min-row-count"
    ):
        colloc.similar(demo, rare)
    lower = colloc.similar(demo, rare, limit=0, min_row_count=2)
    assert set(lower["similar"]) == {word for word, count in seen.items() if count >= 2} - {rare}
    assert lower.settings["contexts"] == "seen 20 times or more"
