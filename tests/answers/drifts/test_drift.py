"""Drift: periods, planted truths of the demo corpora, trends as the measures give them, and what cannot be asked."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy import stats

import colloc
from colloc.answers.drifts.changed import bars
from colloc.answers.drifts.periods import make_periods
from colloc.cli.app import main
from colloc.errors import NotSeenError, UsageError
from tests.answers.conftest import Demo


def test_automatic_periods_have_enough_in_each(demo: Demo) -> None:
    periods = make_periods(demo.store, "year")
    assert len(periods) == 10
    assert periods.groups.sizes.min() >= 5
    assert periods.groups.sizes.sum() == 600
    assert periods.groups.names[0] == "1871..1872"
    assert np.all(np.diff(periods.times) > 0)


@pytest.mark.parametrize(
    ("ways", "names"),
    [
        ({"bins": 4}, ["1871..1875", "1876..1880", "1881..1885", "1886..1890"]),
        ({"edges": [1880, 1890]}, ["1871..1879", "1880..1889", "1890"]),
        ({"width": 10}, ["1871..1879", "1880..1889", "1890"]),
        ({"bins": 100}, [str(year) for year in range(1871, 1891)]),
    ],
)
def test_given_periods(demo: Demo, ways: dict[str, object], names: list[str]) -> None:
    assert list(make_periods(demo.store, "year", **ways).groups.names) == names  # type: ignore[arg-type]


def test_rates_of_a_word_are_those_of_its_slices(demo: Demo) -> None:
    answer = colloc.drift(demo.store, "paraffin", by="year", bins=4)
    for row in answer:
        (alone,) = colloc.words(demo.store, pattern="paraffin", where=f"year={row['period']}")
        assert (row["count"], row["held"]) == (alone["count"], alone["documents"])
        assert row["per_million"] == pytest.approx(alone["per_million"])
        assert row["low"] < row["per_million"] < row["high"]


def test_planted_drifts(demo: Demo) -> None:
    """corpora_demo/truths.json: paraffin for oil, steamer for packet, steam launch tighter, thick fog as it was."""
    for word, said in (("paraffin", "rises"), ("steamer", "rises"), ("oil", "falls"), ("packet", "falls")):
        answer = colloc.drift(demo.store, word, by="year")
        assert answer.settings["says"] == f"frequency: {said}, over documents too"
        assert answer.settings["document_p"] < 1e-6
    launch = colloc.drift(demo.store, "steam", "launch", by="year")
    assert launch.settings["says"] == "frequency: rises, over documents too; association: rises, over documents too"
    fog = colloc.drift(demo.store, "thick", "fog", by="year")
    assert fog.settings["says"].endswith("association: no trend beyond the differences between documents")
    tau = stats.kendalltau(launch["time"], launch["per_million"])
    assert launch.settings["tau"] == pytest.approx(tau.statistic)
    assert launch.settings["tau_p"] == pytest.approx(tau.pvalue)


def test_a_pair_by_period_is_that_of_its_slices(demo: Demo) -> None:
    answer = colloc.drift(demo.store, "steam", "launch", by="year", bins=3)
    for row in answer:
        found = colloc.around(demo.store, "steam", where=f"year={row['period']}", limit=0, min_count=1)
        (alone,) = [one for one in found if one["second"] == "launch"]
        assert row["joint"] == alone["joint"]
        assert row["expected"] == pytest.approx(alone["expected"])
        assert row["pmi"] == pytest.approx(alone["pmi"])
        assert row["pmi_low"] < row["pmi"] < row["pmi_high"]


def test_what_changed_most(demo: Demo) -> None:
    words = colloc.drift(demo.store, by="year", everything=True, words=True, limit=0)
    found = {row["word"]: row for row in words}
    assert set(words["word"][:2]) == {"steamer", "paraffin"}
    assert found["packet"]["says"] == found["oil"]["says"] == "falls over documents"
    assert found["strange"]["says"] == "not beyond the differences between documents"
    assert found["steamer"]["shape"][0] < found["steamer"]["shape"][-1]
    alone = colloc.drift(demo.store, "steamer", by="year")
    assert found["steamer"]["slope"] == pytest.approx(alone.settings["slope"])
    assert found["steamer"]["document_z"] == pytest.approx(alone.settings["document_z"])
    pairs = colloc.drift(demo.store, by="year", everything=True, limit=10)
    assert {"steamer", "packet"} <= {*pairs["first"], *pairs["second"]}
    strength = colloc.drift(demo.store, by="year", everything=True, sort="association", limit=10)
    assert (strength["first"][0], strength["second"][0]) == ("steam", "launch")
    assert 0 < strength["odds_low"][0] < strength["odds_slope"][0] < strength["odds_high"][0]


def test_a_picture_is_drawn(demo: Demo, tmp_path: Path) -> None:
    colloc.drift(demo.store, "steam", "launch", by="year", plot=tmp_path / "a.svg")
    colloc.drift(demo.store, "steam", "launch", by="year", plot=tmp_path / "b.svg")
    drawn = (tmp_path / "a.svg").read_bytes()
    assert drawn == (tmp_path / "b.svg").read_bytes()
    assert b"per million words" in drawn
    assert b"PMI (bits)" in drawn
    colloc.drift(demo.store, "paraffin", by="year", plot=tmp_path / "c.png")
    assert (tmp_path / "c.png").read_bytes().startswith(b"\x89PNG")


@pytest.mark.parametrize(
    ("asked", "message"),
    [
        ({"first": "fog", "by": "genre"}, "no document here has a number as 'genre'"),
        ({"first": "fog", "by": "year", "where": "year=1880..1881"}, "at least 3 different values"),
        ({"first": "fog", "by": "year", "bins": 2}, "at least 3 periods"),
        ({"first": "fog", "by": "year", "edges": [1880]}, "leave 2 with text"),
        ({"first": "fog", "by": "year", "edges": [1880, 1875]}, "edges must ascend"),
        ({"first": "fog", "by": "year", "width": -1.0}, "above 0"),
        ({"first": "fog", "by": "year", "bins": 4, "width": 5.0}, "three ways"),
        ({"by": "year"}, "give X"),
        ({"first": "fog", "by": "year", "everything": True}, "give X"),
        ({"first": "fog", "by": "year", "words": True}, "goes with --all"),
        ({"by": "year", "everything": True, "plot": "x.svg"}, "leave out --plot"),
        ({"by": "year", "everything": True, "words": True, "sort": "association"}, "sorted by one of"),
    ],
)
def test_what_cannot_be_followed(demo: Demo, asked: dict[str, object], message: str) -> None:
    with pytest.raises(UsageError, match=message):
        colloc.drift(demo.store, **asked)  # type: ignore[arg-type]


def test_words_that_are_not_there(demo: Demo) -> None:
    with pytest.raises(NotSeenError, match="'unheard' never occurs"):
        colloc.drift(demo.store, "unheard", by="year")
    with pytest.raises(NotSeenError, match="never meet"):
        colloc.drift(demo.store, "packet", "paraffin", by="year", window=1)


def test_bars_run_from_the_smallest_to_the_largest() -> None:
    assert bars(np.array([0.0, 1.0, np.nan, 7.0])) == "▁▂ █"
    assert bars(np.array([2.0, 2.0])) == "▁▁"
    assert bars(np.array([np.nan])) == " "


@pytest.fixture
def thin(tmp_path: Path) -> Path:
    """A store of eight years with one document each but for two; the pair never meets in the fourth year."""
    filler = "the pier was long and the day was fine "
    records = []
    for place in range(8):
        said = "fog near " + filler if place == 3 else "thick fog " * (place + 1) + "thick harbour fog "
        for copy in range(2 if place in (2, 6) else 1):
            text = said * (copy + 1) + filler * 30
            records.append({"id": f"d{place}.{copy}", "text": text, "year": 1900 + place})
    source = tmp_path / "thin.jsonl"
    source.write_text("".join(json.dumps(record) + "\n" for record in records), encoding="utf-8")
    made = tmp_path / "thin.colloc"
    colloc.build(made, [str(source)])
    return made


def test_single_documents_give_no_slope_and_no_verdict(thin: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for words in (("fog",), ("thick", "fog")):
        answer = colloc.drift(thin, *words, by="year", width=1)
        assert np.isnan(answer.settings["slope"])
        assert answer.settings["says"].startswith("6 of 8 periods hold a single document: no slope and no verdict")
    with pytest.raises(UsageError, match="6 of 8 periods hold a single document"):
        colloc.drift(thin, by="year", width=1, everything=True, words=True, sort="slope")
    assert main(["drift", str(thin), "thick", "fog", "--width", "1"]) == 0
    shown = capsys.readouterr().out
    assert "rate: no slope" in shown
    assert "PMI: no slope" in shown
    assert "rises" not in shown


def test_the_verdict_agrees_with_the_interval(demo: Demo) -> None:
    for word in ("fog", "paraffin", "oil", "strange", "the", "harbour", "steamer"):
        told = colloc.drift(demo.store, word, by="year").settings
        if "rises" in told["says"]:
            assert told["slope_low"] > 0
        if "falls" in told["says"]:
            assert told["slope_high"] < 0
        if "no trend beyond" in told["says"]:
            assert told["slope_low"] <= 0 <= told["slope_high"]


def test_the_line_breaks_where_the_pair_never_met(thin: Path, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    from matplotlib.axes import Axes

    drawn: list[tuple[np.ndarray, np.ndarray]] = []
    own = Axes.errorbar

    def noted(axes: Axes, x: np.ndarray, y: np.ndarray, **more: Any) -> Any:
        drawn.append((y, more["yerr"]))
        return own(axes, x, y, **more)

    monkeypatch.setattr(Axes, "errorbar", noted)
    colloc.drift(thin, "thick", "fog", by="year", width=1, plot=tmp_path / "a.svg")
    (rate, rate_reach), (association, _) = drawn
    assert np.isfinite(rate).all()
    assert not rate_reach[:, [0, 1, 4, 5, 7]].any(), "an unbounded interval has no bar"
    assert rate_reach[1, [2, 3, 6]].all()
    assert np.flatnonzero(np.isnan(association)).tolist() == [3]
