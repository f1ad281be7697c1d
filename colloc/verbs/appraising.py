"""The verb that says which measure finds what was accepted, or what stands in a list."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.store.opening import Store

COMBINED = "combined"


@dataclass(frozen=True, slots=True)
class Appraisal:
    """What `appraise` found.

    Attributes
    ----------
    measures : Columns
        A row for each measure, best first; the learnt ranking is the row ``combined``, by models that had not seen
        the pairs they ranked.
    folds, weights : Columns or None
        Of the learnt ranking.
    ranking : Columns or None
        The strongest pairs of the store by the learnt ranking: first, second, joint, combined (log odds), accepted.
    """

    measures: Columns
    folds: Columns | None = None
    weights: Columns | None = None
    ranking: Columns | None = None


def appraise(
    store: StorePath | Store,
    *,
    gold: Sequence[Sequence[str]] | None = None,
    by: str | None = None,
    show: Sequence[str] | None = None,
    at: Sequence[int] = (100,),
    min_count: int = DEFAULT_MIN_COUNT,
    combined: bool = False,
    limit: int = 0,
    plot: StorePath | None = None,
    repeats: int = 1000,
    seed: int = 0,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    where: Sequence[str] | str = (),
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Appraisal:
    """Hold every measure against the decisions, or against a list.

    Parameters
    ----------
    gold : sequence of pairs of words
        Every pair that meets at least ``min_count`` times is a candidate, those of the list are wanted. Without it the
        candidates are the pairs that were decided, and the accepted ones are wanted.
    by : str
        Decisions of this judge only.
    show : sequence of str
        Measures; all when not given.
    combined : bool
        Also learn a ranking from all measures.
    limit : int
        With ``combined``: so many pairs of the store, ranked by what was learnt.
    plot : path
        Draw precision against recall to this SVG or PNG file.

    Raises
    ------
    UsageError
        Where nothing was accepted, or nothing rejected, or too little to learn from.
    """
    from colloc.answers.appraisal import appraising, labelled

    options = pair_options(layer, window, left, right, False, inside, margins, directed, True, where, None)
    with reading(store) as opened:
        if gold is not None:
            found = labelled.from_list(opened, gold, options, min_count, jobs=jobs, memory=memory, progress=progress)
        else:
            found = labelled.from_decisions(opened, options, by, jobs=jobs, memory=memory, progress=progress)
        scores = found.scores(appraising.chosen_measures(found, show))
        folds = weights = ranking = None
        if combined:
            from colloc.answers.appraisal import combining

            made = combining.combine(found, scores, seed=seed)
            folds, weights = made.folds, made.weights
            ranking = combining.ranked(made, found, min_count, limit) if limit else None
            scores = {**scores, COMBINED: made.out_of_fold}
        table = appraising.appraised(found, scores, at=at, repeats=repeats, seed=seed)
    if plot is not None:
        from colloc.exports.pictures.appraisal import precision_recall_picture

        precision_recall_picture(Path(plot), found.wanted, scores, table["measure"].tolist())
    return Appraisal(table, folds, weights, ranking)
