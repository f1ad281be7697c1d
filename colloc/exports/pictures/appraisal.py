"""How well rankings find what is wanted: precision against recall, one line a ranking."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from colloc.exports.pictures.canvas import FILL, INK, SOFT, drawing
from colloc.measures.retrieval import Steps, average_precision, steps
from colloc.records import FloatArray

MOST_LINES = 6
_DASHES: tuple[str | tuple[int, tuple[int, ...]], ...] = (
    *("solid", "dashed", "dotted", "dashdot"),
    *((0, (6, 1, 1, 1, 1, 1)), (0, (1, 3))),
)
_POINTS = 2000


def precision_recall_picture(
    path: Path, wanted: NDArray[np.bool_], scores: dict[str, FloatArray], names: Sequence[str]
) -> None:
    """Draw some of the rankings to an SVG or PNG file.

    Parameters
    ----------
    wanted : bool array, shape (n,)
    scores : dict of str to float64 array
        Ranking values, highest first.
    names : sequence of str
        Which of them, best first; at most `MOST_LINES` are drawn, and of several with the same order only the first.

    Raises
    ------
    MissingExtraError
        Where matplotlib is not installed.
    """
    with drawing(path, wide=6.5, high=4.5) as (_, (axes,)):
        for place, (name, ranking) in enumerate(_different(wanted, scores, names)):
            kept = np.flatnonzero(ranking.wanted)
            kept = kept[:: max(len(kept) // _POINTS, 1)]
            axes.plot(
                ranking.recall[kept],
                ranking.precision[kept],
                color=INK if place % 2 == 0 else FILL,
                linestyle=_DASHES[place],
                linewidth=2.0 if place == 0 else 1.3,
                label=f"{name}  {average_precision(ranking):.3f}",
            )
        axes.axhline(float(wanted.mean()), color=SOFT, linewidth=0.8)
        axes.annotate(
            "any order",
            (1.0, float(wanted.mean())),
            xytext=(0, -3),
            textcoords="offset points",
            ha="right",
            va="top",
            color=SOFT,
        )
        axes.set_xlabel("recall: share of all wanted pairs")
        axes.set_ylabel("precision: share of wanted among those so far")
        axes.set_xlim(0, 1)
        axes.set_ylim(bottom=0)
        axes.legend(title="average precision", frameon=False, alignment="left")


def _different(
    wanted: NDArray[np.bool_], scores: dict[str, FloatArray], names: Sequence[str]
) -> list[tuple[str, Steps]]:
    found: list[tuple[str, Steps]] = []
    for name in names:
        ranking = steps(wanted, scores[name])
        if not any(np.array_equal(ranking.precision, other.precision) for _, other in found):
            found.append((name, ranking))
        if len(found) == MOST_LINES:
            break
    return found
