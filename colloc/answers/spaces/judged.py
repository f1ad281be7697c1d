"""Lists of word pairs that people have judged, as files have them."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence

import numpy as np

from colloc.answers.spaces.agreement import JudgedPairs
from colloc.errors import DataError

_SEPARATORS = (re.compile(r"\t"), re.compile(r"[,;]"), re.compile(r"\s+"))


def judged_pairs(name: str, lines: Iterable[str]) -> JudgedPairs:
    """Two words and a number a line, separated by tabs, commas, semicolons or spaces.

    Blank lines and lines that begin with ``#`` are passed over, and a heading on the first line. Further cells are
    not read.

    Raises
    ------
    DataError
        Names the line that is not of this form.
    """
    pairs: list[tuple[str, str]] = []
    scores: list[float] = []
    for number, line in enumerate(lines, 1):
        text = line.strip().removeprefix("\ufeff")
        if not text or text.startswith("#"):
            continue
        cells = next((cells for cut in _SEPARATORS if len(cells := cut.split(text)) >= 3), [])
        score = _number(cells[2]) if cells else None
        if score is None:
            if number == 1:
                continue
            raise DataError(f"{name}:{number}: a line holds two words and a number, as in 'sea<TAB>ship<TAB>7.5'")
        pairs.append((cells[0].strip(), cells[1].strip()))
        scores.append(score)
    if not pairs:
        raise DataError(f"{name}: no line with two words and a number")
    return JudgedPairs(name, pairs, np.array(scores))


def from_rows(name: str, rows: Sequence[tuple[str, str, float]]) -> JudgedPairs:
    """Judged pairs from rows of word, word, score."""
    return JudgedPairs(name, [(one, other) for one, other, _ in rows], np.array([float(row[2]) for row in rows]))


def _number(text: str) -> float | None:
    try:
        value = float(text)
    except ValueError:
        return None
    return value if np.isfinite(value) else None
