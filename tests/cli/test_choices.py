"""What can be chosen: one measure to rank by, columns beside it, and what the shell completes."""

from __future__ import annotations

import csv
import io
import os
import subprocess
import sys
from collections import Counter
from pathlib import Path

import pytest

import colloc
from colloc.measures.catalogue import MEASURES, find_ranking

from .conftest import Run

SENTENCES = ("thick fog at dawn", "the thick fog came in from the sea", "thick fog again", "the sea was calm at dawn")


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Path:
    store = tmp_path_factory.mktemp("choices") / "a.colloc"
    colloc.build(store, documents=[{"text": f"{text}.", "begins": text.split()[0]} for text in SENTENCES])
    return store


def completed(*words: str) -> list[str]:
    """What the shell is offered for the last word, as its completion script asks for it."""
    line = " ".join(["colloc", *words])
    asked = {"_COLLOC_COMPLETE": "complete_bash", "COMP_WORDS": line, "COMP_CWORD": str(len(words))}
    done = subprocess.run(
        [sys.executable, "-c", "from colloc.cli.app import main; main()"],
        env={**os.environ, **asked},
        capture_output=True,
        text=True,
        check=False,
        timeout=60,
    )
    return done.stdout.split()


def test_the_shell_offers_names_that_can_be_used() -> None:
    offered = completed("pairs", "a.colloc", "--measure", "")
    assert offered
    for name in offered:
        assert name == "joint" or find_ranking(name)
    # a standard error is in the catalogue, but nothing to rank by
    assert set(MEASURES) - set(offered) == {name for name, one in MEASURES.items() if one.tells == "error"}
    tokens = completed("pairs", "a.colloc", "--margins", "tokens", "--measure", "")
    assert set(offered) - set(tokens) == {
        name for name, one in MEASURES.items() if one.needs_cells and one.tells != "error"
    }
    assert completed("pairs", "a.colloc", "--show", "pmi,q_") == ["pmi,q_value"]
    assert completed("score", "a.colloc", "--show", "npm") == ["npmi"]


def test_a_second_measure_to_rank_by_is_refused(run: Run, built: Path) -> None:
    for several in (("-m", "g2", "-m", "dice"), ("-m", "g2,dice")):
        ran = run("pairs", built, *several)
        assert ran.code == 2
        assert ran.err == (
            "colloc: --measure ranks by one measure, not by g2 and dice: add --show dice to see it beside g2\n"
        )
        assert run("around", built, "fog", *several).code == 2
        assert run("sheet", built, *several).code == 2
    assert "--show t,dice to see them beside g2" in run("pairs", built, "-m", "g2,t,dice").err
    assert "unknown measure ''" in run("pairs", built, "-m", "").err
    assert run("pairs", built, "-m", "g2", "--min-count", 1).code == 0


def test_frequencies_of_the_words_stand_beside_them(run: Run, built: Path) -> None:
    frequency = Counter(word for text in SENTENCES for word in text.split())
    for command in (("pairs", built), ("around", built, "fog", "sea")):
        ran = run(*command, "--show", "first_count,second_count", "--min-count", 1, "--any-strength", "-f", "csv")
        rows = list(csv.DictReader(io.StringIO(ran.out)))
        assert len(rows) > 8
        assert list(rows[0])[-5:] == ["pmi", "npmi", "g2", "first_count", "second_count"]
        for row in rows:
            assert int(row["first_count"]) == frequency[row["first"]]
            assert int(row["second_count"]) == frequency[row["second"]]


def test_frequencies_are_those_of_the_documents_asked_about(built: Path) -> None:
    within = [text for text in SENTENCES if text.startswith("the ")]
    frequency = Counter(word for text in within for word in text.split())
    answer = colloc.pairs(built, where="begins=the", show=["first_count", "g2"], min_count=1, any_strength=True)
    assert answer.names[-3:] == ("g2", "npmi", "first_count")
    assert {row["first"]: row["first_count"] for row in answer} == {
        row["first"]: frequency[row["first"]] for row in answer
    }
