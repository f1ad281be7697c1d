"""Sureness and avoidance as `pairs` and `around` give them: columns, filters, sides, word classes, refusals.

Checked against the full answer filtered here, and against plain counts of the documents.
"""

from __future__ import annotations

import json
from collections import Counter
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import colloc
from colloc.answers.columns import Columns
from colloc.answers.sureness import floors
from colloc.answers.sureness.wishes import CELL_COLUMNS, SURE_COLUMNS
from colloc.errors import UsageError
from colloc.store.opening import open_for_writing
from corpora_demo.generate import documents
from tests.cli.conftest import Run
from tests.cli.conftest import run as run
from tests.counts.placed import write_store
from tests.demo.counting import Counted
from tests.sureness.conftest import MADE, N_TERMS


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A demo corpus of 300 documents with its floors."""
    folder = tmp_path_factory.mktemp("answers")
    text = folder / "demo.jsonl"
    text.write_text("".join(json.dumps(document) + "\n" for document in documents(9, 300)), encoding="utf-8")
    path = folder / "demo.colloc"
    colloc.build(path, str(text), jobs=1)
    with pytest.MonkeyPatch.context() as patched:
        patched.setattr(floors, "MOST_ROUNDS", 2)
        colloc.floors(path)
    return path


@pytest.fixture(scope="module")
def everything(demo: Path) -> Columns:
    return colloc.pairs(demo, sure=True, limit=0)


def words_of(answer: Columns) -> list[tuple[str, str]]:
    return list(zip(answer["first"].tolist(), answer["second"].tolist(), strict=True))


def test_all_columns_in_their_order(everything: Columns) -> None:
    assert everything.names[-len(SURE_COLUMNS) :] == SURE_COLUMNS
    assert everything.settings["groups_of_documents"] == 20
    assert "99th percentile of npmi" in everything.settings["order_floor"]
    for shuffle in ("order", "corpus"):
        above, floor = everything[f"above_{shuffle}"], everything[f"{shuffle}_floor"]
        unknown = np.isnan(floor)
        assert 0 < unknown.sum() < len(everything)
        assert (above[~unknown] == (everything["npmi"] > floor)[~unknown]).all()
        assert {*above[unknown].tolist()} == {None}
        assert everything["expected"][unknown].max() < everything["expected"][~unknown].min() + 1
    assert ((everything["q_value"] >= 0) & (everything["q_value"] <= 1)).all()
    inside = (everything["pmi_low"] <= everything["pmi"]) & (everything["pmi"] <= everything["pmi_high"])
    assert inside.all()


def test_what_is_unknown_stays_so_in_data_frames(everything: Columns) -> None:
    assert str(everything.to_arrow().schema.field("above_order").type) == "bool"
    assert everything.to_arrow()["above_order"].to_pylist() == everything["above_order"].tolist()
    assert everything.to_polars()["above_order"].to_list() == everything["above_order"].tolist()


FILTERS: list[tuple[dict[str, Any], str]] = [
    ({"min_docs": 12}, "documents >= 12"),
    ({"max_q": 1e-6}, "q_value <= 1e-6"),
    ({"above_chance": "order"}, "above_order"),
    ({"above_chance": "corpus"}, "above_corpus"),
    ({"interval_above": 2.5}, "pmi_low > 2.5"),
    ({"interval_above": 0, "max_q": 0.01, "min_docs": 3, "above_chance": "order"}, "all"),
]


@pytest.mark.parametrize(("wish", "name"), FILTERS, ids=[name for _, name in FILTERS])
@pytest.mark.parametrize("limit", [0, 7])
def test_filters_leave_what_the_columns_say(
    demo: Path, everything: Columns, wish: dict[str, Any], name: str, limit: int
) -> None:
    keep = np.ones(len(everything), bool)
    keep &= everything["documents"] >= wish.get("min_docs", 1)
    keep &= everything["q_value"] <= wish.get("max_q", 1.0)
    keep &= everything["pmi_low"] > wish.get("interval_above", -np.inf) if "interval_above" in wish else True
    keep &= everything[f"above_{wish['above_chance']}"].astype(bool) if "above_chance" in wish else True
    assert 0 < keep.sum() < len(everything)
    found = colloc.pairs(demo, limit=limit, **wish)
    wanted = everything.take(keep)[: limit or None]
    assert words_of(found) == words_of(wanted)
    for column in found.names:
        assert found[column].tolist() == wanted[column].tolist()


def test_filters_by_documents_go_on_until_the_rows_are_full(demo: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("colloc.answers.pairs.FIRST_REACH", 1)
    few = colloc.pairs(demo, measure="npmi", limit=5, min_docs=40)
    assert words_of(few) == words_of(colloc.pairs(demo, measure="npmi", limit=0, min_docs=40)[:5])
    assert (few["documents"] >= 40).all()
    asked: dict[str, Any] = {"words": ["fog", "wind", "sea"], "side": "each", "any_strength": True}
    every = colloc.around(demo, **asked, limit=0, min_docs=1, show=["documents", "pmi_low"], measure="npmi")
    for reach in (1, 2, 50):
        monkeypatch.setattr("colloc.answers.around.FIRST_REACH", reach)
        for least in (2, 30, 250):
            wanted = every.take(every["documents"] >= least)
            firsts = zip(wanted["side"].tolist(), wanted["first"].tolist(), strict=True)
            ranks: Counter[tuple[str, str]] = Counter()
            keep = []
            for row, group in enumerate(firsts):
                ranks[group] += 1
                if ranks[group] <= 4:
                    keep.append(row)
            found = colloc.around(demo, **asked, limit=4, min_docs=least, show=["documents", "pmi_low"], measure="npmi")
            assert found.to_dicts() == wanted.take(keep).to_dicts()


def test_three_documents_by_default_where_there_are_twenty(run: Run, tmp_path: Path) -> None:
    """The first words of a list of the strongest are not those of one document; what was left out is said."""
    lines = ["The sea was calm. Thick fog came in. A calm sea again."] * 19
    loud = "Tick tock tick tock. " * 9
    for number in (19, 20):
        store = tmp_path / f"{number}.colloc"
        texts = [*lines[: number - 1], loud]
        colloc.build(store, documents=[{"text": text, "half": str(place % 2)} for place, text in enumerate(texts)])
        found, company = colloc.pairs(store), colloc.around(store, "tock")
        everything = colloc.pairs(store, min_docs=1)
        assert ("tick", "tock") in words_of(everything)
        assert (("tick", "tock") in words_of(found)) is (number < 20)
        assert "tick" in company["second"].tolist()  # its word is in one document anyway
        assert "min_docs_by_default" not in company.settings
        for answer in (found, colloc.around(store, "fog"), colloc.around(store, ["tock", "fog"])):
            assert answer.settings["min_docs"] == (3 if number == 20 else 1)
            assert answer.settings.get("min_docs_by_default", False) is (number == 20)
            assert ("documents" in answer) is (number == 20)
        # half of the documents, all rows, what keeps apart, and rarer pairs than usual: nothing more is left out
        for asked in ({"where": "half=1"}, {"limit": 0}, {"avoid": True}, {"min_count": 4}):
            other = colloc.pairs(store, **asked)
            assert other.settings["min_docs"] == 1
            assert "min_docs_by_default" not in other.settings
    ran = run("pairs", store)
    assert "; min docs 3 by default (--min-docs 1 shows all); " in ran.err
    assert "by default" not in run("pairs", store, "--min-docs", 3).err


def test_columns_one_by_one(demo: Path, everything: Columns) -> None:
    found = colloc.pairs(demo, show=["q_value", "dp_norm"], limit=4)
    assert found.names[-2:] == ("dp_norm", "q_value")
    assert "pmi" in found.names
    measures_too = colloc.pairs(demo, show=["dice", "documents"], limit=4)
    assert measures_too.names[7:] == ("dice", "npmi", "documents")
    assert found["q_value"].tolist() == everything[:4]["q_value"].tolist()


def test_documents_are_those_that_hold_the_pair(demo: Path) -> None:
    counted = [Counted([document]) for document in documents(9, 300)]
    found = colloc.pairs(demo, window=1, directed=True, show=["documents"], min_count=8, limit=40)
    for row in found.to_dicts():
        pair = (row["first"], row["second"])
        assert row["documents"] == sum(pair in document.pairs for document in counted)
        assert row["joint"] == sum(document.pairs[pair] for document in counted)


def test_joint_counts_and_numbers_of_rows_change_no_q_value(demo: Path, everything: Columns) -> None:
    wide = dict(zip(words_of(everything), everything["q_value"].tolist(), strict=True))
    few = colloc.pairs(demo, show=["q_value"], min_count=20, limit=10)
    assert [wide[pair] for pair in words_of(few)] == few["q_value"].tolist()
    rarer = colloc.pairs(demo, show=["q_value"], min_word_count=50, limit=1)
    assert rarer.settings["hypotheses"] < everything.settings["hypotheses"]


def test_planted_avoidance_is_found(demo: Path) -> None:
    found = colloc.pairs(demo, avoid=True, limit=0)
    # planted by the grammar: a fog is thick, never strong, in one sentence
    assert frozenset({"strong", "fog"}) in {frozenset(pair) for pair in words_of(found)}
    assert (found["joint"] < found["expected"]).all()
    assert (found["expected"] >= 5).all()
    assert (found["q_value"] <= 0.05).all()
    assert (np.diff(found["g2"]) >= 0).all()
    never = found["joint"] == 0
    assert never.any()
    assert np.allclose(found["pmi_if_one"][never], np.log2(1 / found["expected"][never]))
    assert (found["pmi_at_most"] > found["pmi"]).all()
    assert len(colloc.pairs(demo, avoid=True, min_expected=50, limit=0)) < len(found)
    assert len(colloc.pairs(demo, avoid=True, max_q=1e-9, limit=0)) < len(found)
    sure = colloc.pairs(demo, avoid=True, show=["documents", "pmi_high"], limit=5)
    assert sure.names[-2:] == ("documents", "pmi_high")


def test_around_several_words_by_side(demo: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    # floors with a direction are not kept in this store, so they are made here
    monkeypatch.setattr(floors, "MOST_ROUNDS", 1)
    each = colloc.around(demo, ["fog", "lamp"], side="each", sure=True, limit=4)
    assert each.names[0] == "side"
    for side in ("left", "right"):
        alone = colloc.around(demo, ["fog", "lamp"], side=side, sure=True, limit=4)  # type: ignore[arg-type]
        part = each.take(each["side"] == side)
        assert words_of(part) == words_of(alone)
        for column in alone.names:
            assert np.array_equal(part[column], alone[column])
    both = colloc.around(demo, ["fog"], limit=0, show=["q_value"])
    filtered = colloc.around(demo, ["fog"], limit=0, max_q=1e-3, interval_above=0, min_docs=5)
    assert 0 < len(filtered) < len(both)
    kept = {pair: q for pair, q in zip(words_of(both), both["q_value"].tolist(), strict=True) if q <= 1e-3}
    assert set(words_of(filtered)) <= set(kept)


def test_around_avoidance(demo: Path) -> None:
    found = colloc.around(demo, ["fog"], avoid=True, limit=0)
    assert "strong" in found["second"].tolist()
    assert (found["joint"] < found["expected"]).all()
    assert (found["first"] == "fog").all()


def test_by_word_class(tmp_path: Path) -> None:
    path = tmp_path / "annotated.colloc"
    classes = ["NOUN", "VERB", "ADP"]
    types = [(f"w{term:03}", f"w{term:03}", classes[term % 3]) for term in range(N_TERMS)]
    write_store(path, MADE, N_TERMS, block=900, types=types, layer="lemma/upos")
    found = colloc.around(path, ["w000/NOUN"], upos=["VERB", "NOUN"], limit=3, min_count=1, any_strength=True)
    assert found["upos"].tolist() == ["VERB"] * 3 + ["NOUN"] * 3
    assert all(word.endswith(name) for word, name in zip(found["second"], found["upos"], strict=True))
    everyone = colloc.around(path, ["w000/NOUN"], limit=0, min_count=1, any_strength=True)
    verbs = [word for word in everyone["second"] if word.endswith("/VERB")]
    assert found["second"].tolist()[:3] == verbs[:3]
    with pytest.raises(UsageError, match="no word class 'PRON', only ADP, NOUN, VERB"):
        colloc.around(path, ["w000/NOUN"], upos=["PRON"])


def test_refusals(demo: Path) -> None:
    refused: list[tuple[dict[str, Any], str]] = [
        ({"max_q": 0.0}, "max_q must be above 0 and at most 1, not 0"),
        ({"above_chance": "topic"}, "above_chance must be one of order, corpus, not 'topic'"),
        ({"show": ["q_value"], "margins": "tokens"}, "q_value needs the cells of a table"),
        (
            {"avoid": True, "margins": "tokens", "measure": "pmi", "show": ["pmi"]},
            "avoidance needs the cells of a table",
        ),
        ({"avoid": True, "min_expected": 0.5}, "min_expected must be at least 1"),
        ({"avoid": True, "above_chance": "order"}, "above_chance asks for attraction"),
        ({"avoid": True, "any_strength": True}, "contradict each other"),
        ({"interval_above": float("nan")}, "interval_above must be a number"),
    ]
    for wish, message in refused:
        with pytest.raises(UsageError, match=message):
            colloc.pairs(demo, **wish)
    with pytest.raises(UsageError, match="does not tell word classes"):
        colloc.around(demo, ["fog"], upos=["NOUN"])


def test_what_margins_of_tokens_can_bear(demo: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(floors, "MOST_ROUNDS", 1)
    found = colloc.pairs(demo, margins="tokens", sure=True, limit=3)
    assert not set(CELL_COLUMNS) & set(found.names)
    assert {"pmi_low", "documents"} <= set(found.names)


def test_command_line(demo: Path, run: Run) -> None:
    ran = run("pairs", demo, "--sure", "-n", 3, "-f", "csv")
    assert ran.code == 0
    assert ran.out.splitlines()[0].endswith(",".join(SURE_COLUMNS))
    ran = run("pairs", demo, "--show", "order_floor,above_order", "-n", 0, "-f", "jsonl")
    rows = [json.loads(line) for line in ran.out.splitlines()]
    assert {row["above_order"] for row in rows} == {True, False, None}
    assert all((row["above_order"] is None) == (row["order_floor"] is None) for row in rows)
    ran = run("pairs", demo, "--max-q", 0.01, "--above-chance", "order", "--interval-above", 0, "--min-docs", 3)
    assert ran.code == 0
    assert "hypotheses" in ran.err
    ran = run("around", demo, "fog", "--avoid", "--min-expected", 3, "-f", "jsonl")
    assert {"pmi_if_one", "pmi_at_most", "q_value"} <= set(json.loads(ran.out.splitlines()[0]))
    ran = run("around", demo, "fog", "--side", "each", "--show", "q_value,pmi", "-f", "csv", "-n", 2)
    assert [line.split(",")[0] for line in ran.out.splitlines()] == ["side", "left", "left", "right", "right"]
    ran = run("pairs", demo, "--show", "q_valu")
    assert ran.code == 2
    assert "did you mean 'q_value'?" in ran.err
    ran = run("floors", demo, "-f", "csv")
    assert ran.code == 0
    assert ran.out.splitlines()[0] == "shuffle,expected_from,pairs,met,pmi_floor,npmi_floor,g2_floor"


def test_floors_wait_for_no_other_writer(demo: Path, run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    with open_for_writing(demo, "test"):
        ran = run("pairs", demo, "--show", "order_floor", "-n", 1)
    assert ran.code == 0
