"""What tells labels apart, against scikit-learn and scipy on the demo's real labels."""

from __future__ import annotations

import json
import math
from collections import Counter
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import chi2_contingency, false_discovery_control
from sklearn.feature_selection import chi2 as chi2_of_presence
from sklearn.metrics import mutual_info_score

import colloc
from colloc.errors import NotSeenError, UsageError
from colloc.measures.labels import label_tables
from colloc.settings import SegmentSettings
from colloc.tokens.segmenter import Segmenter

CORPORA = Path(__file__).resolve().parents[2] / "corpora_demo"
WINDOW = 2


def demo_documents() -> list[tuple[str, str, list[list[str]]]]:
    """Genre, station, and the folded words of the sentences of 160 demo documents."""
    segmenter = Segmenter(SegmentSettings())
    found = []
    for name in ("logbooks.jsonl", "notices.jsonl"):
        for line in (CORPORA / name).read_text(encoding="utf-8").splitlines()[:80]:
            record = json.loads(line)
            segments = segmenter.segment(record["text"])
            words = [record["text"][a:b].casefold() for a, b in zip(segments.starts, segments.ends, strict=True)]
            cuts = [*segments.sentences.tolist(), len(words)]
            sentences = [words[a:b] for a, b in pairwise(cuts)]
            found.append((record["genre"], record["station"], sentences))
    return found


DOCUMENTS = demo_documents()


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("features")
    for name in ("logbooks.jsonl", "notices.jsonl"):
        lines = (CORPORA / name).read_text(encoding="utf-8").splitlines()[:80]
        (folder / name).write_text("\n".join(lines) + "\n", encoding="utf-8")
    paths = [str(folder / "logbooks.jsonl"), str(folder / "notices.jsonl")]
    colloc.build(folder / "s.colloc", paths, tally=colloc.TallySpec(right=WINDOW), jobs=1)
    return folder / "s.colloc"


@pytest.mark.parametrize("key", ["genre", "station"])
def test_words_as_the_references_have_them(store: Path, key: str) -> None:
    """Two labels, and many."""
    labels = np.array([genre if key == "genre" else station for genre, station, _ in DOCUMENTS])
    words = [set().union(*map(set, sentences)) for _, _, sentences in DOCUMENTS]
    answer = colloc.features(store, key, min_docs=5, limit=0, each_label=True)
    frequency = Counter(word for found in words for word in found)
    tested = {word for word, count in frequency.items() if 5 <= count <= len(DOCUMENTS) - 5}
    assert set(answer["word"]) == tested
    for row in answer.to_dicts()[::7]:
        presence = np.array([row["word"] in found for found in words])
        assert row["documents"] == presence.sum()
        # scikit-learn's mutual information is in nats.
        assert row["mutual_information"] * math.log(2) == pytest.approx(mutual_info_score(presence, labels), abs=1e-12)
        names = sorted(set(labels))
        table = np.array([[np.sum(labels[presence == there] == name) for name in names] for there in (True, False)])
        reference = chi2_contingency(table, correction=False)
        assert row["chi2"] == pytest.approx(reference.statistic, rel=1e-10)
        assert row["p"] == pytest.approx(reference.pvalue, rel=1e-8)
        statistic, _ = chi2_of_presence(presence[:, np.newaxis].astype(int), labels)
        assert row["chi2_present"] == pytest.approx(statistic[0], rel=1e-10)
        assert row["documents_in"] == np.sum(labels[presence] == row["label"])
        contributions = [row[f"contribution:{name}"] for name in names]
        assert row["contribution"] == max(contributions)
        assert [row[f"documents:{name}"] for name in names] == table[0].tolist()
    np.testing.assert_allclose(answer["q"], false_discovery_control(answer["p"]), rtol=1e-9)
    assert (np.diff(answer["mutual_information"]) <= 1e-15).all()


def test_pairs_are_counted_by_document(store: Path) -> None:
    labels = np.array([genre for genre, _, _ in DOCUMENTS])
    pairs = []
    for _, _, sentences in DOCUMENTS:
        found = set()
        for words in sentences:
            for i, first in enumerate(words):
                found.update(frozenset((first, second)) for second in words[i + 1 : i + 1 + WINDOW])
        pairs.append(found)
    answer = colloc.features(store, "genre", pairs=True, min_docs=10, limit=0)
    frequency = Counter(pair for found in pairs for pair in found)
    tested = {pair for pair, count in frequency.items() if 10 <= count <= len(DOCUMENTS) - 10}
    assert {frozenset((row["first"], row["second"])) for row in answer} == tested
    for row in answer.to_dicts()[::25]:
        presence = np.array([frozenset((row["first"], row["second"])) in found for found in pairs])
        assert row["documents"] == presence.sum()
        assert row["mutual_information"] * math.log(2) == pytest.approx(mutual_info_score(presence, labels), abs=1e-12)
    few = colloc.features(store, "genre", pairs=True, min_docs=10, most_pairs=30, limit=0)
    assert 0 < len(few) <= 30


def test_order_and_limit(store: Path) -> None:
    by_chi2 = colloc.features(store, "genre", sort="chi2", limit=20)
    assert len(by_chi2) == 20
    assert (np.diff(by_chi2["chi2"]) <= 0).all()
    within = colloc.features(store, "station", where="genre=log", limit=5)
    assert within.settings["documents"] == sum(genre == "log" for genre, _, _ in DOCUMENTS)


def test_what_cannot_be_asked(store: Path) -> None:
    with pytest.raises(UsageError, match="no document has the key 'colour'"):
        colloc.features(store, "colour")
    with pytest.raises(UsageError, match="has only one value here"):
        colloc.features(store, "genre", where="genre=log")
    with pytest.raises(UsageError, match="features are sorted by one of"):
        colloc.features(store, "genre", sort="size")  # type: ignore[arg-type]
    with pytest.raises(NotSeenError, match="none of the words is in 81 documents and absent"):
        colloc.features(store, "genre", min_docs=81)


@given(
    st.integers(2, 5).flatmap(
        lambda k: st.tuples(
            st.lists(st.integers(1, 40), min_size=k, max_size=k),
            st.lists(st.lists(st.floats(0, 1), min_size=k, max_size=k), min_size=1, max_size=4),
        )
    )
)
def test_any_table(drawn: tuple[list[int], list[list[float]]]) -> None:
    sizes = np.array(drawn[0])
    present = np.floor(np.array(drawn[1]) * sizes).astype(int)
    made = label_tables(present, sizes)
    for row, has in enumerate(present):
        table = np.array([has, sizes - has])
        information = mutual_info_score(None, None, contingency=table)
        assert made.mutual_information[row] * math.log(2) == pytest.approx(information, abs=1e-9)
        if table.sum(axis=1).all():
            assert made.chi2[row] == pytest.approx(chi2_contingency(table, correction=False).statistic, abs=1e-9)
        # Contributions of presence and absence together are the mutual information.
        absent = label_tables([sizes - has], sizes).contributions[0]
        assert made.contributions[row].sum() + absent.sum() == pytest.approx(made.mutual_information[row], abs=1e-9)


@pytest.mark.parametrize(
    ("present", "documents"),
    [([[1, 2]], [3]), ([[1]], [3]), ([[4, 1]], [3, 3]), ([[0, 0]], [0, 3]), ([1, 2], [3, 3])],
)
def test_tables_that_cannot_be(present: list[object], documents: list[int]) -> None:
    with pytest.raises(UsageError):
        label_tables(present, documents)  # type: ignore[arg-type]


def test_labels_that_are_nearly_names_of_documents_are_told(tmp_path: Path) -> None:
    lines = [json.dumps({"text": f"fog {'rain' if n % 2 else 'sun'}", "year": n // 2, "own": n}) for n in range(12)]
    (tmp_path / "a.jsonl").write_text("\n".join(lines), encoding="utf-8")
    colloc.build(tmp_path / "a.colloc", [str(tmp_path / "a.jsonl")], jobs=1)
    told = colloc.features(tmp_path / "a.colloc", "own").settings["caution"]
    assert told == "12 labels for 12 documents: mutual information says little of labels so small"
    assert "caution" not in colloc.features(tmp_path / "a.colloc", "year").settings
