"""Identities of information theory on whole stores, in the conventions where they hold.

Source of the identities: Cover & Thomas, Elements of Information Theory (2nd ed. 2006), chapter 2
(mutual information as an average, its sign, and its relation to entropies); the reference value is
scikit-learn's ``mutual_info_score``, which is in nats.
"""

from __future__ import annotations

import json
import math
import random
from collections import Counter
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from sklearn.metrics import mutual_info_score

from colloc.answers.questions import PairOptions, ask
from colloc.answers.tables import PairTable, joined
from colloc.build.building import build
from colloc.measures.catalogue import MEASURES
from colloc.store import vocabulary
from colloc.store.opening import open_for_reading
from tests.build.texts import content, write_corpus


def all_rows(path: Path, options: PairOptions) -> tuple[PairTable, int]:
    """Every pair of a store with its table, and the number of words."""
    with open_for_reading(path) as store:
        question = ask(store, options)
        return joined(list(question.reader.blocks())), vocabulary.term_count(store, question.layer)


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("identities")
    write_corpus(folder / "c.jsonl", 11, 30)
    build(folder / "s", [str(folder / "c.jsonl")], jobs=1)
    return folder / "s"


@pytest.mark.parametrize("window", [1, 2, 5])
def test_mean_pmi_of_the_directed_table_is_its_mutual_information(store: Path, window: int) -> None:
    table, terms = all_rows(store, PairOptions(window=window, directed=True))
    dense = np.zeros((terms, terms), dtype=np.int64)
    dense[table.first, table.second] = table.joint
    assert dense.sum() == table.total[0]
    there = table.joint > 0
    p = table.joint[there] / table.total[there]
    mean = float((p * MEASURES["pmi"].compute(*table.take(there).arguments)).sum())
    assert mean == pytest.approx(mutual_info_score(None, None, contingency=dense) / math.log(2), abs=1e-9)
    assert mean >= 0
    g2 = np.abs(MEASURES["g2"].compute(*table.arguments))
    assert (g2 >= 0).all()


def test_mean_pmi_of_the_symmetric_table_is_its_mutual_information(store: Path) -> None:
    table, terms = all_rows(store, PairOptions(window=5))
    dense = np.zeros((terms, terms), dtype=np.int64)
    same = table.first == table.second
    dense[table.first, table.second] = table.joint
    dense[table.second, table.first] = table.joint
    # Shown halved on the diagonal; in the table of ordered pairs it stands whole.
    dense[table.first[same], table.first[same]] = 2 * table.joint[same]
    total = dense.sum()
    assert total == table.total[~same][0] == 2 * table.total[same][0]
    pmi = MEASURES["pmi"].compute(*table.arguments)
    weight = np.where(same, 1, 2) * np.where(same, 2 * table.joint, table.joint) / total
    mean = float((weight * pmi).sum())
    assert mean == pytest.approx(mutual_info_score(None, None, contingency=dense) / math.log(2), abs=1e-9)
    assert (dense.sum(axis=1)[table.first[~same]] == table.first_total[~same]).all()


@pytest.mark.parametrize("margins", ["pairs", "positions"])
def test_npmi_is_bounded_and_signs_agree(store: Path, margins: str) -> None:
    table, _ = all_rows(store, PairOptions(window=5, margins=margins))  # type: ignore[arg-type]
    npmi = MEASURES["npmi"].compute(*table.arguments)
    assert (npmi >= -1).all()
    assert (npmi <= 1 + 1e-12).all()
    observed, expected = (
        table.joint.astype(float),
        table.first_total * np.asarray(table.second_total, float) / table.total,
    )
    apart = ~np.isclose(observed, expected)
    assert (np.sign(MEASURES["g2"].compute(*table.arguments))[apart] == np.sign(observed - expected)[apart]).all()


def test_positions_can_reach_certainty(tmp_path: Path) -> None:
    """'spick' always has 'span' within the window: only the position convention can say 100 %."""
    text = "spick and span . the sea is grey . " * 20
    (tmp_path / "t.jsonl").write_text(json.dumps({"text": text}) + "\n", encoding="utf-8")
    build(tmp_path / "s", [str(tmp_path / "t.jsonl")])
    with open_for_reading(tmp_path / "s") as opened:
        spick, span = vocabulary.term_numbers(opened, "fold", ["spick", "span"])
        question = ask(opened, PairOptions(window=2, margins="positions"))
        table = question.reader.given(np.array([spick], np.uint32), np.array([span], np.uint32))
        assert table.joint[0] == table.first_total[0] == 20
        assert MEASURES["p_second_given_first"].compute(*table.arguments)[0] == 1.0


def test_token_margins_follow_their_definition(store: Path) -> None:
    """PMI = log2((S/T) / (f(x) f(y) / N²)), and with no-span S is divided by N (Church & Hanks 1990, Table 3)."""
    for spanned in (True, False):
        for directed in (True, False):
            options = PairOptions(window=4, margins="tokens", spanned=spanned, directed=directed)
            table, _ = all_rows(store, options)
            with open_for_reading(store) as opened:
                counts = vocabulary.word_counts(opened, "fold").tokens
                cells = ask(opened, PairOptions(window=4, directed=directed)).reader
                total = cells.total
            n = counts.sum()
            f = counts[table.first].astype(float), counts[table.second].astype(float)
            by_hand = np.log2((table.joint / (total if spanned else n)) / (f[0] * f[1] / float(n) ** 2))
            np.testing.assert_allclose(MEASURES["pmi"].compute(*table.arguments), by_hand, atol=1e-9)


@settings(max_examples=8, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.integers(0, 2**32 - 1))
def test_shuffled_documents_change_nothing(tmp_path: Path, seed: int) -> None:
    rng = random.Random(seed)
    folder = tmp_path / str(seed)
    folder.mkdir(exist_ok=True)
    rows = write_corpus(folder / "a.jsonl", seed, 8, sentences=6)
    rng.shuffle(rows)
    (folder / "b.jsonl").write_text("".join(json.dumps(row) + "\n" for row in rows), encoding="utf-8")
    tables = []
    for name in ("a", "b"):
        (folder / name).unlink(missing_ok=True)
        build(folder / name, [str(folder / f"{name}.jsonl")], jobs=1)
        whole = content(folder / name, by_text=True)
        del whole["documents"]
        tables.append(whole)
    assert tables[0] == tables[1]


def test_ties_stand_in_a_fixed_order(store: Path) -> None:
    from colloc.answers.pairs import pairs

    with open_for_reading(store) as opened:
        everything = pairs(opened, limit=0, min_count=1, any_strength=True)
        few = pairs(opened, limit=37, min_count=1, any_strength=True)
    rows = list(zip(everything["npmi"], everything["joint"], everything["first"], everything["second"], strict=True))
    assert rows == sorted(rows, key=lambda row: (-row[0], -row[1], row[2], row[3]))
    assert few.to_dicts() == everything[:37].to_dicts()
    assert Counter(everything["first"]).total() == len(everything)
