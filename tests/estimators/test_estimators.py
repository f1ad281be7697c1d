"""The transformers inside scikit-learn's own machinery, and against a store built from the same texts."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from sklearn.base import clone
from sklearn.linear_model import LogisticRegression
from sklearn.model_selection import GridSearchCV
from sklearn.pipeline import Pipeline
from sklearn.utils import estimator_checks as checks

import colloc
from colloc.answers.questions import PairOptions
from colloc.answers.spaces.choosing import Choice
from colloc.answers.spaces.matrix import MatrixOptions
from colloc.answers.spaces.vectors import VectorOptions, vectors
from colloc.errors import UsageError
from colloc.estimators import PairFeatures, PPMIVectors

CORPORA = Path(__file__).resolve().parents[2] / "corpora_demo"


def demo_texts() -> tuple[list[str], list[str]]:
    """120 texts of the demo corpora with their genre."""
    texts, labels = [], []
    for name in ("logbooks.jsonl", "notices.jsonl"):
        for line in (CORPORA / name).read_text(encoding="utf-8").splitlines()[:60]:
            record = json.loads(line)
            texts.append(record["text"])
            labels.append(record["genre"])
    return texts, labels


TEXTS, LABELS = demo_texts()


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The same texts as a store."""
    folder = tmp_path_factory.mktemp("estimators")
    lines = [json.dumps({"id": f"d{number}", "text": text}) for number, text in enumerate(TEXTS)]
    (folder / "texts.jsonl").write_text("\n".join(lines) + "\n", encoding="utf-8")
    colloc.build(folder / "s.colloc", [str(folder / "texts.jsonl")], jobs=1)
    return folder / "s.colloc"


@pytest.mark.parametrize("estimator", [PairFeatures(), PPMIVectors()], ids=["pairs", "vectors"])
@pytest.mark.parametrize(
    "check",
    [
        checks.check_parameters_default_constructible,
        checks.check_no_attributes_set_in_init,
        checks.check_get_params_invariance,
        checks.check_set_params,
        checks.check_estimator_cloneable,
        checks.check_estimator_repr,
        checks.check_valid_tag_types,
    ],
    ids=lambda check: check.__name__.removeprefix("check_"),
)
def test_scikit_learns_own_checks(check: object, estimator: object) -> None:
    """Those that do not feed tables of numbers: the input here is text."""
    check(type(estimator).__name__, estimator)  # type: ignore[operator]


@pytest.mark.parametrize("directed", [False, True])
def test_pairs_are_those_of_a_store(store: Path, directed: bool) -> None:
    made = PairFeatures(window=5, min_count=5, max_features=40, directed=directed).fit(TEXTS)
    rows = colloc.pairs(store, window=5, directed=directed, min_count=5, limit=40)
    if directed:
        expected = list(zip(rows["first"], rows["second"], strict=True))
        assert made.pairs_ == expected
    else:
        # Equal scores stand by word, and which word comes first is not decided by order of meeting here.
        np.testing.assert_allclose(made.scores_, rows["npmi"], rtol=1e-12)
        above = made.scores_ > made.scores_[-1]
        found = {frozenset(pair) for pair, strong in zip(made.pairs_, above, strict=True) if strong}
        assert found <= {frozenset(pair) for pair in zip(rows["first"], rows["second"], strict=True)}


def test_counts_sum_to_the_joint_counts(store: Path) -> None:
    made = PairFeatures(min_count=5, max_features=30)
    counts = made.fit_transform(TEXTS)
    assert counts.shape == (len(TEXTS), 30)
    names = [name.split(" ") for name in made.get_feature_names_out()]
    joint = colloc.score(store, [(first, second) for first, second in names], show=["pmi"])["joint"]
    np.testing.assert_array_equal(np.asarray(counts.sum(axis=0)).ravel(), joint)
    binary = PairFeatures(min_count=5, max_features=30, binary=True).fit(TEXTS).transform(TEXTS)
    np.testing.assert_array_equal(binary.toarray(), np.minimum(counts.toarray(), 1))


def test_vectors_are_those_of_a_store(store: Path) -> None:
    made = PPMIVectors(dimensions=20, min_count=10).fit(TEXTS)
    frequent = Choice(min_count=10)
    with colloc.open_store(store) as opened:
        same = vectors(
            opened,
            options=PairOptions(window=5),
            chosen=MatrixOptions(smoothing=0.75, rows=frequent, contexts=frequent),
            shape=VectorOptions(dimensions=20),
        )
    places = [made.vocabulary_[word] for word in same.words]
    ours = made.vectors_[places]
    # Cosines, since signs and the order of equal dimensions are free.
    np.testing.assert_allclose(ours @ ours.T, same.values @ same.values.T, atol=1e-8)
    means = made.transform([" ".join(same.words[:3]), "", "zzzz"])
    np.testing.assert_allclose(means[0], ours[:3].mean(axis=0), atol=1e-12)
    assert not means[1:].any()
    assert list(made.get_feature_names_out()[:2]) == ["ppmivectors0", "ppmivectors1"]


@pytest.mark.parametrize(
    ("step", "grid"),
    [
        (PairFeatures(min_count=3, max_features=50), {"features__window": [2, 5]}),
        (PPMIVectors(dimensions=10), {"features__power": [0, 0.5]}),
    ],
    ids=["pairs", "vectors"],
)
def test_inside_a_grid_search(step: object, grid: dict[str, list[float]]) -> None:
    pipeline = Pipeline([("features", clone(step)), ("model", LogisticRegression(max_iter=500))])
    search = GridSearchCV(pipeline, grid, cv=2, error_score="raise").fit(TEXTS, LABELS)
    assert search.best_score_ > 0.9  # logbooks and notices are easily told apart
    names = search.best_estimator_.named_steps["features"].get_feature_names_out()
    assert len(names) == search.best_estimator_.named_steps["model"].n_features_in_


def test_what_is_no_list_of_texts_is_refused() -> None:
    with pytest.raises(UsageError, match="not one string"):
        PairFeatures().fit("one text")
    with pytest.raises(UsageError, match="number 1 is int"):
        PairFeatures().fit(["one", 2])  # type: ignore[list-item]
    with pytest.raises(UsageError, match="no pair of words is met 5 times"):
        PairFeatures().fit(["a b c", "d e f"])
    with pytest.raises(UsageError, match="fewer than 100 dimensions"):
        PPMIVectors().fit(["a b c"] * 5)
    with pytest.raises(UsageError, match="unknown measure"):
        PairFeatures("nothing").fit(["a b"])
