"""Expressions held against planted entries and decisions: a plain ranking, and a reference of average precision."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import numpy as np
import pytest
from sklearn.metrics import average_precision_score

import colloc
from colloc.answers.appraisal.of_expressions import CAN_RANK
from colloc.cli.app import main
from colloc.errors import UsageError

PLANTED = 45


@pytest.fixture(scope="module")
def planted(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, list[list[str]]]:
    """Thirty documents of random words with 45 planted expressions of two to four words, some hyphenated."""
    generator = np.random.default_rng(4)
    gold = [
        [f"p{chr(97 + number // 26)}{chr(97 + number % 26)}{place}q" for place in "abcd"[: 2 + number % 3]]
        for number in range(PLANTED)
    ]
    fillers = [f"f{chr(97 + number // 26)}{chr(97 + number % 26)}" for number in range(60)]
    lines = []
    for document in range(30):
        sentences = []
        for _ in range(60):
            words: list[str] = []
            for _ in range(5):
                if generator.random() < 0.3:
                    entry = gold[generator.integers(PLANTED)]
                    words += entry if generator.random() < 0.7 else [entry[0]]
                else:
                    words.append(fillers[min(int(generator.exponential(6)), 59)])
            sentences.append(" ".join(words))
        lines.append(json.dumps({"id": f"d{document}", "text": "\n".join(sentences)}))
    folder = tmp_path_factory.mktemp("planted-expressions")
    (folder / "t.jsonl").write_text("\n".join(lines), encoding="utf-8")
    colloc.build(folder / "t.colloc", [str(folder / "t.jsonl")], jobs=1)
    return folder / "t.colloc", gold


def test_against_a_list_as_a_plain_ranking_of_what_is_listed(planted: tuple[Path, list[list[str]]]) -> None:
    store, gold = planted
    kept = {"names": "keep", "common": "keep", "fragments": "keep"}
    listed = [*gold, ["never", "there"], ["one"], [word.upper() for word in gold[0]], ["fbz,", "fbz;"]]
    found = colloc.appraise(store, items="expressions", gold=listed, at=[20], repeats=100, **kept).measures  # type: ignore[arg-type]
    ranking = colloc.expressions(store, limit=0, show="all", **kept)  # type: ignore[arg-type]
    texts = {" ".join(entry) for entry in gold}
    wanted = np.array([text in texts for text in ranking["expression"]])
    assert wanted.sum() == PLANTED
    rows = {row["measure"]: row for row in found}
    assert set(rows) == set(CAN_RANK)
    for name, row in rows.items():
        values = np.nan_to_num(ranking[name].astype(float), nan=-1e300, neginf=-1e300, posinf=1e300)
        assert row["average_precision"] == pytest.approx(average_precision_score(wanted, values)), name
        assert row["ap_low"] <= row["average_precision"] <= row["ap_high"]
        above = values >= row["threshold"]
        assert wanted[above].mean() == pytest.approx(row["threshold_precision"])
        assert wanted[above].sum() / PLANTED == pytest.approx(row["threshold_recall"])
        best = np.sort(values)[::-1][19]
        sure, tied = values > best, values == best
        hits = wanted[sure].sum() + (20 - sure.sum()) * wanted[tied].mean()
        assert row["precision_at_20"] == pytest.approx(hits / 20)
        assert row["recall_at_20"] == pytest.approx(hits / PLANTED)
    assert found.settings["candidates"] == len(ranking)
    # divided as the text is: the comma and the semicolon are no words, and "one" alone is no expression
    assert (found.settings["listed"], found.settings["passed_over"]) == (PLANTED + 2, 2)
    assert found["average_precision"].tolist() == sorted(found["average_precision"].tolist(), reverse=True)
    assert rows["strength"]["average_precision"] > rows["count"]["average_precision"]


def test_folded_candidates_and_lengths(planted: tuple[Path, list[list[str]]]) -> None:
    store, gold = planted
    found = colloc.appraise(store, items="expressions", gold=gold, min_words=3, max_words=4, repeats=5)
    listed = colloc.expressions(store, min_words=3, max_words=4, limit=0)
    texts = {" ".join(entry) for entry in gold}
    assert found.measures.settings["candidates"] == len(listed)
    assert found.measures.settings["wanted"] == sum(text in texts for text in listed["expression"])
    assert found.measures.settings["listed"] == PLANTED


def test_a_learnt_ranking_of_expressions(planted: tuple[Path, list[list[str]]], tmp_path: Path) -> None:
    store, gold = planted
    found = colloc.appraise(store, items="expressions", gold=gold, combined=True, limit=30, repeats=20, seed=3)
    assert found.folds is not None
    assert found.weights is not None
    assert found.ranking is not None
    rows = {row["measure"]: row["average_precision"] for row in found.measures}
    assert rows["combined"] > 0.9
    assert set(found.weights["measure"]) == set(CAN_RANK)
    assert found.ranking.names == ("expression", "count", "combined", "wanted")
    assert found.ranking["wanted"].mean() > 0.9
    assert found.ranking["combined"].tolist() == sorted(found.ranking["combined"].tolist(), reverse=True)


def test_against_decisions_on_expressions(store: Path, capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    for words in ("by and large", "into account", "thick fog", "strong wind"):
        colloc.judge(store, words, "accept", by="Anna")
    for words in ("the boat", "and the", "of one", "they took the", "the thick"):
        colloc.judge(store, words, "reject", by="Anna")
    colloc.judge(store, "took * * into", "accept", by="Anna")  # open places: no sequence to rank
    colloc.judge(store, "lamp lamp", "reject", by="Anna")  # never occurs
    colloc.judge(store, "of one", "accept", by="Ben")
    colloc.judge(store, ["thick", "fog"], "accept", by="Ben")  # a pair: nothing to do with it
    picture = tmp_path / "p.svg"
    arguments = ["appraise", str(store), "--items", "expressions", "--repeats", "50", "--at", "2", "-f", "csv"]
    assert main([*arguments, "--plot", str(picture)]) == 0
    out, err = capsys.readouterr()
    assert "candidates 8; wanted 4" in err
    assert "listed 11; passed over 3" in err
    rows = {row["measure"]: row for row in csv.DictReader(out.splitlines())}
    assert set(rows) == set(CAN_RANK)
    ranking = colloc.expressions(store, fragments="keep", common="keep", show="all", limit=0)
    numbers = {row["expression"]: row for row in ranking}
    decided = (
        "by and large",
        "into account",
        "thick fog",
        "strong wind",
        "the boat",
        "and the",
        "they took the",
        "the thick",
    )
    wanted = np.arange(len(decided)) < 4
    values = [numbers[text]["weakest_split"] for text in decided]
    expected = average_precision_score(wanted, values)
    assert float(rows["weakest_split"]["average_precision"]) == pytest.approx(expected)
    assert "<svg" in picture.read_text(encoding="utf-8")
    assert main([*arguments, "--by", "Anna"]) == 0
    assert "candidates 9; wanted 4" in capsys.readouterr().err


def test_what_does_not_go_together(store: Path, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(UsageError, match="no expression of layer 'fold' was accepted"):
        colloc.appraise(store, items="expressions")
    with pytest.raises(UsageError, match="holds no expression of two words"):
        colloc.appraise(store, items="expressions", gold=[["one"]])
    with pytest.raises(UsageError, match="not ranked by 'npmi'"):
        colloc.appraise(store, items="expressions", gold=[["thick", "fog"]], show=["npmi"], fragments="keep")
    with pytest.raises(UsageError, match="window is nothing that expressions have"):
        colloc.appraise(store, items="expressions", gold=[["thick", "fog"]], window=3)
    with pytest.raises(UsageError, match="max_words is nothing that pairs have"):
        colloc.appraise(store, gold=[["thick", "fog"]], max_words=3)
    with pytest.raises(UsageError, match="pairs or expressions"):
        colloc.appraise(store, items="words")  # type: ignore[arg-type]
    assert main(["appraise", str(store), "--items", "expressions", "--directed"]) == 2
    assert "directed is nothing that expressions have" in capsys.readouterr().err
