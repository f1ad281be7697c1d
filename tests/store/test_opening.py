"""Opening and refusing: files that are not ours, damaged, newer, locked, read-only or full."""

from __future__ import annotations

import contextlib
import json
import os
import signal
import sqlite3
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from colloc.errors import (
    CannotCreateError,
    CollocError,
    DataError,
    InputOutputError,
    LockedError,
    NoInputError,
    StoreDamagedError,
)
from colloc.store import checking, facts, scratch, tallies, texts
from colloc.store.database import schema
from colloc.store.opening import Store, create, open_for_reading, open_for_writing

from .making import WINDOW, cells_of, small_store, table_of, write_tally


@pytest.fixture
def path(tmp_path: Path) -> Path:
    small_store(tmp_path / "a.colloc").close()
    return tmp_path / "a.colloc"


def _files(folder: Path) -> list[str]:
    return sorted(file.name for file in folder.iterdir() if not file.name.endswith(".lock"))


def test_created_stores_say_whose_they_are(path: Path) -> None:
    data = path.read_bytes()
    # Bytes 60..63 user_version, 68..71 application_id: https://www.sqlite.org/fileformat2.html, section 1.3.
    assert data[60:64] == schema.SCHEMA_VERSION.to_bytes(4, "big")
    assert data[68:72] == b"COLC"
    assert _files(path.parent) == ["a.colloc"]


def test_a_write_ahead_log_left_by_another_store_is_not_taken_in(tmp_path: Path) -> None:
    """Whoever removes a store that was killed in the middle of its work leaves the log beside it."""
    script = (
        "import os, sys\n"
        "from colloc.store import facts\n"
        "from colloc.store.opening import create\n"
        "store = create(sys.argv[1], {'state': 'complete'})\n"
        "for number in range(400):\n"
        "    facts.put(store, f'key {number}', 'x' * 2000)\n"
        "os._exit(9)\n"
    )
    name = tmp_path / "a.colloc"
    assert subprocess.run([sys.executable, "-c", script, str(name)]).returncode == 9
    assert (tmp_path / "a.colloc-wal").stat().st_size > 0
    name.unlink()
    create(name, {"state": "complete", "segment_settings": "{}"}).close()
    with open_for_reading(name) as store:
        assert store.value("PRAGMA integrity_check") == "ok"
        assert facts.get(store, "key 1", "nothing") == "nothing"


def test_create_refuses_what_exists(path: Path) -> None:
    before = path.read_bytes()
    with pytest.raises(CannotCreateError, match=r"a\.colloc: exists already; choose another name"):
        create(path, {})
    assert path.read_bytes() == before


def test_create_refuses_a_missing_folder(tmp_path: Path) -> None:
    with pytest.raises(CannotCreateError, match="does not exist; create it first"):
        create(tmp_path / "no" / "a.colloc", {})


@pytest.mark.parametrize("name", ["a b.colloc", "50%.colloc", "what?.colloc", "no#1.colloc", "åsa.colloc", "x&mode=rw"])
def test_any_file_name(tmp_path: Path, name: str) -> None:
    create(tmp_path / name, {"key": "value"}).close()
    with open_for_reading(tmp_path / name) as store:
        assert facts.get(store, "key") == "value"
    assert _files(tmp_path) == [name]


def _other_database(path: Path) -> None:
    with sqlite3.connect(path) as connection:
        connection.execute("CREATE TABLE facts (key, value)")
    connection.close()


@pytest.mark.parametrize(
    ("make", "kind", "message"),
    [
        (lambda path: None, NoInputError, "no such store; make it with `colloc build"),
        (lambda path: path.mkdir(), NoInputError, "a folder, not a store"),
        (lambda path: path.write_bytes(b""), DataError, "not a colloc store"),
        (lambda path: path.write_text("the lamp burns"), DataError, "not a colloc store"),
        (lambda path: path.write_bytes(b"SQLite format 3\0" + bytes(4096)), CollocError, "damaged"),
        (_other_database, DataError, "an SQLite file, but not a colloc store"),
    ],
)
@pytest.mark.parametrize("writing", [False, True])
def test_not_a_store(tmp_path: Path, make: object, kind: type[CollocError], message: str, writing: bool) -> None:
    path = tmp_path / "a.colloc"
    make(path)  # type: ignore[operator]
    before = path.read_bytes() if path.is_file() else None
    with pytest.raises(kind, match=f"a.colloc: {message}"):
        open_for_writing(path, "test") if writing else open_for_reading(path)
    assert (path.read_bytes() if path.is_file() else None) == before


@pytest.mark.parametrize(
    ("sql", "named"),
    [
        (
            "INSERT INTO _sqlite_migrations (migration_set, name, applied_at) VALUES ('colloc', '0999_new', '')",
            "0999_new",
        ),
        ("PRAGMA user_version = 99", "schema 99"),
    ],
)
@pytest.mark.parametrize("writing", [False, True])
def test_newer_store(path: Path, sql: str, named: str, writing: bool) -> None:
    with sqlite3.connect(path) as connection:
        connection.execute(sql)
    connection.close()
    with pytest.raises(DataError, match=rf"made by a newer colloc \({named}\); install the newer version"):
        open_for_writing(path, "test") if writing else open_for_reading(path)


def test_steps_of_other_programs_in_the_same_table_do_not_matter(path: Path) -> None:
    with sqlite3.connect(path) as connection:
        connection.execute(
            "INSERT INTO _sqlite_migrations (migration_set, name, applied_at) VALUES ('other', '0999_new', '')"
        )
    connection.close()
    open_for_reading(path).close()


def _read_everything(path: Path) -> None:
    with open_for_reading(path) as store:
        table_of(store, WINDOW)
        texts.read_text(store, 0, 100)


def test_a_file_cut_short_is_damaged(path: Path) -> None:
    data = path.read_bytes()
    path.write_bytes(data[: len(data) // 2])
    with pytest.raises(StoreDamagedError, match=r"damaged \(.*colloc check"):
        _read_everything(path)


def test_readers_change_nothing(path: Path) -> None:
    before = path.read_bytes()
    with open_for_reading(path) as store:
        with pytest.raises(CannotCreateError, match="cannot be written"):
            facts.put(store, "key", "value")
        assert not store.writable
    assert path.read_bytes() == before
    assert _files(path.parent) == ["a.colloc"]


@pytest.fixture
def open_folder() -> Iterator[Path]:
    """A folder that other users may enter, which pytest's own is not."""
    with tempfile.TemporaryDirectory() as folder:
        Path(folder).chmod(0o755)
        yield Path(folder)


READ = """
import sys, os, filelock, json
from colloc.store.opening import open_for_reading, open_for_writing
from colloc.store import documents
from colloc.errors import CannotCreateError
if os.getuid() == 0:
    os.setuid(65534)  # to root no file is read-only
with open_for_reading(sys.argv[1]) as store:
    print(documents.document_count(store))
try:
    open_for_writing(sys.argv[1], "test")
except CannotCreateError as error:
    print(error)
"""


def test_read_only_file_and_folder(open_folder: Path) -> None:
    path = open_folder / "a.colloc"
    small_store(path).close()
    Path(f"{path}.lock").unlink(missing_ok=True)
    path.chmod(0o444)
    open_folder.chmod(0o555)
    before = path.read_bytes()
    command = [sys.executable, "-c", READ, str(path)]
    lines = subprocess.run(command, capture_output=True, text=True, check=True).stdout.splitlines()
    assert lines[0] == "3"
    assert "cannot be created" in lines[1]
    assert path.read_bytes() == before
    open_folder.chmod(0o755)
    assert _files(open_folder) == ["a.colloc"]


def test_reading_during_a_write(path: Path) -> None:
    with open_for_writing(path, "test") as writer, open_for_reading(path) as reader:
        before = table_of(reader, WINDOW)
        with writer.transaction():
            facts.put(writer, "key", "value")
            assert facts.get(reader, "key", None) is None
            assert table_of(reader, WINDOW) == before
            with open_for_reading(path) as second:
                assert table_of(second, WINDOW) == before
        assert facts.get(reader, "key", None) is None
        reader.refresh()
        assert facts.get(reader, "key") == "value"


def test_a_reader_keeps_its_moment_while_tables_are_replaced(path: Path) -> None:
    """Pages that a writer deletes meanwhile are neither missed nor taken for damage."""
    with open_for_writing(path, "test") as writer, open_for_reading(path) as reader:
        before = table_of(reader, WINDOW)
        tally = tallies.find(reader, WINDOW)
        write_tally(writer, WINDOW, {(0, 1): 9})
        writer.make_durable()
        assert tally is not None
        assert cells_of(tally.around(0)) == {pair: count for pair, count in before.items() if 0 in pair}
        assert table_of(reader, WINDOW) == before
        reader.refresh()
        assert table_of(reader, WINDOW) == {(0, 1): 9}


HOLD = """
import sys, time
from colloc.store.opening import open_for_writing
store = open_for_writing(sys.argv[1], "a long build")
print("held", flush=True)
time.sleep(60)
"""


def _holder(path: Path) -> subprocess.Popen[str]:
    process = subprocess.Popen([sys.executable, "-c", HOLD, str(path)], stdout=subprocess.PIPE, text=True)
    assert process.stdout is not None
    assert process.stdout.readline() == "held\n"
    return process


def test_the_second_writer_waits_and_says_who_holds_the_lock(path: Path) -> None:
    holder = _holder(path)
    try:
        began = time.monotonic()
        with pytest.raises(
            LockedError, match=rf"process {holder.pid} is writing \(a long build, for \d s\); waited 0.3 s"
        ):
            open_for_writing(path, "test", wait=0.3)
        assert time.monotonic() - began >= 0.3
        with open_for_reading(path) as reader:
            assert checking.check(reader) == []
    finally:
        holder.kill()
        holder.communicate()
    # The system gave the lock back; the note of the dead process is taken over.
    with open_for_writing(path, "test", wait=5.0) as store:
        assert json.loads(facts.get(store, "writer"))["pid"] == os.getpid()
    with open_for_reading(path) as reader:
        assert facts.get(reader, "writer", None) is None


def test_a_dead_holder_is_not_named(path: Path) -> None:
    dead = subprocess.Popen([sys.executable, "-c", ""])
    dead.wait()
    with open_for_writing(path, "test") as store:
        facts.put(store, "writer", json.dumps({"pid": dead.pid, "purpose": "gone", "since": 0}))
        with pytest.raises(LockedError, match="another process is writing; waited 0 s"):
            open_for_writing(path, "test", wait=0.0)
        for nonsense in ("", "[]", "{}", '{"pid": "x"}'):
            facts.put(store, "writer", nonsense)
            with pytest.raises(LockedError, match="another process is writing"):
                open_for_writing(path, "test", wait=0.0)


def test_the_lock_can_be_taken_again(path: Path) -> None:
    for _ in range(3):
        open_for_writing(path, "test", wait=0.0).close()


def _write_much(store: Store) -> None:
    with store.transaction():
        for number in range(200):
            texts.append_text(store, 10**6 + 10**5 * number, os.urandom(20_000).hex())


@pytest.mark.parametrize("pages", [0, 3, 20])
def test_disk_full(path: Path, pages: int) -> None:
    """SQLite's own limit on pages fails as a full disk does: SQLITE_FULL."""
    with open_for_writing(path, "test") as store:
        before = table_of(store, WINDOW)
        size = store.value("PRAGMA page_count")
        store.execute(f"PRAGMA max_page_count = {size + pages}")
        with pytest.raises(InputOutputError, match="the disk is full; free some space"):
            _write_much(store)
        assert not store.connection.in_transaction
        assert table_of(store, WINDOW) == before
        assert checking.check(store) == []
    with open_for_reading(path) as store:
        assert checking.check(store) == []


def test_leftovers_of_dead_processes_are_removed(path: Path) -> None:
    dead = subprocess.Popen([sys.executable, "-c", ""])
    dead.wait()
    gone = path.parent / f"a.colloc.tmp-{dead.pid}-abc"
    others = [
        path.parent / f"a.colloc.tmp-{os.getpid()}-abc",  # a living process
        path.parent / f"b.colloc.tmp-{dead.pid}-abc",  # another store
        path.parent / "a.colloc.tmp-notes",  # a name of somebody's own
    ]
    for folder in (gone, *others):
        folder.mkdir()
        (folder / "run").write_bytes(b"1")
    open_for_writing(path, "test").close()
    assert not gone.exists()
    assert all(folder.exists() for folder in others)


def test_scratch_folders_go_on_every_exit(path: Path, tmp_path: Path) -> None:
    folders = []
    with contextlib.suppress(KeyboardInterrupt), scratch.scratch_folder(path) as folder:
        folders.append(folder)
        (folder / "run").write_bytes(b"1")
        raise KeyboardInterrupt
    assert [folder.parent for folder in folders] == [path.parent.absolute()]
    assert not folders[0].exists()
    elsewhere = tmp_path / "temp"
    elsewhere.mkdir()
    with scratch.scratch_folder(path, elsewhere) as folder:
        assert folder.parent == elsewhere
    assert list(elsewhere.iterdir()) == []
    with (
        pytest.raises(CannotCreateError, match="no temporary folder can be made here"),
        scratch.scratch_folder(path, tmp_path / "missing"),
    ):
        pass


WRITE = """
import sys
from colloc.store import facts
from colloc.store.opening import open_for_writing
store = open_for_writing(sys.argv[1], "test")
number = 0
while True:
    with store.transaction():
        facts.put(store, "left", str(number))
        facts.put(store, "right", str(number))
    print(number, flush=True)
    number += 1
"""


def test_a_killed_writer_loses_no_finished_commit(path: Path) -> None:
    process = subprocess.Popen([sys.executable, "-c", WRITE, str(path)], stdout=subprocess.PIPE, text=True)
    assert process.stdout is not None
    for _ in range(5):
        process.stdout.readline()
    process.send_signal(signal.SIGKILL)
    rest = process.communicate()[0].split()
    last = int(rest[-1]) if rest else 4
    with open_for_reading(path) as store:
        assert facts.get(store, "left") == facts.get(store, "right")
        # One commit may have ended without its number having been printed.
        assert int(facts.get(store, "left")) in (last, last + 1)
        assert checking.check(store) == []


def test_make_durable_leaves_one_complete_file(path: Path, tmp_path: Path) -> None:
    with open_for_writing(path, "test") as store:
        facts.put(store, "key", "value")
        store.make_durable()
        copy = tmp_path / "copy.colloc"
        copy.write_bytes(path.read_bytes())
    with open_for_reading(copy) as store:
        assert facts.get(store, "key") == "value"


def test_transactions_join_and_roll_back(path: Path) -> None:
    with open_for_writing(path, "test") as store:
        with contextlib.suppress(KeyboardInterrupt), store.transaction():
            with store.transaction():
                facts.put(store, "key", "value")
            assert facts.get(store, "key") == "value"
            raise KeyboardInterrupt
        assert facts.get(store, "key", None) is None


def test_facts(path: Path) -> None:
    with open_for_writing(path, "test") as store:
        assert facts.get(store, "made") == "for a test"
        assert facts.get(store, "none", "default") == "default"
        with pytest.raises(StoreDamagedError, match="does not say its 'none'"):
            facts.get(store, "none")
        facts.put(store, "key", "value")
        facts.remove(store, "key")
        assert "key" not in facts.every(store)
        before = facts.generation(store)
        assert facts.next_generation(store) == before + 1 == facts.generation(store)


def test_errors_of_ours_in_sql_are_not_disguised(path: Path) -> None:
    store: Store
    with open_for_reading(path) as store, pytest.raises(sqlite3.OperationalError, match="syntax error"):
        store.execute("SELEKT 1")
