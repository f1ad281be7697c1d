"""Fenced blocks of the documentation: found, run, and compared with what they say.

``console`` blocks: a line beginning with ``$ `` is a command (a backslash at its end continues it); the lines up to
the next command are its exact standard output, where a line ``...`` stands for any lines. ``python`` blocks are
scripts, or sessions with ``>>>`` as in the standard library's doctest. The blocks of one file share a folder and a
Python namespace, in the order in which they stand.
"""

from __future__ import annotations

import doctest
import io
import os
import re
import subprocess
import sys
from collections.abc import Iterator
from contextlib import redirect_stdout
from dataclasses import dataclass
from pathlib import Path
from typing import Any

FENCE = re.compile(r"^```(\w*)[^\n]*\n(.*?)^```\s*$", re.MULTILINE | re.DOTALL)
LONGEST_COMMAND = 300
"""Seconds that one command of the documentation may take."""


@dataclass(frozen=True)
class Block:
    language: str
    text: str
    line: int
    """Line of the file on which the text of the block begins."""


@dataclass(frozen=True)
class Command:
    command: str
    expected: tuple[str, ...]
    line: int


def blocks_of(markdown: str) -> Iterator[Block]:
    for match in FENCE.finditer(markdown):
        yield Block(match[1], match[2], markdown.count("\n", 0, match.start(2)) + 1)


def commands_of(block: Block) -> list[Command]:
    """Raises ValueError where the block does not begin with a command."""
    commands: list[Command] = []
    lines = list(enumerate(block.text.splitlines(), block.line))
    while lines:
        number, line = lines.pop(0)
        if not line.startswith("$ "):
            raise ValueError(f"line {number}: a console block begins with a command after '$ '")
        command = line[2:]
        while command.endswith("\\") and lines:
            command += "\n" + lines.pop(0)[1]
        expected = []
        while lines and not lines[0][1].startswith("$ "):
            expected.append(lines.pop(0)[1])
        commands.append(Command(command, tuple(expected), number))
    return commands


def same(expected: tuple[str, ...], printed: tuple[str, ...]) -> bool:
    """Whether the lines are the same, spaces at line ends apart; ``...`` alone on a line stands for any lines."""
    parts = [".*" if line.strip() == "..." else re.escape(line.rstrip()) for line in expected]
    pattern = "".join(r"(?:.*\n)*" if part == ".*" else part + r"\n" for part in parts)
    return re.fullmatch(pattern, "".join(line.rstrip() + "\n" for line in printed)) is not None


def run_command(command: Command, folder: Path) -> str | None:
    """What is wrong with the command's exit code or output, None where it is as the documentation says."""
    environment = dict(os.environ, PATH=f"{Path(sys.executable).parent}{os.pathsep}{os.environ['PATH']}")
    run = subprocess.run(
        ["bash", "-o", "pipefail", "-c", command.command],
        cwd=folder,
        env=environment,
        stdin=subprocess.DEVNULL,
        capture_output=True,
        text=True,
        timeout=LONGEST_COMMAND,
    )
    printed = tuple(run.stdout.splitlines())
    if run.returncode == 0 and same(command.expected, printed):
        return None
    shown = "\n".join(printed)
    return (
        f"line {command.line}: $ {command.command}\nexit code {run.returncode}\n--- expected\n"
        + "\n".join(command.expected)
        + f"\n--- printed\n{shown}\n--- standard error\n{run.stderr}"
    )


def run_python(block: Block, namespace: dict[str, Any]) -> str | None:
    """As ``run_command``, in this process and the current folder."""
    if ">>> " not in block.text:
        exec(compile(block.text, f"line {block.line}", "exec"), namespace)
        return None
    session = doctest.DocTestParser().get_doctest(block.text, namespace, "block", None, block.line - 1)
    session.globs = namespace
    report = io.StringIO()
    runner = doctest.DocTestRunner(optionflags=doctest.ELLIPSIS)
    with redirect_stdout(report):
        failed = runner.run(session, out=report.write, clear_globs=False).failed
    return report.getvalue() if failed else None


def run_blocks(markdown: str, folder: Path) -> list[str]:
    """Everything that is not as the text says; the caller has made ``folder`` the current one."""
    problems: list[str | None] = []
    namespace: dict[str, Any] = {"__name__": "__main__"}
    for block in blocks_of(markdown):
        if block.language == "console":
            problems += [run_command(command, folder) for command in commands_of(block)]
        elif block.language == "python":
            problems.append(run_python(block, namespace))
    return [problem for problem in problems if problem is not None]
