"""``contrast``, ``drift``, ``info --methods``, and the tables that questions about slices leave in the store."""

from __future__ import annotations

import csv
import io
import json
import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest

import colloc
from colloc.counts import tallying

from .conftest import Run

CORPORA = Path(__file__).resolve().parents[2] / "corpora_demo"


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("comparing")
    texts = [str(shutil.copy(CORPORA / name, folder / name)) for name in ("logbooks.jsonl", "notices.jsonl")]
    colloc.build(folder / "d.colloc", texts, jobs=1)
    shutil.copy(folder / "d.colloc", folder / "untouched.colloc")
    return folder / "d.colloc"


@pytest.fixture
def store(built: Path, tmp_path: Path) -> Path:
    """A copy that no question has left a table in."""
    return Path(shutil.copy(built.with_name("untouched.colloc"), tmp_path / "d.colloc"))


def rows(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text)))


def test_contrast_of_words(run: Run, built: Path) -> None:
    ran = run("contrast", built, "--this", "genre=log", "-n", 4)
    assert ran.code == 0
    head, *lines = ran.out.splitlines()
    bounds = ("formula_low", "formula_high")
    counts = ("count_this", "count_that", "documents_this", "documents_that")
    assert tuple(head.split()) == ("word", "log_ratio", *bounds, *counts, "g2", "document_q", "says")
    assert [line.split()[0] for line in lines] == ["we", "and", "will", "be"]
    assert "this genre=log; that not (genre=log); min count 5" in ran.err
    wide = run("contrast", built, "--this", "genre=log", "-n", 4, "--wide", "-q")
    assert {"q", "g2_two_cells", "per_million_this", "document_z"} <= set(wide.out.splitlines()[0].split())


@pytest.mark.parametrize(
    ("asked", "first"),
    [
        (("--by", "year", "-n", 1), {"word": "strange"}),
        (("--word", "brisk", "--word", "swift", "-n", 2), {"word": "breeze"}),
        (("thick", "fog", "--by", "genre"), {"slice": "log", "joint": "301"}),
        (("thick", "fog", "--this", "genre=log"), {"item": "tokens", "this": "96566"}),
        (("--this", "genre=log", "--pairs", "-n", 2), {"first": "the", "second": "and"}),
        (("--this", "genre=log", "--permutations", 99, "-n", 2), {"word": "we", "document_p": "0.01"}),
        (("--reference", "en", "--pattern", "fog", "-n", 1), {"word": "fog", "says": "holds over documents"}),
    ],
)
def test_every_contrast_in_a_file(
    run: Run, built: Path, tmp_path: Path, asked: tuple[str, ...], first: dict[str, str]
) -> None:
    written = tmp_path / "out.csv"
    ran = run("contrast", built, *asked, "-f", "csv", "-o", written, "--settings-beside")
    assert ran.code == 0, ran.err
    found = rows(written.read_text(encoding="utf-8"))[0]
    assert {name: found[name] for name in first} == first
    beside = json.loads((tmp_path / "out.csv.settings.json").read_text(encoding="utf-8"))
    assert beside["command"] == "contrast"
    told = run("info", built, "--methods", "--result", tmp_path / "out.csv.settings.json")
    assert "The result was made by `colloc contrast`" in told.out
    assert "@software{colloc," in told.out


def test_the_verdict_stands_below_the_table(run: Run, built: Path) -> None:
    ran = run("contrast", built, "strange", "lamp", "--this", "genre=log")
    assert ran.out.splitlines()[-1] == "this only; one document carries it (40 of 40)"


def test_contrast_with_a_list(run: Run, built: Path, tmp_path: Path) -> None:
    listed = tmp_path / "list.tsv"
    listed.write_text("word\tcount\nfog\t10\nmotorway\t90\nFOG\t5\n", encoding="utf-8")
    ran = run("contrast", built, "--list", listed, "-f", "csv", "-n", 0)
    found = {row["word"]: row for row in rows(ran.out)}
    assert found["fog"]["count_that"] == "15"
    assert found["motorway"]["says"] == "that only; no document here has it"
    for text, message in (
        ("word,n\nfog,1\n", "needs the columns word and count; there are word, n"),
        ("word,count\nfog,1\nsea,many\n", "list.csv:3: count must be a whole number, not 'many'"),
        ("word,count\nfog,-1\n", "list.csv:2: needs a word and a count that is not negative"),
    ):
        wrong = tmp_path / "list.csv"
        wrong.write_text(text, encoding="utf-8")
        ran = run("contrast", built, "--list", wrong)
        assert ran.code == 65
        assert message in ran.err


def test_drift(run: Run, built: Path, tmp_path: Path) -> None:
    ran = run("drift", built, "steam", "launch", "--bins", 5, "--plot", tmp_path / "d.svg")
    assert ran.code == 0, ran.err
    lines = ran.out.splitlines()
    assert lines[0].split()[:4] == ["period", "time", "documents", "tokens"]
    assert lines[1].startswith("1871..1874")
    assert lines[7].startswith("rate ▁")
    assert lines[-1] == "frequency: rises, over documents too; association: rises, over documents too"
    assert (tmp_path / "d.svg").exists()
    ranked = run("drift", built, "--all", "--words", "-n", 2)
    assert [line.split()[0] for line in ranked.out.splitlines()] == ["word", "steamer", "packet"]
    assert run("drift", built, "fog", "--edges", "1880,x").code == 2
    assert run("drift", built, "fog", "--plot", tmp_path / "d.bmp").code == 2
    course = run("drift", built, "oil", "--by", "year", "-f", "json")
    assert json.loads(course.out)["settings"]["says"] == "frequency: falls, over documents too"


def test_methods(run: Run, built: Path, tmp_path: Path) -> None:
    ran = run("info", built, "--methods", "--show", "dice", "-f", "json")
    told = json.loads(ran.out)
    assert "Dice coefficient" in told["paragraph"]
    assert told["bibtex"].startswith("@software{colloc,")
    assert run("info", built, "--methods", "--by", "genre").code == 2
    assert run("info", built, "--show", "dice").code == 2
    assert run("info", built, "--methods", "-f", "csv").code == 2
    assert run("info", built, "--methods", "--result", tmp_path / "none.json").code == 66
    (tmp_path / "no.json").write_text("[]", encoding="utf-8")
    assert run("info", built, "--methods", "--result", tmp_path / "no.json").code == 65


def test_slices_are_listed_by_value(run: Run, built: Path) -> None:
    found = rows(run("info", built, "--by", "genre", "-f", "csv").out)
    assert [(row["genre"], row["documents"]) for row in found] == [("log", "300"), ("notice", "300")]
    whole = json.loads(run("info", built, "-f", "json").out)
    assert sum(int(row["tokens"]) for row in found) == whole["tokens"]


def slices_kept(run: Run, store: Path) -> Iterator[tuple[str, str]]:
    for row in rows(run("tally", store, "--list", "-f", "csv").out):
        if row["where"]:
            yield row["where"], row["asked_for"]


def test_tables_of_slices_are_kept_until_dropped(run: Run, store: Path) -> None:
    ranked = run("pairs", store, "--where", "genre=log", "-n", 3).out
    assert list(slices_kept(run, store)) == [("genre=log", "false")]
    assert run("pairs", store, "--where", "genre=log", "-n", 3).out == ranked
    run("contrast", store, "--pairs", "--this", "genre=log", "-n", 1)
    assert sorted(slices_kept(run, store)) == [("genre=log", "false"), ("not (genre=log)", "false")]
    assert run("tally", store, "--drop", "--where", "genre=log").code == 0
    assert list(slices_kept(run, store)) == [("not (genre=log)", "false")]


def test_kept_tables_make_room(run: Run, store: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(tallying, "CACHE_BYTES", 1)
    for where in ("year=1880", "year=1881", "year=1882"):
        run("pairs", store, "--where", where, "-n", 1)
        # Room is made before the next table comes: one stays at a time, and none that was asked for goes.
        assert list(slices_kept(run, store)) == [(where, "false")]
    run("tally", store, "--where", "year=1883")
    run("pairs", store, "--where", "year=1884", "-n", 1)
    assert sorted(slices_kept(run, store)) == [("year=1883", "true"), ("year=1884", "false")]


def test_a_store_that_cannot_be_written_is_asked_all_the_same(run: Run, store: Path) -> None:
    expected = run("pairs", store, "--where", "genre=log", "-n", 3).out
    with tallying.open_for_writing(store, "test"):
        ran = run("pairs", store, "--where", "genre=log & year=..1900", "-n", 3)
    assert ran.code == 0
    assert ran.out == expected
    assert ("genre=log & year=..1900", "false") not in list(slices_kept(run, store))
