"""Frequency lists that users bring: a table with the columns ``word`` and ``count``."""

from __future__ import annotations

from pathlib import Path

from colloc.cli.tables_in import read_rows
from colloc.errors import DataError


def read_counts(path: Path) -> dict[str, int]:
    """Counts by word; those of a word that stands in several rows are added up.

    Raises
    ------
    NoInputError, DataError
        The file is missing, lacks a column, or a count is not a whole number.
    """
    counts: dict[str, int] = {}
    for rows in read_rows(path):
        missing = [name for name in ("word", "count") if name not in rows.columns]
        if missing:
            there = ", ".join(rows.columns) or "none"
            raise DataError(f"{rows.name}: a frequency list needs the columns word and count; there are {there}")
        for word, count, line in zip(rows.columns["word"], rows.columns["count"], rows.lines, strict=True):
            try:
                number = int(count)
            except (TypeError, ValueError) as error:
                raise DataError(f"{rows.name}:{line}: count must be a whole number, not {count!r}") from error
            if not isinstance(word, str) or number < 0:
                raise DataError(f"{rows.name}:{line}: needs a word and a count that is not negative")
            counts[word] = counts.get(word, 0) + number
    return counts
