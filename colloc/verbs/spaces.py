"""Verbs for engineers: words as rows of numbers."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Literal

from colloc.settings import DEFAULT_MEMORY, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.spaces.choosing import Choice
    from colloc.answers.spaces.matrix import Matrix
    from colloc.store.opening import Store


def matrix(
    store: StorePath | Store,
    output: StorePath | None = None,
    *,
    value: Literal["ppmi", "npmi", "g2", "count"] = "ppmi",
    shift: float = 1.0,
    smoothing: float = 1.0,
    weighting: Literal["flat", "harmonic", "linear"] = "flat",
    rows: Sequence[str] | None = None,
    contexts: Sequence[str] | None = None,
    min_row_count: int = 1,
    min_context_count: int = 1,
    most_rows: int | None = None,
    most_contexts: int | None = None,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    spanned: bool = True,
    where: Sequence[str] | str = (),
    relation: str | None = None,
    min_count: float = 1,
    min_value: float | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Matrix:
    """The sparse matrix of a table: words as rows, their company as columns.

    Parameters
    ----------
    output : path, optional
        Also written there: ``.npz`` (scipy), ``.mtx`` (Matrix Market) or ``.arrow``; without an ending the first
        two. Labels and settings stand beside it as JSON.
    value : {"ppmi", "npmi", "g2", "count"}
    shift, smoothing : float
        log2 shift is taken off PMI before the cut at 0; the totals of the contexts are raised to a power
        (Levy, Goldberg & Dagan 2015, section 3.2). For ``ppmi`` only.
    weighting : {"flat", "harmonic", "linear"}
        What a pair at distance d of a window of reach w counts: 1, 1/d, or (w + 1 - d)/w.
    rows, contexts : sequence of str, optional
        Words in the order wanted; by frequency with the ``min_`` and ``most_`` options otherwise. The margins are
        always those of all text.
    min_count, min_value : float
        Cells below are left out.
    """
    from colloc.answers.spaces.matrix import MatrixOptions
    from colloc.answers.spaces.matrix import matrix as make_matrix
    from colloc.exports.matrices import write_matrix

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, relation)
    chosen = MatrixOptions(
        value=value,
        shift=shift,
        smoothing=smoothing,
        weighting=weighting,
        rows=_choice(rows, min_row_count, most_rows),
        contexts=_choice(contexts, min_context_count, most_contexts),
        min_count=min_count,
        min_value=min_value,
    )
    with reading(store) as opened:
        made = make_matrix(opened, options=options, chosen=chosen, jobs=jobs, memory=memory, progress=progress)
    if output is not None:
        write_matrix(made, Path(output))
    return made


def _choice(words: Sequence[str] | None, min_count: int, most: int | None) -> Choice:
    from colloc.answers.spaces.choosing import Choice

    return Choice(words=None if words is None else tuple(words), min_count=min_count, most=most)
