"""Tables for a terminal: which columns are shown where not all fit, and the line that names the others."""

from __future__ import annotations

import shutil
import sys
from itertools import chain
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from colloc.answers.columns import Columns

FIRST_TO_GO = (
    ("first_total", "second_total", "total"),
    ("expected",),
    ("corpus_floor", "order_floor"),
    ("formula_low", "formula_high"),
    ("dp", "dp_norm"),
    ("g2_two_cells",),
    ("per_million_this", "per_million_that"),
    ("documents_this", "documents_that"),
    ("g2",),
)
"""Columns that support others, in the order in which a narrow terminal does without them."""
_KEPT = ("says",)
"""Columns that sum the others up, wherever they stand."""
_GAP = 2
"""Spaces between columns."""


def terminal_width() -> int | None:
    """Columns of the terminal that standard output goes to (``COLUMNS`` overrules it); None where it goes elsewhere."""
    return shutil.get_terminal_size().columns if sys.stdout.isatty() else None


def fitting(answer: Columns, room: int) -> tuple[str, ...]:
    """Names of the columns that fit into so many characters side by side; the first two and what ranks always stay.

    Columns that only support others go first, then those at the right end.
    """
    from colloc.answers.plain import Grid

    grid = Grid(answer.names, [answer.is_numeric(name) for name in answer.names])
    grid.lines([array.tolist() for array in answer.data.values()], heading=True)
    widths = dict(zip(answer.names, grid.widths, strict=True))
    kept = {*answer.names[:2], *_KEPT, answer.settings.get("measure")}
    single = [_together(name) for name in reversed(answer.names) if name not in chain(kept, *FIRST_TO_GO)]
    supporting = [group for group in FIRST_TO_GO if not kept.intersection(group)]

    def fits(without: set[str]) -> bool:
        return sum(width + _GAP for name, width in widths.items() if name not in without) - _GAP <= room

    gone: set[str] = set()
    groups = [*supporting, *single]
    for group in groups:
        if fits(gone):
            break
        gone |= {*group}
    # What was given up early may fit after all beside what went for it.
    for group in reversed(groups):
        if fits(gone - {*group}):
            gone -= {*group}
    return tuple(name for name in answer.names if name not in gone)


def _together(name: str) -> tuple[str, ...]:
    """A column and the one that means nothing without it: both ends of an interval, both sides of a comparison."""
    for one, other in (("low", "high"), ("this", "that")):
        if name.endswith((one, other)):
            stem = name.removesuffix(one).removesuffix(other)
            return f"{stem}{one}", f"{stem}{other}"
    return (name,)


def left_out_line(answer: Columns, shown: tuple[str, ...]) -> str:
    """What is said under a table that does not show every column; empty where it does."""
    others = [name for name in answer.names if name not in shown]
    if not others:
        return ""
    number = "1 more column" if len(others) == 1 else f"{len(others)} more columns"
    return f"({number}: {', '.join(others)}; a wider window, a pipe or --format csv shows all)"
