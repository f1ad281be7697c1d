"""Pictures of one pair: where the second word stands, and how the pair is spread over the documents."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from colloc.answers.evidence.card import Evidence
from colloc.exports.pictures.canvas import FILL, INK, SOFT, drawing, shorten

if TYPE_CHECKING:
    from matplotlib.axes import Axes

MOST_DOCUMENTS = 60


def draw_evidence(card: Evidence, path: Path) -> None:
    """Both pictures under each other."""
    with drawing(path, wide=7.2, high=6.4, panels=2) as (_, (upper, lower)):
        _positions(card, upper)
        _spread(card, lower)


def draw_positions(card: Evidence, path: Path) -> None:
    """How often the second word stands at each distance from the first."""
    with drawing(path, wide=7.2, high=3.2) as (_, (axes,)):
        _positions(card, axes)


def draw_spread(card: Evidence, path: Path) -> None:
    """How the pair is spread over the documents."""
    with drawing(path, wide=7.2, high=3.4) as (_, (axes,)):
        _spread(card, axes)


def _positions(card: Evidence, axes: Axes) -> None:
    offsets, counts = card.positions["offset"], card.positions["count"]
    axes.bar(offsets, counts, width=0.78, color=FILL, edgecolor=INK, linewidth=0.6)
    axes.axvline(0, color=SOFT, linewidth=0.8, linestyle=(0, (1, 2)))
    if len(offsets) <= 20:
        axes.set_xticks([*offsets.tolist(), 0])
        for offset, count in zip(offsets.tolist(), counts.tolist(), strict=True):
            axes.annotate(f"{count:,}", (offset, count), (0, 2), textcoords="offset points", ha="center", fontsize=8)
    axes.set_xlim(float(offsets.min()) - 0.7, float(offsets.max()) + 0.7)
    axes.set_ylim(0, max(int(counts.max()), 1) * 1.14)
    axes.set_xlabel(f"distance from ‘{shorten(card.first)}’ (words; minus: before it)")
    axes.set_ylabel("pairs of tokens")
    axes.set_title(f"Where ‘{shorten(card.second)}’ stands around ‘{shorten(card.first)}’", loc="left", fontsize=10)


def _spread(card: Evidence, axes: Axes) -> None:
    rows = card.by_document[:MOST_DOCUMENTS]
    joint, tokens = rows["joint"], rows["tokens"].astype(np.float64)
    places = np.arange(1, len(rows) + 1)
    axes.bar(places, joint, width=0.8, color=FILL, edgecolor=INK, linewidth=0.4, label="counted")
    sizes = float(card.spread["tokens"])
    even = card.by_document["joint"].sum() * tokens / sizes if sizes else tokens * 0
    axes.plot(
        places,
        even,
        linestyle="none",
        marker="D",
        markersize=3.2,
        markerfacecolor="white",
        markeredgecolor=INK,
        label="if spread as all words are",
    )
    spread = card.spread
    shown = "" if len(card.by_document) <= MOST_DOCUMENTS else f", the {MOST_DOCUMENTS} with most shown"
    axes.set_xlabel(
        f"documents that hold the pair, most first ({spread['documents']:,} of {spread['of_documents']:,}{shown})"
    )
    axes.set_ylabel("pairs of tokens")
    axes.set_xlim(0.2, max(len(rows), 8) + 0.8)
    axes.set_ylim(0, max([*joint.tolist(), *even.tolist(), 1]) * 1.12)
    axes.locator_params(integer=True)
    axes.set_title(
        f"Spread of ‘{shorten(card.first)}’ + ‘{shorten(card.second)}’ over documents (DPnorm {spread['dp_norm']:.2f})",
        loc="left",
        fontsize=10,
    )
    axes.legend(frameon=False, fontsize=8)
