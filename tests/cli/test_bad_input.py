"""Bad input of every kind: one line that names the place and the remedy, the right exit code, and the store as it was.

Exit codes: sysexits.h (65 bad data, 66 no input, 73 cannot create), 2 for wrong usage, 75 for a lock.
"""

from __future__ import annotations

import gzip
import os
import shutil
import sqlite3
import subprocess
import sys
from contextlib import closing
from pathlib import Path

import pytest

from colloc.store.database.locking import WriterLock

from .conftest import Run, contents, process

TEXT = "Thick fog at dawn. The keeper trimmed the wick."


@pytest.fixture(scope="module")
def sound(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("sound")
    (folder / "a.txt").write_text(TEXT, encoding="utf-8")
    ran = process("build", folder / "s.colloc", folder / "a.txt", "--jobs", 1)
    assert ran.code == 0, ran.err
    return folder / "s.colloc"


@pytest.fixture
def store(sound: Path, tmp_path: Path) -> Path:
    return Path(shutil.copy(sound, tmp_path / "s.colloc"))


def as_file(folder: Path, name: str, data: bytes) -> Path:
    path = folder / "input" / name
    path.parent.mkdir(exist_ok=True)
    path.write_bytes(data)
    return path


GZIPPED = gzip.compress(TEXT.encode() * 1000)

INPUTS = [
    # name, bytes, more options, exit code, words of the message
    ("good.txt.gz", GZIPPED[: len(GZIPPED) // 2], [], 65, ["good.txt.gz"]),
    ("other.txt.gz", b"this is no gzip file", [], 65, ["other.txt.gz", "gzip"]),
    ("changed.txt.gz", GZIPPED[:40] + b"\x00\x00\x00" + GZIPPED[43:], [], 65, ["changed.txt.gz"]),
    ("empty.txt", b"", [], 66, ["empty.txt"]),
    ("program.txt", b"\x7fELF\x02\x01\x01\x00" + bytes(range(256)) * 10, [], 65, ["program.txt"]),
    ("broken.jsonl", b'{"text": "fog"}\n{"text": "fog",,}\n', [], 65, ["broken.jsonl:2"]),
    ("list.jsonl", b'{"text": "fog"}\n["fog"]\n', [], 65, ["list.jsonl:2"]),
    ("nokey.jsonl", b'{"words": "fog"}\n', [], 65, ["nokey.jsonl:1", "'text'"]),
    ("nocolumn.csv", b"id,words\n1,fog\n", [], 65, ["nocolumn.csv", "'text'", "words"]),
    ("ragged.csv", b"id,text\n1,fog\n2,fog,more,cells\n", [], 65, ["ragged.csv:3"]),
    (
        "large.jsonl",
        b'{"text": "' + b"fog " * 1000 + b'"}\n',
        ["--max-record", "1KB"],
        65,
        ["large.jsonl:1", "max_record"],
    ),
    ("latin.txt", "Märchen am Morgen".encode("latin-1"), [], 65, ["latin.txt", "byte 1", "encoding"]),
    ("ascii.txt", "Märchen".encode(), ["--encoding", "ascii"], 65, ["ascii.txt", "byte 1"]),
    ("name.txt", b"fog", ["--encoding", "no-such-name"], 2, ["no-such-name"]),
    ("format.txt", b"fog", ["--input-format", "no-such-format"], 2, ["no-such-format"]),
    ("path.txt", b"fog", ["--meta-from-path", "{genre}/{year}-{id}.txt"], 65, ["path.txt", "{genre}"]),
    ("table.txt", b"fog", ["--meta-table", "missing.csv"], 66, ["missing.csv"]),
]


@pytest.mark.parametrize(("name", "data", "options", "code", "words"), INPUTS, ids=[row[0] for row in INPUTS])
def test_bad_files(
    run: Run, store: Path, tmp_path: Path, name: str, data: bytes, options: list[str], code: int, words: list[str]
) -> None:
    path = as_file(tmp_path, name, data)
    before = contents(store)
    for command, target in (("add", store), ("build", tmp_path / "new.colloc")):
        ran = run(command, target, path, *options, "--jobs", 1)
        assert ran.code == code, ran.err
        assert ran.out == ""
        assert ran.err.startswith("colloc: ")
        assert ran.err.count("\n") == 1
        for word in words:
            assert word in ran.err
    assert contents(store) == before
    assert run("check", store).code == 0


def test_a_missing_file_and_a_folder_without_text(run: Run, store: Path, tmp_path: Path) -> None:
    (tmp_path / "empty").mkdir()
    before = contents(store)
    for given, word in (("none.txt", "none.txt"), ("empty", "empty"), ("*.nothing", "*.nothing")):
        for command, target in (("add", store), ("build", tmp_path / "new.colloc")):
            ran = run(command, target, tmp_path / given)
            assert ran.code == 66, ran.err
            assert word in ran.err
            assert ran.err.count("\n") == 1
    assert contents(store) == before
    assert not (tmp_path / "new.colloc").exists()


def test_bad_standard_input(run: Run, store: Path) -> None:
    before = contents(store)
    ran = run("add", store, "-", stdin=b"Thick \xff fog")
    assert ran.code == 65
    assert "byte 6" in ran.err
    assert contents(store) == before


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["pairs", "STORE", "--measure", "npmj"], "unknown measure 'npmj'; did you mean 'npmi'?"),
        (["around", "STORE", "fog", "--show", "npmj"], "unknown measure 'npmj'"),
        (["pairs", "STORE", "--window", "-1"], "-1"),
        (["pairs", "STORE", "--window", "0"], "0"),
        (["pairs", "STORE", "--left", "-2", "--right", "1"], "-2"),
        (["pairs", "STORE", "--layer", "no_such_layer"], "no_such_layer"),
        (["pairs", "STORE", "--where", "nonsense"], "nonsense"),
        (["pairs", "STORE", "--where", "genre=log"], "genre"),
        (["info", "STORE", "--by", "genre"], "no document has the key 'genre'"),
        (["pairs", "STORE", "--unit", "--directed"], "no direction"),
        (["pairs", "STORE", "--no-span"], "margins tokens only"),
        (["remove", "STORE"], "say which documents"),
    ],
)
def test_wrong_questions(run: Run, store: Path, arguments: list[str], words: str) -> None:
    before = contents(store)
    ran = run(*[str(store) if argument == "STORE" else argument for argument in arguments])
    assert ran.code == 2, ran.err
    assert ran.out == ""
    assert words in ran.err
    assert ran.err.splitlines()[-1].startswith("colloc: ")
    assert contents(store) == before


def test_what_was_never_seen(run: Run, store: Path) -> None:
    ran = run("around", store, "zeppelin")
    assert (ran.code, ran.out) == (1, "")
    listing = f"`colloc words {store} 'zep*'` lists words that begin like it"
    assert f"'zeppelin' never occurs in layer 'fold'; {listing}" in ran.err
    gone = run("remove", store, "no-such-document")
    assert gone.code == 1
    assert "has no document 'no-such-document'; `colloc info --documents` lists them" in gone.err


@pytest.mark.parametrize(
    "arguments",
    [
        ["pairs"],
        ["around", "fog"],
        ["words"],
        ["lines", "fog"],
        ["expressions"],
        ["tally", "--window", "2"],
        ["floors"],
    ],
    ids=lambda arguments: arguments[0],
)
def test_a_slice_that_no_document_fits(run: Run, tmp_path: Path, arguments: list[str]) -> None:
    rows = "".join(f'{{"id": "{year}", "year": {year}, "text": "the fog came in"}}\n' for year in range(1900, 1912))
    path = tmp_path / "years.colloc"
    assert run("build", path, as_file(tmp_path, "years.jsonl", rows.encode()), "-q").code == 0
    before = contents(path)
    command, *more = arguments
    ran = run(command, path, *more, "--where", "year=1900-1905")
    assert (ran.code, ran.out) == (1, "")
    assert ran.err.splitlines()[-1] == (
        f"colloc: {path}: no document fits 'year=1900-1905'; did you mean year=1900..1905; values of year: "
        + ", ".join(map(str, range(1900, 1910)))
        + ", ... (12 values)"
    )
    assert contents(path) == before
    assert "no document fits 'year=2001'; values of year: 1900" in run(command, path, *more, "--where", "year=2001").err


def test_unknown_words_among_known_ones_are_named(run: Run, store: Path, tmp_path: Path) -> None:
    asked = ("around", store, "fog", "--min-count", 1, "--any-strength", "-f", "csv")
    ran = run(*asked, "zeppelin", "Kraken", "zeppelin")
    assert (ran.code, ran.out) == (0, run(*asked).out)
    assert ran.err.splitlines()[1:] == ["# 2 unknown in layer 'fold', left out: 'zeppelin', 'Kraken'"]
    listed = as_file(tmp_path, "words.txt", "".join(f"unseen{n}\n" for n in range(12)).encode())
    remarks = run(*asked, "--words-from", listed).err.splitlines()[1:]
    assert [line.count("'unseen") for line in remarks] == [10]
    assert remarks[0].startswith("# 12 unknown")
    assert remarks[0].endswith("'unseen9', ...")
    assert run(*asked, "zeppelin", "-q").err == ""
    assert not run(*asked).err.splitlines()[1:]


def test_outputs_that_cannot_be_written(run: Run, store: Path, tmp_path: Path) -> None:
    before = contents(store)
    for goal in (tmp_path / "missing" / "out.csv", tmp_path):
        ran = run("pairs", store, "--min-count", 1, "-o", goal)
        assert ran.code == 73
        assert f"cannot write {goal}" in ran.err
    new = run("build", tmp_path / "missing" / "new.colloc", as_file(tmp_path, "a.txt", TEXT.encode()))
    assert new.code == 73
    assert "does not exist; create it first" in new.err
    assert contents(store) == before


READING = [
    ["info"], ["check"], ["words"], ["pairs"], ["around", "fog"], ["tally", "--window", "2"], ["tally", "--list"],
    ["add", "TEXT"], ["remove", "a.txt"], ["merge", "SOUND"],
]  # fmt: skip


def with_store(command: list[str], store: Path, sound: Path, text: Path) -> list[str]:
    places = {"SOUND": str(sound), "TEXT": str(text)}
    return [command[0], str(store), *[places.get(part, part) for part in command[1:]]]


@pytest.mark.parametrize("command", READING, ids="-".join)
def test_what_is_no_store(run: Run, sound: Path, tmp_path: Path, command: list[str]) -> None:
    text = as_file(tmp_path, "more.txt", b"The gale rose.")
    plain = as_file(tmp_path, "plain.colloc", b"just some text, long enough to be anything")
    foreign = tmp_path / "foreign.colloc"
    with closing(sqlite3.connect(foreign)) as connection:
        connection.execute("CREATE TABLE facts (key TEXT, value TEXT)")
    newer = Path(shutil.copy(sound, tmp_path / "newer.colloc"))
    with closing(sqlite3.connect(newer)) as connection:
        connection.execute("PRAGMA user_version = 1000000")
    for path, code, words in (
        (tmp_path / "none.colloc", 66, "no such store"),
        (tmp_path, 66, "a folder, not a store"),
        (plain, 65, "not a colloc store (not an SQLite file)"),
        (foreign, 65, "an SQLite file, but not a colloc store"),
        (newer, 65, "made by a newer colloc"),
    ):
        before = path.read_bytes() if path.is_file() else b""
        ran = run(*with_store(command, path, sound, text))
        assert ran.code == code, ran.err
        assert ran.out == ""
        assert ran.err.startswith(f"colloc: {path}: ")
        assert words in ran.err
        assert ran.err.count("\n") == 1
        assert (path.read_bytes() if path.is_file() else b"") == before


def damage_page(store: Path) -> None:
    """Change one byte inside a page of the tally, as a bad disk would."""
    with closing(sqlite3.connect(store)) as connection:
        for (table,) in connection.execute(
            "SELECT name FROM sqlite_master WHERE type = 'table' ORDER BY name"
        ).fetchall():
            for row in connection.execute(f'PRAGMA table_info("{table}")').fetchall():
                if "page" in table and row[2].upper() == "BLOB":
                    for rowid, blob in connection.execute(f'SELECT rowid, "{row[1]}" FROM "{table}"').fetchall():
                        changed = bytearray(blob)
                        changed[len(changed) // 2] ^= 0x40
                        connection.execute(
                            f'UPDATE "{table}" SET "{row[1]}" = ? WHERE rowid = ?', (bytes(changed), rowid)
                        )
        connection.commit()


def test_a_damaged_store_is_told(run: Run, store: Path) -> None:
    damage_page(store)
    checked = run("check", store)
    assert checked.code == 1
    assert checked.out.startswith(f"{store}: ")
    ran = run("pairs", store, "--min-count", 1)
    assert ran.code == 65
    assert str(store) in ran.err
    assert ran.out == ""


def test_a_store_cut_short_is_told(run: Run, store: Path) -> None:
    data = store.read_bytes()
    store.write_bytes(data[: len(data) // 2 // 4096 * 4096])
    for command in (["pairs", store, "--min-count", "1"], ["words", store], ["info", store]):
        ran = run(*command)
        assert ran.code == 65, (command, ran)
        assert ran.err.splitlines()[-1].startswith("colloc: ")
        assert ran.out == ""
    assert run("check", store).code in (1, 65)


def test_a_locked_store_is_told(run: Run, store: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    acquire = WriterLock.acquire
    code = (
        "import sys, time\nfrom colloc.store.opening import open_for_writing\n"
        "with open_for_writing(sys.argv[1], 'a long job'):\n    print('held', flush=True)\n    time.sleep(60)\n"
    )
    holder = subprocess.Popen([sys.executable, "-c", code, str(store)], stdout=subprocess.PIPE)
    try:
        assert holder.stdout is not None
        assert holder.stdout.readline() == b"held\n"
        assert run("words", store).code == 0, "readers work while a writer writes"
        monkeypatch.setattr(WriterLock, "acquire", lambda lock, wait: acquire(lock, 0.2))
        ran = run("remove", store, "a.txt")
        assert ran.code == 75
        assert "a long job" in ran.err
        assert "try again" in ran.err
    finally:
        holder.kill()
        holder.communicate()


def test_an_existing_file_is_not_built_over(run: Run, tmp_path: Path) -> None:
    text = as_file(tmp_path, "a.txt", TEXT.encode())
    goal = as_file(tmp_path, "thesis.doc", b"years of work, not to be lost")
    ran = run("build", goal, text)
    assert ran.code == 65
    assert "not a colloc store" in ran.err
    assert goal.read_bytes() == b"years of work, not to be lost"


def test_names_that_need_care(run: Run, tmp_path: Path) -> None:
    """Option-like, spaced, percent-quoted and query-like names reach SQLite and the disk as they are."""
    for name in ("a b.colloc", "q?mode=memory.colloc", "h#x.colloc", "%41.colloc"):
        text = as_file(tmp_path, "a.txt", TEXT.encode())
        assert run("build", tmp_path / name, text, "--jobs", 1).code == 0
        assert run("words", tmp_path / name).code == 0
        assert (tmp_path / name).stat().st_size > 0


@pytest.mark.parametrize("variable", ["LC_ALL"])
def test_a_plain_locale_prints_any_script(variable: str, tmp_path: Path) -> None:
    text = as_file(tmp_path, "a.txt", "海霧 שלום ночь Ночь".encode())
    environment = {**os.environ, variable: "C", "PYTHONCOERCECLOCALE": "0", "PYTHONUTF8": "0"}
    for arguments in (["build", tmp_path / "s", text, "--jobs", "1", "-q"], ["words", tmp_path / "s"]):
        done = subprocess.run(
            [sys.executable, "-m", "colloc", *map(str, arguments)], capture_output=True, check=True, env=environment
        )
    assert "ночь" in done.stdout.decode()
    assert "\u2068שלום\u2069" in done.stdout.decode()
