"""A measure against how often chance would bring the words together, with the chance floors drawn in."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.sureness.floors import Floors
from colloc.exports.pictures.canvas import FILL, INK, SOFT, drawing, shorten
from colloc.measures.catalogue import find
from colloc.records import FloatArray

LABELLED = 12
_STYLES = {
    "order": ("solid", "words shuffled within documents"),
    "corpus": ("dashed", "words shuffled across documents"),
}


def draw_frequency(answer: Columns, measure: str, floors: Sequence[Floors], path: Path) -> None:
    """Rows of ``pairs`` or ``around`` as points: expected count across (logarithmic), the measure upwards.

    Parameters
    ----------
    floors : sequence of Floors
        Drawn as steps: 99 of 100 pairs of shuffled text lie below.
    """
    often, values = answer["expected"].astype(np.float64), answer[measure].astype(np.float64)
    known = np.isfinite(values) & (often > 0)
    title, unit = find(measure).title, find(measure).unit
    with drawing(path, wide=7.2, high=5.0) as (_, (axes,)):
        from matplotlib.patheffects import withStroke

        halo = [withStroke(linewidth=2.2, foreground="white")]
        axes.set_xscale("log")
        axes.xaxis.set_major_formatter(lambda often, _: f"{often:g}")
        axes.plot(
            often[known],
            values[known],
            linestyle="none",
            marker="o",
            markersize=3.4,
            markerfacecolor="white",
            markeredgecolor=FILL,
            markeredgewidth=0.9,
            label="pairs of the answer",
            zorder=2,
        )
        low, high = _limits(often[known])
        axes.set_xlim(low, high)
        for floor in floors:
            style, name = _STYLES[floor.shuffle]
            edges, steps = _steps(floor, measure, low, high)
            axes.plot(
                edges,
                steps,
                drawstyle="steps-post",
                color=INK,
                linestyle=style,
                linewidth=1.2,
                label=f"99 % floor, {name}",
                zorder=3,
            )
        for row in _spaced(np.log(np.where(often > 0, often, 1.0)), values, known):
            label = f"{shorten(answer['first'][row], 14)} {shorten(answer['second'][row], 14)}"
            axes.annotate(
                label,
                (often[row], values[row]),
                (4, 3),
                textcoords="offset points",
                fontsize=7,
                color=SOFT,
                path_effects=halo,
            )
        axes.set_xlabel("expected joint count, if the words were independent (pairs of tokens, logarithmic)")
        axes.set_ylabel(f"{title}" + (f" ({unit})" if unit != "none" else ""))
        axes.set_title(
            "Strength against chance" if floors else "Strength against expected count", loc="left", fontsize=10
        )
        axes.legend(frameon=False, fontsize=8, loc="best")


def _limits(often: FloatArray) -> tuple[float, float]:
    if not len(often):
        return 0.1, 10.0
    return float(often.min()) / 1.6, float(often.max()) * 2.2


def _steps(floor: Floors, measure: str, low: float, high: float) -> tuple[FloatArray, FloatArray]:
    """Where the floor's bands begin within the picture, and its value in each."""
    edges = np.array([edge for edge in floor.edges if low < edge < high], np.float64)
    edges = np.concatenate([[low], edges, [high]])
    values = floor.at(measure, edges)
    return edges, np.where(np.isfinite(values), values, np.nan)


def _spaced(across: FloatArray, values: FloatArray, known: np.ndarray) -> list[int]:
    """Rows to label, in the order of the answer, none upon another."""
    wide, high = max(float(np.ptp(across[known])), 1e-9) if known.any() else 1.0, 1.0
    if known.any():
        high = max(float(np.ptp(values[known])), 1e-9)
    taken: list[int] = []
    for row in np.flatnonzero(known).tolist():
        apart = all(
            abs(across[row] - across[other]) / wide > 0.27 or abs(values[row] - values[other]) / high > 0.055
            for other in taken
        )
        if apart:
            taken.append(row)
        if len(taken) == LABELLED:
            break
    return taken
