"""Lists of pairs and expressions that users bring."""

from __future__ import annotations

import re
from pathlib import Path

from colloc.cli.tables_in import read_lines, read_rows
from colloc.errors import DataError

_JOINED = re.compile(r"(?<=[^\s_])_(?=[^\s_])")
"""An underscore between words; one that stands alone is an open place."""


def read_matters(path: Path) -> list[list[str]]:
    """Pairs and expressions of a file, each as its words.

    A table with the columns ``first`` and ``second`` gives pairs. Any other file has one on each line: words between
    tabs, or between spaces and underscores.

    Raises
    ------
    DataError
        For a line with one word only.
    """
    lines = read_lines(path)
    if not lines:
        raise DataError(f"{path}: no pairs or expressions in it")
    header = {cell.strip().strip('"') for cell in lines[0].removeprefix("\ufeff").replace("\t", ",").split(",")}
    if {"first", "second"} <= header or lines[0].lstrip().startswith("{"):
        return [
            [str(first), str(second)]
            for rows in read_rows(path)
            for first, second in zip(rows.columns["first"], rows.columns["second"], strict=True)
        ]
    found = [line.split("\t") if "\t" in line else _JOINED.sub(" ", line).split() for line in lines]
    for line, words in zip(lines, found, strict=True):
        if len(words) < 2:
            raise DataError(f"{path}: {line!r} is one word: a pair or an expression has two or more")
    return found
