"""A picture of drift: the rate of a word or a pair by period, and the association of the pair, with their intervals."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from colloc.answers.columns import Columns
from colloc.errors import UsageError
from colloc.exports.pictures.canvas import FILL, INK, SOFT, drawing, shorten

if TYPE_CHECKING:
    from matplotlib.axes import Axes


def draw_course(answer: Columns, path: Path) -> None:
    """Draw what ``drift`` gave for one word or one pair.

    Raises
    ------
    UsageError
        The answer is not one of a single word or pair.
    MissingExtraError
        Where matplotlib is not installed.
    """
    if "per_million" not in answer or "period" not in answer:
        raise UsageError("only the course of one word or one pair is drawn: name it, and leave out --all")
    paired = "pmi" in answer
    words = [answer.settings["first"], *([answer.settings["second"]] if paired else [])]
    title = " + ".join(f"‘{shorten(word)}’" for word in words)
    with drawing(path, wide=7.2, high=5.6 if paired else 3.2, panels=2 if paired else 1) as (_, panels):
        _line(panels[0], answer, "per_million", "low", "high")
        panels[0].set_ylim(bottom=0)
        panels[0].set_ylabel("per million words")
        panels[0].set_title(f"{title} by {answer.settings['by']}", loc="left", fontsize=10)
        if paired:
            _line(panels[1], answer, "pmi", "pmi_low", "pmi_high")
            panels[1].axhline(0, color=SOFT, linewidth=0.8, linestyle=(0, (1, 2)))
            panels[1].set_ylabel("PMI (bits)")
            panels[1].set_xlim(panels[0].get_xlim())
        panels[-1].set_xlabel(f"{answer.settings['by']} (mean of each period; bars: 95 %, over documents)")


def _line(axes: Axes, answer: Columns, value: str, low: str, high: str) -> None:
    times, values = answer["time"], answer[value]
    # A value that is not finite (the pair never met) breaks the line; an unbounded interval has no bar.
    known = np.isfinite(values)
    bounded = known & np.isfinite(answer[low]) & np.isfinite(answer[high])
    reach = np.zeros((2, len(values)))
    reach[:, bounded] = np.abs(np.vstack([answer[low], answer[high]])[:, bounded] - values[bounded])
    axes.errorbar(
        times,
        np.where(known, values, np.nan),
        yerr=reach,
        color=INK,
        ecolor=FILL,
        elinewidth=1.2,
        capsize=2.5,
        marker="o",
        markersize=4,
        linewidth=1.0,
    )
