"""The runner of documentation blocks itself, on small texts: it must notice what is wrong."""

from __future__ import annotations

from pathlib import Path

import pytest

from .blocks import Block, blocks_of, commands_of, run_blocks, same


def fenced(language: str, text: str) -> str:
    return f"before\n\n```{language}\n{text}\n```\n\nafter\n"


def test_blocks_know_their_line() -> None:
    assert list(blocks_of(fenced("console", "$ true"))) == [Block("console", "$ true\n", 4)]


def test_commands_and_what_they_print() -> None:
    commands = commands_of(Block("console", "$ one \\\n  two\nout\n\nmore\n$ three\n", 10))
    assert [(one.command, one.expected, one.line) for one in commands] == [
        ("one \\\n  two", ("out", "", "more"), 10),
        ("three", (), 15),
    ]


def test_a_block_without_a_command_is_refused() -> None:
    with pytest.raises(ValueError, match="line 3: a console block begins with a command"):
        commands_of(Block("console", "output\n", 3))


@pytest.mark.parametrize(
    ("expected", "printed", "equal"),
    [
        (("a", "b"), ("a", "b"), True),
        (("a",), ("a", "b"), False),
        (("a", "b"), ("a",), False),
        (("a.",), ("ab",), False),
        (("a", "...", "d"), ("a", "b", "c", "d"), True),
        (("a", "...", "d"), ("a", "d"), True),
        (("a", "...", "d"), ("a", "b", "c"), False),
        (("...",), (), True),
        (("a  ",), ("a",), True),
        ((), ("a",), False),
    ],
)
def test_lines_are_compared(expected: tuple[str, ...], printed: tuple[str, ...], equal: bool) -> None:
    assert same(expected, printed) is equal


@pytest.mark.parametrize(
    ("markdown", "problem"),
    [
        (fenced("console", "$ echo one; echo two >&2\none"), None),
        (fenced("console", "$ echo one\ntwo"), "--- printed\none"),
        (fenced("console", "$ exit 3"), "exit code 3"),
        (fenced("console", "$ false | true"), "exit code 1"),
        (fenced("console", "$ echo kept > file") + fenced("python", ">>> open('file').read()\n'kept\\n'"), None),
        (fenced("python", "x = 2") + fenced("python", ">>> x + 1\n3\n>>> print('a b')\na ..."), None),
        (fenced("python", ">>> 1 + 1\n3"), "Got:\n    2"),
        (fenced("sh", "exit 1") + fenced("", "nothing"), None),
    ],
)
@pytest.mark.filterwarnings("ignore:unclosed file:ResourceWarning")
def test_what_blocks_do_is_compared(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, markdown: str, problem: str | None
) -> None:
    monkeypatch.chdir(tmp_path)
    found = run_blocks(markdown, tmp_path)
    assert bool(found) is bool(problem)
    assert problem is None or problem in found[0]


def test_a_script_that_fails_fails(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    with pytest.raises(ZeroDivisionError):
        run_blocks(fenced("python", "1 / 0"), tmp_path)
