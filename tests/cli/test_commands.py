"""The commands on a small store, against counts made here by hand and by brute force, and against the Python calls."""

from __future__ import annotations

import csv
import io
import json
import math
import shutil
import sqlite3
from collections import Counter
from contextlib import closing
from pathlib import Path

import pytest

import colloc

from .conftest import Run, contents, process

LOGS = {
    "log/1901-a": "Thick fog at dawn. The fog horn sounded twice, and thick fog came back.",
    "log/1902-b": "The wind rose. Heavy rain fell at dawn. The keeper trimmed the wick.",
    "notice/1902-c": "The ferry leaves at dawn. Thick fog may delay the ferry.",
}
WINDOW = 2
# The sentences of LOGS as folded words, split by hand.
SENTENCES = [
    ["thick", "fog", "at", "dawn"],
    ["the", "fog", "horn", "sounded", "twice", "and", "thick", "fog", "came", "back"],
    ["the", "wind", "rose"],
    ["heavy", "rain", "fell", "at", "dawn"],
    ["the", "keeper", "trimmed", "the", "wick"],
    ["the", "ferry", "leaves", "at", "dawn"],
    ["thick", "fog", "may", "delay", "the", "ferry"],
]


def follower_counts(window: int = WINDOW) -> Counter[tuple[str, str]]:
    """How often the second follows the first within the window, by brute force."""
    return Counter(
        (words[i], words[j])
        for words in SENTENCES
        for i in range(len(words))
        for j in range(i + 1, min(i + window, len(words) - 1) + 1)
    )


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("built")
    for name, text in LOGS.items():
        path = folder / "texts" / f"{name}.txt"
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
    store = folder / "small.colloc"
    ran = process(
        "build",
        store,
        "texts",
        "--window",
        WINDOW,
        "--meta-from-path",
        "{genre}/{year}-{id}.txt",
        "--jobs",
        1,
        folder=folder,
    )
    assert ran.code == 0, ran.err
    assert ran.err == ""
    assert ran.out.startswith(f"{store}: 3 documents added, 38 tokens; now 3 documents, ")
    return store


@pytest.fixture
def store(built: Path, tmp_path: Path) -> Path:
    """A copy that a test may change."""
    return Path(shutil.copy(built, tmp_path / "small.colloc"))


def rows_of(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text, newline="")))


def test_pairs_are_the_brute_force_ones(run: Run, built: Path) -> None:
    counts = follower_counts()
    both: Counter[frozenset[str]] = Counter()
    for (first, second), count in counts.items():
        both[frozenset((first, second))] += count
    margins: Counter[str] = Counter()
    for (first, second), count in counts.items():
        margins[first] += count
        margins[second] += count
    total = 2 * counts.total()
    ran = run("pairs", built, "--min-count", 1, "--limit", 0, "--any-strength", "--format", "csv", "--measure", "pmi")
    assert ran.code == 0
    rows = rows_of(ran.out)
    assert {frozenset((row["first"], row["second"])): int(row["joint"]) for row in rows} == dict(both)
    for row in rows:
        if row["first"] != row["second"]:
            expected = margins[row["first"]] * margins[row["second"]] / total
            assert (float(row["first_total"]), float(row["second_total"])) == (
                margins[row["first"]],
                margins[row["second"]],
            )
            assert float(row["total"]) == total
            assert float(row["expected"]) == pytest.approx(expected)
            assert float(row["pmi"]) == pytest.approx(math.log2(int(row["joint"]) / expected))
    order = [(-float(row["pmi"]), -int(row["joint"]), row["first"], row["second"]) for row in rows]
    assert order == sorted(order)


def test_pairs_pipe_into_measure(built: Path) -> None:
    listed = process("pairs", built, "--min-count", 1, "-f", "csv", "--show", "g2", "--quiet")
    assert listed.err == ""
    measured = process("measure", "-", "-m", "g2,dice", stdin=listed.out.encode())
    assert measured.code == 0
    for before, after in zip(rows_of(listed.out), rows_of(measured.out), strict=True):
        assert float(after["g2"]) == pytest.approx(float(before["g2"]))
        assert {name: after[name] for name in before if name != "g2"} == {
            name: value for name, value in before.items() if name != "g2"
        }
        assert float(after["dice"]) == pytest.approx(
            2 * float(after["joint"]) / (float(after["first_total"]) + float(after["second_total"]))
        )


def test_directed_another_window_and_a_slice(run: Run, store: Path) -> None:
    counts = follower_counts(3)
    ran = run("pairs", store, "--window", 3, "--directed", "--min-count", 1, "-n", 0, "--any-strength", "-f", "jsonl")
    assert {(row["first"], row["second"]): row["joint"] for row in map(json.loads, ran.out.splitlines())} == counts
    assert "window 3" in ran.err
    assert "directed" in ran.err
    sliced = run("pairs", store, "--where", "genre=notice", "--min-count", 1, "-n", 0, "-f", "csv")
    words = {row["first"] for row in rows_of(sliced.out)} | {row["second"] for row in rows_of(sliced.out)}
    assert "ferry" in words
    assert "horn" not in words
    assert "where genre=notice" in sliced.err


def test_thresholds_and_limits(run: Run, built: Path) -> None:
    rows = rows_of(run("pairs", built, "--min-count", 2, "-f", "csv", "-n", 0, "--any-strength").out)
    assert min(int(row["joint"]) for row in rows) == 2
    rows = rows_of(run("pairs", built, "--min-count", 1, "--min-word-count", 3, "-f", "csv", "-n", 0).out)
    frequent = {word for word, n in Counter(word for words in SENTENCES for word in words).items() if n >= 3}
    assert {row["first"] for row in rows} | {row["second"] for row in rows} <= frequent
    rows = rows_of(run("pairs", built, "--min-count", 1, "--min-docs", 2, "-f", "csv", "-n", 0).out)
    assert [row["documents"] for row in rows if {row["first"], row["second"]} == {"thick", "fog"}] == ["2"]
    assert len(rows_of(run("pairs", built, "--min-count", 1, "-f", "csv", "-n", 3).out)) == 3
    none = run("pairs", built, "--min-count", 1000, "-f", "csv")
    assert (none.code, rows_of(none.out)) == (0, [])
    assert none.out.startswith("first,second,joint,first_total,second_total,total,expected")


def test_around_words_and_a_file_of_words(run: Run, built: Path, tmp_path: Path) -> None:
    listed = tmp_path / "words.txt"
    listed.write_text("dawn\n\n  Fog \n", encoding="utf-8")
    asked = ("around", built, "thick", "--words-from", listed, "--min-count", 1, "-f", "csv", "--any-strength")
    rows = rows_of(run(*asked).out)
    assert list(dict.fromkeys(row["first"] for row in rows)) == ["thick", "dawn", "fog"]
    counts = follower_counts()
    for row in rows:
        pair = (row["first"], row["second"])
        assert int(row["joint"]) == counts[pair] + (counts[pair[::-1]] if pair[0] != pair[1] else 0)
    left = rows_of(run("around", built, "fog", "--side", "left", "--min-count", 1, "-f", "csv", "--any-strength").out)
    assert {row["second"]: int(row["joint"]) for row in left} == {
        first: count for (first, second), count in counts.items() if second == "fog"
    }


def test_words(run: Run, built: Path) -> None:
    counts = Counter(word for words in SENTENCES for word in words)
    rows = rows_of(run("words", built, "-f", "csv", "-n", 0).out)
    assert {row["word"]: int(row["count"]) for row in rows} == counts
    assert float(rows[0]["per_million"]) == pytest.approx(counts[rows[0]["word"]] * 1e6 / counts.total())
    matching = rows_of(run("words", built, "f*", "--sort", "word", "-f", "csv").out)
    assert [row["word"] for row in matching] == ["fell", "ferry", "fog"]
    assert rows_of(run("words", built, "--where", "year=1901", "-f", "csv", "--min-count", 3).out)[0]["word"] == "fog"


def test_other_conventions_are_passed_on(run: Run, store: Path) -> None:
    unit = rows_of(run("pairs", store, "--unit", "--min-count", 1, "-n", 0, "-f", "csv", "--any-strength").out)
    both = [row for row in unit if {row["first"], row["second"]} == {"at", "dawn"}]
    assert [(int(row["joint"]), int(row["total"])) for row in both] == [(3, len(SENTENCES))]
    positions = run("pairs", store, "--margins", "positions", "--min-count", 1, "-n", 0, "-f", "csv", "--any-strength")
    row = next(row for row in rows_of(positions.out) if (row["first"], row["second"]) == ("fog", "thick"))
    # fog stands 4 times, 3 of them with thick within 2 words; 38 tokens in all.
    assert (row["joint"], row["first_total"], row["total"]) == ("3", "4", "38")
    assert run("pairs", store, "--margins", "tokens", "--show", "g2").code == 2
    assert "no span" in run("pairs", store, "--margins", "tokens", "--no-span", "--min-count", 1).err


def test_info(run: Run, built: Path) -> None:
    table = dict(line.split(None, 1) for line in run("info", built).out.splitlines()[1:] if len(line.split()) > 1)
    assert table["documents"] == "3"
    assert table["tokens"] == "38"
    assert table["sentences"] == str(len(SENTENCES))
    assert table["settings.tally.window"] == str(WINDOW)
    assert "settings.tally.left" not in table
    assert "settings.tally.right" not in table
    whole = json.loads(run("info", built, "--format", "json").out)
    assert whole == json.loads(json.dumps(colloc.info(built)))
    assert whole["settings"]["read"]["meta_from_path"] == "{genre}/{year}-{id}.txt"
    by_year = rows_of(run("info", built, "--by", "year", "-f", "csv").out)
    assert [(row["year"], row["documents"]) for row in by_year] == [("1901", "1"), ("1902", "2")]
    documents = rows_of(run("info", built, "--documents", "-f", "csv").out)
    assert [(row["document"], row["genre"], row["year"]) for row in documents] == [
        ("a", "log", "1901"),
        ("b", "log", "1902"),
        ("c", "notice", "1902"),
    ]
    assert sum(int(row["tokens"]) for row in documents) == 38


def test_tally_counts_keeps_and_drops(run: Run, store: Path) -> None:
    ran = run("tally", store, "--window", 3, "-f", "csv")
    assert [(row["window"], row["left"], row["right"], row["asked_for"]) for row in rows_of(ran.out)] == [
        ("2", "", "", "true"),
        ("3", "", "", "true"),
    ]
    assert int(rows_of(ran.out)[1]["total"]) == follower_counts(3).total()
    assert len(rows_of(run("tally", store, "--list", "-f", "csv").out)) == 2
    uneven = rows_of(run("tally", store, "--left", 1, "--right", 3, "-f", "csv").out)[-1]
    assert (uneven["kind"], uneven["window"], uneven["left"], uneven["right"]) == ("span", "", "1", "3")
    even = rows_of(run("tally", store, "--margins", "positions", "-f", "csv").out)[-1]
    assert (even["kind"], even["window"], even["left"], even["right"]) == ("positions", "2", "", "")
    whole = rows_of(run("tally", store, "--unit", "-f", "csv").out)[-1]
    assert (whole["kind"], whole["window"], whole["left"], whole["right"]) == ("unit", "", "", "")
    for gone in (("--left", 1, "--right", 3), ("--margins", "positions"), ("--unit",)):
        assert run("tally", store, *gone, "--drop").code == 0
    assert len(rows_of(run("tally", store, "--window", 3, "--drop", "-f", "csv").out)) == 1
    gone = run("tally", store, "--window", 3, "--drop")
    assert gone.code == 1
    assert "no such table is kept" in gone.err
    default = run("tally", store, "--drop")
    assert default.code == 2
    assert "it cannot be dropped" in default.err


def test_add_remove_and_merge(run: Run, store: Path, built: Path, tmp_path: Path) -> None:
    more = tmp_path / "log" / "1903-d.txt"
    more.parent.mkdir()
    more.write_text("The gale rose at dawn.", encoding="utf-8")
    before = run("pairs", store, "--min-count", 1, "-n", 0, "-f", "csv", "-q").out
    added = run("add", store, more)
    assert added.code == 0
    assert added.out.startswith(f"{store}: 1 documents added, 5 tokens; now 4 documents")
    assert "gale" in run("words", store).out
    taken = run("remove", store, "--where", "year=1903")
    assert taken.out.startswith(f"{store}: 1 documents taken out; now 3 documents")
    assert run("pairs", store, "--min-count", 1, "-n", 0, "-f", "csv", "-q").out == before
    assert run("remove", store, "a", "b").out.startswith(f"{store}: 2 documents taken out; now 1 ")
    other = tmp_path / "other.colloc"
    texts = [built.parent / "texts" / f"{name}.txt" for name in ("log/1901-a", "log/1902-b")]
    run("build", other, *texts, "--window", WINDOW, "--meta-from-path", "{genre}/{year}-{id}.txt", "-q")
    merged = run("merge", store, other)
    assert merged.out.startswith(f"{store}: 2 documents added")
    assert run("pairs", store, "--min-count", 1, "-n", 0, "-f", "csv", "-q").out == before
    assert run("check", store).out == f"{store}: all is well\n"


def test_reading_options_of_add_replace_those_of_the_build(run: Run, store: Path, tmp_path: Path) -> None:
    more = tmp_path / "more.csv"
    more.write_bytes("name,words\nz,Märchen am Morgen\n".encode("latin-1"))
    ran = run(
        "add",
        store,
        more,
        "--encoding",
        "latin-1",
        "--text-column",
        "words",
        "--id-column",
        "name",
        "--meta-from-path",
        "",
    )
    assert ran.code == 0, ran.err
    assert "märchen" in run("words", store, "-n", 0).out


def test_build_again_does_nothing_and_other_settings_are_refused(run: Run, tmp_path: Path) -> None:
    text, store = tmp_path / "a.txt", tmp_path / "a.colloc"
    text.write_text("Thick fog at dawn.", encoding="utf-8")
    assert run("build", store, text).code == 0
    before = contents(store)
    assert run("build", store, text).out == f"{store}: complete already, 1 documents; nothing was done\n"
    other = run("build", store, text, "--window", 7)
    assert other.code == 73
    assert "was built otherwise: --window was" in other.err
    assert contents(store) == before
    assert run("build", tmp_path / "q.colloc", text, "--quiet").out == ""


def test_what_was_left_out_is_told(run: Run, tmp_path: Path) -> None:
    text = tmp_path / "a.txt"
    text.write_bytes(b"Thick fog \xff at dawn. " + b"x" * 300)
    ran = run("build", tmp_path / "a.colloc", text, "--errors", "replace")
    assert ran.code == 0
    assert ran.err.splitlines() == [
        "colloc: 1 overlong tokens left out (--max-token)",
        "colloc: 1 undecodable bytes replaced",
    ]


def test_a_detected_encoding_is_told_and_kept(run: Run, tmp_path: Path) -> None:
    text = "Le gardien du phare a écrit que la mer était très forte et que le bateau n'était pas arrivé. "
    (tmp_path / "a.txt").write_bytes((text * 40).encode("latin-1"))
    (tmp_path / "b.txt").write_text(text * 40, encoding="utf-8")
    ran = run("build", tmp_path / "s.colloc", tmp_path / "a.txt", tmp_path / "b.txt", "--encoding", "detect")
    assert "encoding detected, which is a guess: cp1252 (files: 1), utf-8 (files: 1)" in ran.err

    def kept(store: str) -> list[str]:
        sources = json.loads(run("info", tmp_path / store, "-f", "json").out)["sources"]
        return [source.get("detected_encoding") for source in sources]

    assert kept("s.colloc") == ["cp1252", "utf-8"]
    assert run("build", tmp_path / "t.colloc", tmp_path / "b.txt").code == 0
    assert kept("t.colloc") == [None]
    assert run("remove", tmp_path / "s.colloc", "a.txt").code == 0
    assert kept("s.colloc") == ["utf-8"]
    with closing(sqlite3.connect(tmp_path / "s.colloc")) as store:
        facts = store.execute("SELECT key, value FROM facts WHERE key LIKE 'encoding:%'").fetchall()
    assert facts == [(f"encoding:{tmp_path / 'b.txt'}", "utf-8")]


def test_dry_run_leaves_nothing(run: Run, tmp_path: Path) -> None:
    text = tmp_path / "a.txt"
    text.write_text("Thick fog at dawn. " * 50, encoding="utf-8")
    ran = run("build", tmp_path / "a.colloc", text, "--dry-run")
    assert ran.code == 0
    assert ran.out.startswith("tokens           200 (from a sample of 200)\n")
    assert [path.name for path in tmp_path.iterdir()] == ["a.txt"]


@pytest.mark.parametrize("file_format", ["table", "csv", "tsv", "jsonl", "json", "parquet"])
def test_every_format_into_a_file(run: Run, built: Path, tmp_path: Path, file_format: str) -> None:
    goal = tmp_path / "out"
    ran = run("pairs", built, "--min-count", 1, "-f", file_format, "-o", goal, "--settings-beside")
    assert (ran.code, ran.out) == (0, "")
    assert goal.stat().st_size > 100
    settings = json.loads((tmp_path / "out.settings.json").read_text())
    assert settings["command"] == "pairs"
    assert settings["settings"]["window"] == WINDOW
    assert not {"kind", "left", "right"} & set(settings["settings"])
    assert settings["settings"]["min_count"] == 1


def test_a_folder_that_is_missing_is_told_before_any_work(
    run: Run, built: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(colloc, "pairs", lambda *_, **__: pytest.fail("counted first"))
    monkeypatch.setattr("colloc.verbs.asking.pairs", lambda *_, **__: pytest.fail("counted first"))
    ran = run("pairs", built, "-o", tmp_path / "no" / "o.csv")
    assert ran.code
    assert "cannot write" in ran.err
    assert not (tmp_path / "no").exists()


def test_settings_beside_of_unequal_sides(run: Run, built: Path, tmp_path: Path) -> None:
    store, goal = tmp_path / "copy.colloc", tmp_path / "out"
    shutil.copy(built, store)  # the answer leaves its table in the store
    assert run("pairs", store, "--left", 1, "--right", 3, "-f", "csv", "-o", goal, "--settings-beside").code == 0
    settings = json.loads((tmp_path / "out.settings.json").read_text())["settings"]
    assert (settings["left"], settings["right"]) == (1, 3)
    assert "window" not in settings


def test_the_python_calls_give_the_same(run: Run, built: Path) -> None:
    printed = json.loads(run("pairs", built, "--min-count", 1, "-f", "json").out)
    answer = colloc.pairs(built, min_count=1)
    assert answer.to_dicts() == printed["rows"]
    assert json.loads(json.dumps(dict(answer.settings))) == printed["settings"]
    with colloc.open_store(built) as opened:
        assert colloc.pairs(opened, min_count=1) == answer
        assert colloc.pairs(str(built), min_count=1, where=[]) == answer
        assert colloc.words(opened, pattern="fog")["count"].tolist() == [4]
        assert colloc.around(opened, "fog", min_count=1)["first"].tolist()[0] == "fog"
        assert colloc.check(opened) == []
        assert colloc.documents_by(opened, "genre")["documents"].tolist() == [2, 1]
        assert sum(len(part) for part in colloc.documents(opened)) == 3
        assert len(colloc.tallies(opened)) == 1


def test_python_build_add_remove_merge(tmp_path: Path) -> None:
    for name, text in (("a", "Thick fog at dawn."), ("b", "Heavy rain at dawn.")):
        (tmp_path / f"{name}.txt").write_text(text, encoding="utf-8")
    one, two = tmp_path / "one.colloc", tmp_path / "two.colloc"
    spec = colloc.TallySpec(right=3)
    assert colloc.build(one, str(tmp_path / "a.txt"), tally=spec, jobs=1).total_documents == 1
    assert colloc.build(str(two), [str(tmp_path / "b.txt")], tally=spec, jobs=1).total_documents == 1
    assert colloc.merge(one, [two], jobs=1).total_documents == 2
    identifier = next(iter(colloc.documents(two)))["document"][0]
    assert colloc.remove(one, identifiers=identifier, jobs=1).total_documents == 1
    (tmp_path / "c.txt").write_text("Heavy swell at dawn.", encoding="utf-8")
    assert colloc.add(one, str(tmp_path / "c.txt"), jobs=1).total_documents == 2
    record = colloc.tally(one, window=1)
    # thick-fog, fog-at, at-dawn (in both), heavy-swell, swell-at
    assert (record["kind"], record["right"], record["pairs"]) == ("window", 1, 5)
    assert colloc.tally(one, window=1, drop=True) == record


def test_matrix(run: Run, built: Path, tmp_path: Path) -> None:
    ran = run("matrix", built, "-o", tmp_path / "m", "--shift", 2, "--smoothing", 0.75)
    assert ran.code == 0, ran.err
    made = colloc.matrix(built, tmp_path / "again", shift=2, smoothing=0.75)
    n = len(made.rows)
    assert ran.out == f"{tmp_path}/m: {n} rows, {n} columns, {made.values.nnz} cells\n"
    assert (tmp_path / "m.mtx").read_bytes() == (tmp_path / "again.mtx").read_bytes()
    assert "shift 2.0; smoothing 0.75" in ran.err
    assert run("matrix", built, "-o", tmp_path / "m", "--shift", -1).code == 2
