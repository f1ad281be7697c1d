"""Numbers of given expressions beside those of the ranking and beside plain counts."""

from __future__ import annotations

import math
from collections import Counter
from pathlib import Path

import numpy as np
import pytest

import colloc
from colloc.answers.expressions.given import OPEN_TERM, given_expressions
from colloc.answers.expressions.measures import MEASURES
from colloc.answers.expressions.settings import ExpressionOptions
from colloc.counts.grouping import deal
from colloc.measures.intervals import jackknife
from colloc.store.vocabulary import term_numbers
from colloc.verbs.opening import open_store
from tests.answers.expressions.test_expressions import built, plain_counts, prose

DOCUMENTS = prose(5, documents=26, sentences=40)


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return built(tmp_path_factory.mktemp("given"), DOCUMENTS)


def looked_up(store: Path, texts: list[str], **options: object) -> colloc.Columns:
    with open_store(store) as opened:
        sequences = [
            [OPEN_TERM if word == "_" else int(term_numbers(opened, "fold", [word])[0]) for word in text.split()]
            for text in texts
        ]
        return given_expressions(opened, sequences, ExpressionOptions(**options))  # type: ignore[arg-type]


def test_given_expressions_have_the_numbers_of_the_ranking(store: Path) -> None:
    ranking = colloc.expressions(store, min_count=8, common="keep", show="all", limit=0)
    frames = colloc.expressions(store, min_count=8, slots=2, max_words=3, common="keep", show="all", limit=40)
    rows = {row["expression"]: row for row in [*ranking, *frames]}
    texts = sorted(rows)
    assert len(texts) > 150
    for text, found in zip(texts, looked_up(store, texts, min_count=8), strict=True):
        frame = "_" in text
        for name in MEASURES:
            if frame and name in ("strength", "c_value", "c_value_length", "any_order"):
                assert math.isnan(found[name])
            else:
                assert found[name] == pytest.approx(rows[text][name], abs=1e-9), (text, name)


def test_what_is_rare_or_never_occurs_is_counted_too(store: Path) -> None:
    plain = plain_counts(DOCUMENTS, 7)
    rare = [text for text, count in plain.items() if count == 1 and len(text.split()) == 5][:30]
    long = next(text for text in plain if len(text.split()) == 7)
    texts = [*rare, long, "net net net net net", "by and large", "by _ large", "net _ gull _ rope"]
    found = looked_up(store, texts, min_count=50)
    frames = Counter(
        (words[i], words[i + 2])
        for sentences in DOCUMENTS
        for words in map(str.split, sentences)
        for i in range(len(words) - 2)
    )
    assert found["count"].tolist()[:-2] == [plain[text] for text in texts[:-2]]
    assert found["count"][-2] == frames["by", "large"]
    never = [text for text, row in zip(texts, found, strict=True) if not row["count"]]
    for text in never:
        row = found.to_dicts()[texts.index(text)]
        assert all(np.isnan(row[name]) for name in MEASURES if name not in ("count", "documents"))
    # C-value of what stands in no longer frequent sequence: log2 of the length, times its count
    assert found["c_value"][0] == pytest.approx(math.log2(5))
    assert found["c_value_length"][0] == 4


def test_the_interval_of_the_weakest_split_is_the_jackknife_over_documents(store: Path) -> None:
    [row] = looked_up(store, ["in good order"], min_count=8)
    group_of = deal(len(DOCUMENTS))
    parts = {"in good order": 0, "in good": 0, "good order": 0, "in": 0, "order": 0}
    by_group = {name: np.zeros(group_of.max() + 1) for name in parts}
    tokens = np.zeros(group_of.max() + 1)
    for group, sentences in zip(group_of, DOCUMENTS, strict=True):
        for sentence in sentences:
            words = sentence.split()
            tokens[group] += len(words)
            for name in parts:
                size = len(name.split())
                by_group[name][group] += sum(
                    " ".join(words[i : i + size]) == name for i in range(len(words) - size + 1)
                )
    cuts = {}
    for left, right in (("in", "good order"), ("in good", "order")):
        without = [by_group[name].sum() - by_group[name] for name in ("in good order", left, right)]
        replicates = np.log2(without[0] * (tokens.sum() - tokens) / (without[1] * without[2]))
        whole = [by_group[name].sum() for name in ("in good order", left, right)]
        cuts[math.log2(whole[0] * tokens.sum() / (whole[1] * whole[2]))] = replicates
    value = min(cuts)
    expected = jackknife(value, cuts[value])
    assert row["weakest_split"] == pytest.approx(value)
    assert (row["split_low"], row["split_high"]) == (pytest.approx(expected.low), pytest.approx(expected.high))
    assert row["split_low"] < value < row["split_high"]
