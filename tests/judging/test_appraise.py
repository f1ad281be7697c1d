"""Measures held against planted labels: what is found must be what was planted."""

from __future__ import annotations

import csv
import json
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from sklearn.metrics import average_precision_score

import colloc
from colloc.answers.appraisal import combining, of_pairs
from colloc.answers.questions import PairOptions
from colloc.cli.app import main
from colloc.errors import UsageError
from colloc.measures.catalogue import MEASURES
from colloc.verbs.opening import open_store

PLANTED = 60


def planted_text(generator: np.random.Generator) -> tuple[str, list[tuple[str, str]]]:
    """Random sentences in which each of 60 words is mostly followed by a word of its own."""
    firsts = [f"n{chr(97 + number // 26)}{chr(97 + number % 26)}" for number in range(PLANTED)]
    gold = [(word, f"{word}x") for word in firsts]
    fillers = [f"f{chr(97 + number // 26)}{chr(97 + number % 26)}" for number in range(150)]
    sentences = []
    for _ in range(9000):
        words: list[str] = []
        for _ in range(4):
            if generator.random() < 0.35:
                word, own = gold[generator.integers(PLANTED)]
                words += [word, own if generator.random() < 0.3 else fillers[generator.integers(150)]]
            else:
                words.append(fillers[min(int(generator.exponential(8)), 149)])
        sentences.append(" ".join(words) + ".")
    return "\n".join(sentences), gold


@pytest.fixture(scope="module")
def planted(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, list[tuple[str, str]], str]:
    folder = tmp_path_factory.mktemp("planted")
    text, gold = planted_text(np.random.default_rng(11))
    source = folder / "t.jsonl"
    source.write_text(json.dumps({"id": "one", "text": text}), encoding="utf-8")
    colloc.build(folder / "t.colloc", [str(source)], jobs=1)
    return folder / "t.colloc", gold, text


def test_against_a_list_by_brute_force(planted: tuple[Path, list[tuple[str, str]], str]) -> None:
    store, gold, text = planted
    listed = [*gold, ("naa", "zebra"), ("one", "two", "three")]
    found = colloc.appraise(
        store, gold=listed, window=1, directed=True, min_count=3, repeats=200, at=[20, 1000, 50_000]
    ).measures
    counts: dict[tuple[str, str], int] = {}
    for sentence in text.split("\n"):
        for pair in pairwise(sentence.rstrip(".").split()):
            counts[pair] = counts.get(pair, 0) + 1
    kept = {pair: count for pair, count in counts.items() if count >= 3}
    wanted = np.array([pair in set(gold) for pair in kept])
    rows = {row["measure"]: row for row in found.to_dicts()}
    assert rows["joint"]["average_precision"] == pytest.approx(average_precision_score(wanted, list(kept.values())))
    p_values = {"g2_p", "chi2_p", "fisher_p"}
    assert set(rows) == {"joint", *MEASURES} - p_values - {"log_odds_se"}
    assert (found.settings["candidates"], found.settings["wanted"]) == (len(kept), int(wanted.sum()))
    assert (found.settings["listed"], found.settings["passed_over"]) == (PLANTED + 1, PLANTED + 1 - int(wanted.sum()))
    order = found["average_precision"].tolist()
    assert order == sorted(order, reverse=True)
    assert rows["dice"]["average_precision"] > 0.95 > rows["joint"]["average_precision"]
    assert rows["dice"]["precision_at_20"] == 1.0
    assert rows["dice"]["recall_at_1000"] == 1.0
    assert len(kept) < 50_000
    assert all(np.isnan(row[f"{name}_at_50000"]) for row in rows.values() for name in ("precision", "recall"))
    for row in rows.values():
        assert row["ap_low"] <= row["average_precision"] <= row["ap_high"]


def test_the_threshold_cuts_where_it_says(planted: tuple[Path, list[tuple[str, str]], str]) -> None:
    store, gold, _ = planted
    asked = {"window": 1, "directed": True, "min_count": 3}
    found = colloc.appraise(store, gold=gold, show=["npmi", "fisher_log10_p"], repeats=10, **asked).measures  # type: ignore[arg-type]
    pairs = colloc.pairs(store, show=["npmi", "fisher_log10_p"], limit=0, **asked)  # type: ignore[arg-type]
    hit = np.array([pair in set(gold) for pair in zip(pairs["first"], pairs["second"], strict=True)])
    for row in found.to_dicts():
        values = pairs[row["measure"]]
        above = (
            values <= row["threshold"] if MEASURES[row["measure"]].strongest == "lowest" else values >= row["threshold"]
        )
        assert hit[above].mean() == pytest.approx(row["threshold_precision"])
        assert hit[above].sum() / PLANTED == pytest.approx(row["threshold_recall"])


def test_pairs_without_direction_match_in_both_orders(planted: tuple[Path, list[tuple[str, str]], str]) -> None:
    store, gold, _ = planted
    turned = [(second, first) for first, second in gold]
    found = colloc.appraise(store, gold=turned, show=["dice"], min_count=3, repeats=10)
    assert found.measures.settings["wanted"] == PLANTED
    directed = colloc.appraise(store, gold=turned, show=["dice"], min_count=1, repeats=10, window=1, directed=True)
    assert directed.measures.settings["wanted"] < PLANTED


def test_a_learnt_ranking_is_tested_on_words_it_has_not_seen(planted: tuple[Path, list[tuple[str, str]], str]) -> None:
    store, gold, _ = planted
    options = PairOptions(window=1, directed=True)
    with open_store(store) as opened:
        made = of_pairs.from_list(opened, gold, options, 5)
        scores = made.scores(["joint", "npmi", "g2", "dice"])
        learnt = combining.combine(made, scores, seed=5)
        again = combining.combine(made, scores, seed=5)
        best = combining.ranked(learnt, made, 3, 40)
        # Labels that mean nothing: whatever is learnt from them must not help on other words.
        wanted = np.random.default_rng(2).permutation(made.wanted)
        noise = of_pairs.LabelledPairs(made.question, made.table, wanted, 0, 0)
        nothing = combining.combine(noise, scores, seed=5)
    np.testing.assert_array_equal(learnt.out_of_fold, again.out_of_fold)
    assert average_precision_score(made.wanted, learnt.out_of_fold) > 0.9
    assert average_precision_score(wanted, nothing.out_of_fold) < 3 * wanted.mean()
    assert learnt.folds["candidates"].sum() == len(made.table)
    assert best["wanted"].mean() > 0.9
    assert set(learnt.weights["measure"]) == set(scores)


def test_too_little_to_learn_from(store: Path) -> None:
    colloc.judge(store, ["thick", "fog"], "accept", by="Anna")
    with pytest.raises(UsageError, match="was rejected: accept some and reject some"):
        colloc.appraise(store)
    colloc.judge(store, ["the", "boat"], "reject", by="Anna")
    with pytest.raises(UsageError, match="1 wanted and 1 other pairs are too few to learn from"):
        colloc.appraise(store, combined=True)
    with pytest.raises(UsageError, match="no pair of two words"):
        colloc.appraise(store, gold=[["a", "b", "c"]])


def test_against_decisions(store: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    accepted = ["thick fog", "strong wind", "clean oil"]
    rejected = ["the boat", "the lamp", "the keeper", "the reef"]
    for words in accepted:
        colloc.judge(store, words.split(), "accept", by="Anna")
    for words in rejected:
        colloc.judge(store, words.split(), "reject", by="Anna")
    colloc.judge(store, ["thick", "fog"], "unsure", by="Ben")
    colloc.judge(store, ["the", "reef"], "accept", by="Ben")
    colloc.judge(store, ["at", "dawn"], "unsure", by="Ben")
    picture = tmp_path / "p.svg"
    arguments = ["appraise", str(store), "--show", "npmi,joint", "--repeats", "50", "--at", "3", "-f", "csv"]
    assert main([*arguments, "--plot", str(picture)]) == 0
    out, err = capsys.readouterr()
    rows = list(csv.DictReader(out.splitlines()))
    assert [row["measure"] for row in rows] == ["npmi", "joint"]
    assert float(rows[0]["average_precision"]) == 1.0
    assert float(rows[0]["precision_at_3"]) == 1.0
    # The disputed pair and the one that nobody decided are passed over; unsure beside accept does not matter.
    assert "candidates 6; wanted 3" in err
    assert "listed 8; passed over 2" in err
    assert "<svg" in picture.read_text(encoding="utf-8")
    assert main([*arguments, "--by", "Anna"]) == 0
    assert "candidates 7; wanted 3" in capsys.readouterr().err
    assert main([*arguments, "--at", "7,8,100", "--by", "Anna", "-f", "jsonl"]) == 0
    out, err = capsys.readouterr()
    row = json.loads(out.splitlines()[0])
    assert row["precision_at_7"] == pytest.approx(3 / 7)
    assert {row[f"{name}_at_{place}"] for name in ("precision", "recall") for place in (8, 100)} == {None}
    assert "7 candidates: nothing to tell at 8, 100; choose nearer places with --at" in err
    assert main(["appraise", str(store), "--show", "log_odds_se"]) == 2
    assert "rank by another" in capsys.readouterr().err
    assert main([*arguments, "--at", "x"]) == 2
    assert main([*arguments, "--ranking", "x.csv"]) == 2


def test_export_by_command(store: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    colloc.judge(store, ["thick", "fog"], "accept", by="Anna")
    for name in ("folder", "e.xlsx", "e.jsonl", "e.json", "e.xml", "e.tei", "e.ttl", "e.jsonld", "e.graphml"):
        assert main(["export", str(store), str(tmp_path / name), "--language", "en", "--show", "dice"]) == 0
        assert f"1 entry in {tmp_path / name}" in capsys.readouterr().err
    record = json.loads((tmp_path / "e.jsonl").read_text(encoding="utf-8"))
    expected = colloc.pairs(store, show=["dice"], limit=0).to_dicts()
    row = next(one for one in expected if (one["first"], one["second"]) == ("thick", "fog"))
    assert record["scores"] == {"dice": row["dice"]}
    assert (record["joint"], record["table"]["expected"]) == (row["joint"], row["expected"])
    assert sorted(path.name for path in (tmp_path / "folder").iterdir()) == [
        *("datapackage.json", "entries.csv", "examples.csv"),
    ]
    assert main(["export", str(store), str(tmp_path / "e.pdf")]) == 2
    assert "no format has the ending '.pdf'" in capsys.readouterr().err
    assert main(["export", str(store), str(tmp_path / "e.pdf"), "-f", "pdf"]) == 2
    assert main(["export", str(store), str(tmp_path / "e.ttl"), "--base-iri", "no iri"]) == 2
