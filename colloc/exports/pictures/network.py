"""The strongest company of a word as a network: the word in the middle, its partners around it."""

from __future__ import annotations

import math
from collections.abc import Mapping
from pathlib import Path

import numpy as np

from colloc.answers.columns import Columns
from colloc.exports.pictures.canvas import INK, drawing, shorten
from colloc.measures.catalogue import find

MOST = 18
Link = tuple[int, int]


def draw_network(answer: Columns, measure: str, links: Mapping[Link, float], path: Path) -> None:
    """Rows of ``around`` for one word.

    Parameters
    ----------
    links : mapping of (row, row) to float
        The measure between two partners, where they attract each other.

    Line width shows the measure from the weakest partner to the strongest, and the number at each gives it.
    Partners that attract each other stand side by side where that is possible, joined by dashed lines.
    """
    rows = answer[:MOST]
    values = rows[measure].astype(np.float64)
    links = {pair: value for pair, value in links.items() if max(pair) < len(rows)}
    order = circle(len(rows), links)
    places = {row: 2 * math.pi * (0.25 - turn / max(len(order), 1)) for turn, row in enumerate(order)}
    known = values[np.isfinite(values)]
    weakest, strongest = (float(known.min()), float(known.max())) if len(known) else (0.0, 0.0)

    def thickness(value: float) -> float:
        share = (value - weakest) / (strongest - weakest) if strongest > weakest else 1.0
        return 0.8 + 4.4 * min(max(share, 0.0), 1.0)

    unit = find(measure).unit
    with drawing(path, wide=7.2, high=6.6) as (_, (axes,)):
        axes.set_axis_off()
        axes.set_aspect("equal")
        for (one, other), value in sorted(links.items()):
            axes.plot(
                [math.cos(places[one]), math.cos(places[other])],
                [math.sin(places[one]), math.sin(places[other])],
                color="#8a9199",
                linestyle=(0, (3, 2)),
                linewidth=0.6 * thickness(value),
                zorder=1,
            )
        for row, angle in places.items():
            value = float(values[row]) if np.isfinite(values[row]) else 0.0
            across, up = math.cos(angle), math.sin(angle)
            axes.plot(
                [0, across],
                [0, up],
                color=INK,
                linewidth=thickness(value),
                zorder=2,
                solid_capstyle="round",
            )
            axes.text(
                across * 1.05,
                up * 1.05,
                f"{shorten(rows['second'][row], 18)}\n{value:.3g}, {rows['joint'][row]:,}×",
                ha="left" if across > 0.15 else "right" if across < -0.15 else "center",
                va="bottom" if up > 0.8 else "top" if up < -0.8 else "center",
                fontsize=8,
                zorder=4,
            )
            axes.plot([across], [up], marker="o", markersize=5, color=INK, zorder=3)
        first = rows["first"][0] if len(rows) else ""
        axes.text(
            0,
            0,
            shorten(first, 20),
            ha="center",
            va="center",
            fontsize=12,
            fontweight="bold",
            zorder=5,
            bbox={"boxstyle": "round,pad=0.35", "facecolor": "white", "edgecolor": INK},
        )
        named = find(measure).title + (f", {unit}" if unit != "none" else "")
        axes.set_title(
            f"Strongest company of ‘{shorten(first)}’\n"
            f"numbers: {named}; joint count.{' Dashed: partners that attract each other.' if links else ''}",
            loc="left",
            fontsize=9,
        )
        axes.set_xlim(-1.42, 1.42)
        axes.set_ylim(-1.18, 1.18)


def circle(n: int, links: Mapping[Link, float]) -> list[int]:
    """An order of n partners on a circle: each next to the one it is most strongly linked with, where that is free."""
    left = list(range(n))
    order: list[int] = []
    while left:
        last = order[-1] if order else None

        def pull(row: int, last: int | None = last) -> tuple[float, int]:
            value = 0.0 if last is None else links.get((min(row, last), max(row, last)), 0.0)
            return -value, row

        following = min(left, key=pull)
        left.remove(following)
        order.append(following)
    return order
