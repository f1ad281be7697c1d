"""The one error boundary: every error a line and an exit code, bugs a traceback.

Exit codes: sysexits.h (BSD), 128 + signal number for interrupts (POSIX shells).
"""

from __future__ import annotations

import errno
import os
import signal
import sqlite3
import subprocess
from pathlib import Path

import pytest

from colloc import errors
from colloc.cli.tables_in import ROWS_A_PART
from colloc.verbs import asking

from .conftest import COLLOC, Run, process

SYSEXITS = {
    "EX_USAGE_OF_SHELLS": 2,
    "EX_DATAERR": 65,
    "EX_NOINPUT": 66,
    "EX_UNAVAILABLE": 69,
    "EX_CANTCREAT": 73,
    "EX_IOERR": 74,
    "EX_TEMPFAIL": 75,
}


def sqlite_error(name: str) -> sqlite3.OperationalError:
    error = sqlite3.OperationalError("something about the disk")
    error.sqlite_errorname = name
    return error


@pytest.mark.parametrize(
    ("raised", "code", "words"),
    [
        (errors.CollocError("plain"), 1, "plain"),
        (errors.NotSeenError("'xyz' never occurs"), 1, "'xyz' never occurs"),
        (errors.UsageError("wrong option"), SYSEXITS["EX_USAGE_OF_SHELLS"], "wrong option"),
        (errors.DataError("a.txt:3: bad"), SYSEXITS["EX_DATAERR"], "a.txt:3: bad"),
        (errors.StoreDamagedError("page 7"), SYSEXITS["EX_DATAERR"], "page 7"),
        (errors.NoInputError("no text"), SYSEXITS["EX_NOINPUT"], "no text"),
        (errors.MissingExtraError("no pyarrow"), SYSEXITS["EX_UNAVAILABLE"], "no pyarrow"),
        (errors.CannotCreateError("no folder"), SYSEXITS["EX_CANTCREAT"], "no folder"),
        (errors.InputOutputError("disk"), SYSEXITS["EX_IOERR"], "disk"),
        (errors.LockedError("another"), SYSEXITS["EX_TEMPFAIL"], "another"),
        (OSError(errno.ENOSPC, os.strerror(errno.ENOSPC), "/there"), 74, "/there: No space left on device"),
        (OSError(errno.EIO, os.strerror(errno.EIO)), 74, "Input/output error"),
        (PermissionError(errno.EACCES, "Permission denied", "x"), 74, "x: Permission denied"),
        (sqlite_error("SQLITE_FULL"), 74, "something about the disk; free some space"),
        (sqlite_error("SQLITE_IOERR_WRITE"), 74, "something about the disk"),
        (sqlite_error("SQLITE_BUSY"), 75, "another process is writing"),
        (sqlite_error("SQLITE_CORRUPT"), 65, "colloc check"),
        (KeyboardInterrupt(), 128 + signal.SIGINT, "interrupted"),
    ],
)
def test_errors_become_one_line_and_a_code(
    run: Run, monkeypatch: pytest.MonkeyPatch, raised: BaseException, code: int, words: str
) -> None:
    def failing(*_: object, **__: object) -> None:
        raise raised

    monkeypatch.setattr(asking, "words", failing)
    ran = run("words", "store")
    assert ran.code == code
    assert ran.out == ""
    assert ran.err.startswith("colloc: ")
    assert words in ran.err
    assert ran.err.count("\n") == 1


@pytest.mark.parametrize(
    "bug", [ValueError("a bug"), FileNotFoundError(errno.ENOENT, "gone"), sqlite_error("SQLITE_ERROR")]
)
def test_bugs_keep_their_traceback(run: Run, monkeypatch: pytest.MonkeyPatch, bug: Exception) -> None:
    def failing(*_: object, **__: object) -> None:
        raise bug

    monkeypatch.setattr(asking, "words", failing)
    with pytest.raises(type(bug)):
        run("words", "store")


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["pears"], "No such command 'pears'. Did you mean 'pairs'"),
        (["pairs"], "Missing argument 'STORE'"),
        (["pairs", "store", "--windo", "3"], "--window"),
        (["pairs", "store", "--window", "three"], "'--window'"),
        (["pairs", "store", "--format", "xls"], "'--format'"),
        (["pairs", "store", "--limit", "-1"], "'--limit'"),
        (["pairs", "store", "--settings-beside"], "name one with -o"),
        (["around", "store"], "give at least one word"),
        (["measure", "table.csv", "--measure", "npmu"], "did you mean 'npmi'?"),
        (["pairs", "store", "--measure", "gg2"], "did you mean 'g2'?"),
        (["pairs", "store", "--show", "pmi,nothing_like_it"], "unknown measure 'nothing_like_it'; choose from pmi"),
        (["pairs", "store", "--memory", "lots"], "not 'lots'"),
        (["pairs", "store", "--memory", "1MB"], "at least 384 MB, not 1MB"),
        (["info", "store", "--by", "year", "--documents"], "one at a time"),
        (["build", "store", "x", "--max-record", "12"], "max_record must be at least 1024 bytes, not 12"),
        (["build", "store", "x", "--max-token", "0"], "max_token must be at least 1, not 0"),
        (["build", "store", "x", "--window", "-1"], "-1"),
        (["build", "store", "x", "--window", "5", "--left", "1", "--right", "2"], "contradict"),
        (["build", "store", "x", "--left", "1"], "go together"),
        (["build", "store", "x", "--window", "100000"], "not 100000"),
    ],
)
def test_wrong_usage_is_told_in_one_line(run: Run, arguments: list[str], words: str) -> None:
    ran = run(*arguments)
    assert ran.code == 2
    assert ran.out == ""
    assert ran.err.startswith("colloc: ")
    assert words in ran.err
    assert ran.err.count("\n") == 1


def test_no_arguments_show_the_commands(run: Run) -> None:
    ran = run()
    assert ran.code == 2
    assert "Commands:" in ran.err
    assert "colloc demo" in ran.err


def test_version_and_help(run: Run) -> None:
    assert run("--version").out.startswith("colloc 0.")
    helped = run("pairs", "-h")
    assert helped.code == 0
    assert "--min-word-count N" in helped.out


def table(rows: int) -> bytes:
    return b"joint,first_total,second_total,total\n" + b"3,5,7,1000\n" * rows


def test_a_reader_that_goes_away_is_no_error(tmp_path: Path) -> None:
    big = tmp_path / "big.csv"
    big.write_bytes(table(200_000))
    command = f"{' '.join(COLLOC)} measure {big} --measure pmi; echo $? >{tmp_path}/code"
    head = subprocess.run(["sh", "-c", f"({command}) | head -n 2"], capture_output=True, text=True, check=True)
    assert head.stdout.count("\n") == 2
    assert head.stderr == f"# measure: table {big}; measures pmi\n"
    assert (tmp_path / "code").read_text() == "0\n"


def test_interrupting_a_process() -> None:
    waiting = subprocess.Popen(
        [*COLLOC, "measure", "-", "-o", os.devnull],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
    )
    assert waiting.stdin is not None
    assert waiting.stderr is not None
    # Enough for the first rows to be measured; then it waits at the open pipe, as the settings line tells.
    waiting.stdin.write(table(ROWS_A_PART + 20_000))
    waiting.stdin.flush()
    assert waiting.stderr.readline().startswith(b"# measure")
    waiting.send_signal(signal.SIGINT)
    _, err = waiting.communicate(timeout=30)
    assert waiting.returncode == 130
    assert err.decode().endswith("colloc: interrupted\n")


def test_a_full_disk_is_told() -> None:
    ran = process("measure", "-", "-o", "/dev/full", stdin=table(1))
    assert ran.code == 74
    assert "No space left on device" in ran.err


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish"])
def test_shell_completion(shell: str, monkeypatch: pytest.MonkeyPatch) -> None:
    words = {"bash": "COMP_WORDS", "zsh": "_TYPER_COMPLETE_ARGS", "fish": "_TYPER_COMPLETE_ARGS"}[shell]
    monkeypatch.setenv("_COLLOC_COMPLETE", f"complete_{shell}")
    monkeypatch.setenv("_TYPER_COMPLETE_FISH_ACTION", "get-args")
    monkeypatch.setenv("COMP_CWORD", "1")
    monkeypatch.setenv(words, "colloc pai")
    assert "pairs" in process().out
    monkeypatch.setenv("COMP_CWORD", "4")
    monkeypatch.setenv(words, "colloc pairs store --measure npm")
    assert "npmi" in process().out


def test_show_completion_prints_a_script() -> None:
    ran = process("--show-completion", "bash")
    assert ran.code == 0
    assert "complete -o default -F _colloc_completion colloc" in ran.out


def test_no_colour_codes_even_when_asked_for(monkeypatch: pytest.MonkeyPatch) -> None:
    """https://no-color.org: nothing coloured where NO_COLOR is set."""
    monkeypatch.setenv("FORCE_COLOR", "1")
    monkeypatch.setenv("NO_COLOR", "1")
    for ran in (process("--help"), process("pairs", "--help"), process("pairs")):
        assert "\x1b" not in ran.out + ran.err
