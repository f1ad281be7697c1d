"""Every engine counts what a plain loop counts, or the ratios would compare different work."""

from __future__ import annotations

import re
from collections import Counter
from pathlib import Path

import pytest

from .engines import ENGINES, PYTHON_WORD
from .texts import write_stream

pytestmark = pytest.mark.bench


def brute_force(text: Path, window: int) -> Counter[tuple[str, str]]:
    counts: Counter[tuple[str, str]] = Counter()
    for line in text.read_text(encoding="utf-8").splitlines():
        words = re.findall(PYTHON_WORD, line.lower())
        for place, first in enumerate(words):
            counts.update((first, second) for second in words[place + 1 : place + 1 + window])
    return counts


@pytest.mark.parametrize("window", [1, 2, 5, 10])
@pytest.mark.parametrize("engine", ENGINES)
def test_counts(engine: str, window: int, tmp_path: Path) -> None:
    if engine == "sklearn" and window != 1:
        with pytest.raises(ValueError, match="adjacent"):
            ENGINES[engine](tmp_path, window, 2)
        return
    text = tmp_path / "text.txt"
    with text.open("wb") as out:
        out.write('Don\'t "go" well-known café 1840.\n\nOne\na,a a’s - b--c, d\tE F G\n'.encode())
        write_stream(out, tokens=20_000, seed=5)
    counted = ENGINES[engine](text, window, 2)
    expected = brute_force(text, window)
    assert {(first, second): joint for first, second, joint in counted.rows()} == expected
    assert (counted.pairs, counted.occurrences) == (len(expected), expected.total())
