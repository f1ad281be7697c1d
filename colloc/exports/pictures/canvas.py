"""What all pictures share: size, letters, greys and patterns, and saving."""

from __future__ import annotations

import contextlib
from collections.abc import Iterator
from io import BytesIO
from pathlib import Path
from typing import TYPE_CHECKING, Any, cast

from colloc.errors import MissingExtraError, UsageError
from colloc.exports.replacing import replacing

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

INK, SOFT = "#1b1b1b", "#4a4a4a"
FILL = "#4f5d6b"
FORMATS = ("svg", "png")
DPI = 150


def picture_format(path: Path) -> str:
    """``svg`` or ``png``, by the end of the file's name.

    Raises
    ------
    UsageError
        For any other end.
    """
    found = path.suffix.lower().removeprefix(".")
    if found not in FORMATS:
        raise UsageError(f"{path}: a picture is written to a file that ends in .svg or .png")
    return found


@contextlib.contextmanager
def drawing(path: Path, *, wide: float, high: float, panels: int = 1) -> Iterator[tuple[Figure, list[Axes]]]:
    """A figure with panels under each other, saved to ``path`` (whole or not there) at the end of the block.

    Parameters
    ----------
    wide, high : float
        Inches.

    Raises
    ------
    MissingExtraError
        Where matplotlib is not installed.
    """
    kind = picture_format(path)
    try:
        import matplotlib as mpl
        from matplotlib.figure import Figure as NewFigure
    except ImportError as error:
        raise MissingExtraError("pictures need matplotlib: pip install 'colloc[plots]'") from error
    style: dict[str, Any] = {
        "font.family": ["DejaVu Sans", "sans-serif"],
        "font.size": 9.0,
        "axes.edgecolor": SOFT,
        "axes.labelcolor": INK,
        "axes.spines.right": False,
        "axes.spines.top": False,
        "text.color": INK,
        "text.parse_math": False,
        "xtick.color": SOFT,
        "ytick.color": SOFT,
        "hatch.linewidth": 0.6,
        # Text stays text, so that it can be read out and searched; names inside the file do not change by chance.
        "svg.fonttype": "none",
        "svg.hashsalt": "colloc",
    }
    with mpl.rc_context(cast(Any, style)):
        figure = NewFigure(figsize=(wide, high), layout="constrained")
        yield figure, [figure.add_subplot(panels, 1, row + 1) for row in range(panels)]
        data = BytesIO()
        # A date would make two equal pictures differ.
        figure.savefig(data, format=kind, dpi=DPI, metadata={"Date": None} if kind == "svg" else {"Software": None})
    with replacing(path) as stream:
        stream.write(data.getvalue())


def shorten(text: str, length: int = 24) -> str:
    """A label that does not grow over its neighbours; controls and line ends become spaces."""
    shown = " ".join("".join(character if character.isprintable() else " " for character in text).split())
    return shown if len(shown) <= length else shown[: length - 1] + "…"
