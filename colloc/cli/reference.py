"""The page ``docs/cli.md``, written from the commands themselves: ``python -m colloc.cli.reference``."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import typer
from typer.main import get_command

from colloc.cli.app import build_app
from colloc.cli.output import opened

PAGE = Path(__file__).resolve().parents[2] / "docs" / "cli.md"
WIDTH = 100

INTRODUCTION = """\
# Commands

This page is written by `python -m colloc.cli.reference` from the commands themselves.

STORE is the SQLite file that holds a corpus and its counts; it comes first. Results go to standard
output or to the file of `-o`, everything else (the line with the settings, progress, errors) to standard error. A file
named with `-o` is whole or not there: it is written beside its place and then renamed.

## Words that the options use

| word | what it means |
| --- | --- |
| document | one text with its identifier and metadata |
| layer | what counts as the same word: as it is written, whatever its case, by lemma, ... |
| slice | documents chosen by their metadata, such as `year=1880..1889` |
| window | how far apart two words may stand to count as a pair |
| table | how often each word stands near each other one: of one layer, window and slice (`tally` lists them) |
| joint | how often two words meet |
| margins | the totals that `joint` is held against: how often each of the two words meets any word, or occurs |
| attraction, avoidance | that two words meet more often, or less often, than their margins explain |
| chance floor | the strength that only 1 % of pairs reach in shuffled text |
| relation | head and dependent in annotated text, such as a verb and its object |

[`measures.md`](measures.md) has every measure, [`sureness.md`](sureness.md) every column about how sure a row is.

## Formats

| `--format` | result |
| --- | --- |
| `table` | aligned text for reading; measures with 4 decimals |
| `csv`, `tsv` | RFC 4180 quoting, UTF-8, line feeds; numbers in full precision, nothing where there is no number |
| `jsonl` | one object a line; `null` where there is no number, `"inf"` and `"-inf"` for infinities |
| `json` | one object with `settings` and `rows` |
| `parquet` | Apache Parquet, settings in the schema's metadata; needs `pip install 'colloc[tables]'` |

On a terminal a table shows the columns that fit beside each other and names the others below; `COLUMNS` in the
environment overrules its width. A pipe, a file and all other formats have every column.

In CSV and TSV a text that begins with `=`, `+`, `-`, `@`, a tab or a carriage return and is no number has an
apostrophe put before it, so that no spreadsheet takes it for a formula; texts that begin with apostrophes before such a
character get one more. `colloc measure` takes it off again.

Sizes such as `--memory 2GB` are written with KB, MB, GB or TB, in powers of 1024.

## Exit codes

| code | meaning |
| --- | --- |
| 0 | done |
| 1 | a check found problems, or the word or pair was never seen |
| 2 | wrong usage |
| 65 | bad data |
| 66 | no input |
| 69 | an optional library is missing |
| 73 | the output cannot be created |
| 74 | the disk is full, or reading or writing failed |
| 75 | the store is locked by another process; try again |
| 130 | interrupted |
"""


def markdown() -> str:
    """The whole page."""
    group: Any = get_command(build_app())
    root = _context(group, "colloc", None)
    parts = [INTRODUCTION, _section("colloc", group.get_help(root))]
    for name in group.list_commands(root):
        command = group.get_command(root, name)
        parts.append(_section(f"colloc {name}", command.get_help(_context(command, name, root))))
    return "\n".join(parts)


def _context(command: Any, name: str, parent: typer.Context | None) -> typer.Context:
    # A width of its own: the page must not depend on the terminal it is written from.
    return typer.Context(
        command, info_name=name, parent=parent, **{**command.context_settings, "terminal_width": WIDTH}
    )


def _section(title: str, text: str) -> str:
    lines = "\n".join(line.rstrip() for line in text.splitlines())
    return f"## {title}\n\n```text\n{lines}\n```\n"


if __name__ == "__main__":
    with opened(PAGE) as page:
        page.write(markdown().encode())
