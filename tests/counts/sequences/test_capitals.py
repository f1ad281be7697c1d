"""Which words tell of capitals."""

from __future__ import annotations

import pytest

from colloc.counts.sequences.capitals import mark
from colloc.counts.sequences.sharing import CAPITAL, NO_MARK, SMALL


@pytest.mark.parametrize(
    ("form", "expected"),
    [
        ("Ada", CAPITAL),
        ("ADA", CAPITAL),
        ("Žofie", CAPITAL),
        ("ǅuro", CAPITAL),  # a title-case letter, neither upper nor lower
        ("ada", SMALL),
        ("I", NO_MARK),
        ("I'm", NO_MARK),
        ("a", NO_MARK),
        ("O2", NO_MARK),
        ("1st", SMALL),
        ("海", SMALL),  # a script without case has no names by this rule, and drops nothing
        ("بحر", SMALL),
    ],
)
def test_mark(form: str, expected: int) -> None:
    assert mark(form) == expected
