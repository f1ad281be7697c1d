"""Many slices: planted truths, the sums of the whole, pooled odds and homogeneity as statsmodels has them."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

import colloc
from colloc.answers.contrasts.strata import verdict
from colloc.errors import NotSeenError
from colloc.store.opening import Store


def test_words_that_tell_years_apart(talkative: Store) -> None:
    """Planted: packet gives way to steamer, oil to paraffin; one log repeats a phrase."""
    rows = {row["word"]: row for row in colloc.contrast(talkative, by="year", limit=0)}
    for word in ("packet", "steamer", "oil", "paraffin"):
        assert rows[word]["says"] == "holds over documents"
    assert rows["strange"]["says"] == rows["parrot"]["says"] == "not beyond the differences between documents"
    ranked = colloc.contrast(talkative, by="year", limit=5)
    assert np.all(np.diff(ranked["bits"]) <= 0)
    by_documents = colloc.contrast(talkative, by="year", sort="documents", limit=4)
    assert set(by_documents["word"]) == {"packet", "steamer", "oil", "paraffin"}


def test_two_slices_tell_as_much_as_their_contrast(talkative: Store) -> None:
    """With two slices the information is the four-cell G2 over 2 ln 2."""
    apart = {row["word"]: row for row in colloc.contrast(talkative, by="genre", limit=0)}
    sides = colloc.contrast(talkative, this="genre=log", limit=0)
    for row in sides:
        assert apart[row["word"]]["g2"] == pytest.approx(abs(row["g2"]), abs=1e-6)
        assert apart[row["word"]]["document_h"] == pytest.approx(row["document_z"] ** 2, abs=1e-6)


def test_a_pair_over_slices_is_that_of_statsmodels(talkative: Store) -> None:
    from statsmodels.stats.contingency_tables import StratifiedTable

    answer = colloc.contrast(talkative, "thick", "fog", by="genre")
    lines = {row["slice"]: row for row in answer}
    tables = []
    for genre in ("log", "notice"):
        (row,) = [
            row for row in colloc.around(talkative, "thick", where=f"genre={genre}", limit=0) if row["second"] == "fog"
        ]
        assert lines[genre]["joint"] == row["joint"]
        assert lines[genre]["pmi"] == pytest.approx(row["pmi"])
        a, r, c, n = (row[name] for name in ("joint", "first_total", "second_total", "total"))
        tables.append(np.array([[a, r - a], [c - a, n - r - c + a]], dtype=float))
    expected = StratifiedTable(tables)
    pooled = lines["within the slices (Mantel-Haenszel)"]
    assert pooled["log_odds"] == pytest.approx(expected.logodds_pooled)
    assert (pooled["low"], pooled["high"]) == pytest.approx(expected.logodds_pooled_confint())
    assert pooled["statistic"] == pytest.approx(expected.test_null_odds(correction=False).statistic)
    same = lines["same in all slices? (Breslow-Day)"]
    assert same["statistic"] == pytest.approx(expected.test_equal_odds(adjust=False).statistic)
    adjusted = lines["same in all slices? (Breslow-Day, Tarone)"]
    assert adjusted["p"] == pytest.approx(expected.test_equal_odds(adjust=True).pvalue)
    assert answer.settings["says"] == "holds within the slices; its strength differs between them"


def test_slices_add_up(talkative: Store) -> None:
    answer = colloc.contrast(talkative, "steam", "launch", by="year")
    values = [row for row in answer if row["slice"].isdigit()]
    whole = next(row for row in answer if row["slice"] == "all as one")
    assert len(values) == 20
    (row,) = [row for row in colloc.around(talkative, "steam", limit=0) if row["second"] == "launch"]
    assert sum(one["joint"] for one in values) == whole["joint"] == row["joint"]
    assert whole["pmi"] == pytest.approx(row["pmi"])


@pytest.fixture(scope="module")
def markets(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Herring and barrels both belong to the coast, and pay no heed to each other there."""
    folder = tmp_path_factory.mktemp("markets")
    random = np.random.default_rng(3)
    documents = []
    for number in range(60):
        coast = number % 2 == 0
        chances = [0.2, 0.2, 0.3, 0.3] if coast else [0.0, 0.0, 0.5, 0.5]
        text = " ".join(random.choice(["herring", "barrel", "turnip", "corn"], size=400, p=chances))
        documents.append({"id": f"m{number}", "place": "coast" if coast else "hills", "text": text})
    (folder / "markets.jsonl").write_text("\n".join(map(json.dumps, documents)) + "\n", encoding="utf-8")
    colloc.build(folder / "m.colloc", [str(folder / "markets.jsonl")], jobs=1)
    return folder / "m.colloc"


def test_a_pooled_association_that_vanishes_is_flagged(markets: Path) -> None:
    answer = colloc.contrast(markets, "herring", "barrel", by="place")
    lines = {row["slice"]: row for row in answer}
    assert lines["all as one"]["low"] > 0.5
    assert abs(lines["within the slices (Mantel-Haenszel)"]["log_odds"]) < 0.1
    assert answer.settings["says"].startswith("vanishes within the slices")
    with pytest.raises(NotSeenError, match="'squid' never occurs"):
        colloc.contrast(markets, "herring", "squid", by="place")


def test_a_slice_without_the_pair_and_next_to_no_chance_of_it_has_no_odds_ratio(tmp_path: Path) -> None:
    random = np.random.default_rng(5)
    documents = []
    for number, place in enumerate(["coast", "hills", "moor"] * 4):
        words = list(random.choice(["turnip", "corn", "meadow"], size=400))
        if place == "moor":
            words[3], words[300] = "herring", "barrel"
        else:
            words[10:60] = ["herring", "barrel", "corn", "herring", "corn"] * 10
        documents.append({"id": f"m{number}", "place": place, "text": " ".join(words)})
    (tmp_path / "m.jsonl").write_text("\n".join(map(json.dumps, documents)) + "\n", encoding="utf-8")
    colloc.build(tmp_path / "m.colloc", [str(tmp_path / "m.jsonl")], jobs=1)
    answer = colloc.contrast(tmp_path / "m.colloc", "herring", "barrel", by="place", window=2)
    lines = {row["slice"]: row for row in answer}
    assert lines["moor"]["joint"] == 0
    assert 0 < lines["moor"]["expected"] < 1
    assert all(np.isnan(lines["moor"][name]) for name in ("log_odds", "low", "high"))
    assert np.isfinite(lines["coast"]["log_odds"])
    assert lines["same in all slices? (Woolf)"]["df"] == 1
    assert lines["same in all slices? (Breslow-Day)"]["df"] == 2
    assert answer.settings["left_out_by_woolf"] == 1
    assert "1 of 3 slices" in answer.settings["says"]


@pytest.mark.parametrize(
    ("numbers", "said"),
    [
        ((1.0, (0.8, 1.2), 0.01, (-0.2, 0.2), 0.5), "vanishes within the slices"),
        ((1.0, (0.8, 1.2), -0.5, (-0.7, -0.3), 0.5), "turns round within the slices"),
        ((1.0, (0.8, 1.2), 0.3, (0.1, 0.5), 0.5), "weaker within the slices: 0.30 instead of 1.00 nats"),
        ((1.0, (0.8, 1.2), 0.9, (0.7, 1.1), 0.01), "holds within the slices; its strength differs between them"),
        ((0.1, (-0.1, 0.3), 0.5, (0.2, 0.8), 0.5), "holds within the slices"),
        ((0.1, (-0.1, 0.3), 0.1, (-0.2, 0.4), 0.5), "no association beyond chance"),
    ],
)
def test_the_verdict(numbers: tuple[float, tuple[float, float], float, tuple[float, float], float], said: str) -> None:
    assert verdict(*numbers).startswith(said)
