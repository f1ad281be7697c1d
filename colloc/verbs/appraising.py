"""The verb that says which measure finds what was accepted, or what stands in a list."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from colloc.errors import UsageError
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, as_list, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.appraisal.labelled import Labelled
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
        what they ranked.
    folds, weights : Columns or None
        Of the learnt ranking.
    ranking : Columns or None
        The strongest of the store by the learnt ranking: first and second with joint, or expression with count, and
        combined (log odds) and wanted.
    """

    measures: Columns
    folds: Columns | None = None
    weights: Columns | None = None
    ranking: Columns | None = None


def appraise(
    store: StorePath | Store,
    *,
    items: Literal["pairs", "expressions"] = "pairs",
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
    min_words: int | None = None,
    max_words: int | None = None,
    min_docs: int | None = None,
    names: Literal["drop", "keep"] | None = None,
    common: Literal["drop", "keep"] | None = None,
    fragments: Literal["fold", "keep"] | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Appraisal:
    """Hold every measure against the decisions, or against a list.

    Parameters
    ----------
    items : {"pairs", "expressions"}
        Pairs, ranked by the measures of association, or expressions, by those of `expressions`.
    gold : sequence of sequences of words
        Every pair that meets at least ``min_count`` times, or everything that `expressions` lists, is a candidate;
        those of the list are wanted. Without it the candidates are what was decided, and the accepted are wanted.
    by : str
        Decisions of this judge only.
    show : sequence of str
        Measures; all when not given.
    combined : bool
        Also learn a ranking from all measures.
    limit : int
        With ``combined``: so many pairs or expressions of the store, ranked by what was learnt.
    plot : path
        Draw precision against recall to this SVG or PNG file.
    min_words, max_words, min_docs, names, common, fragments
        Of expressions: what is a candidate, as for `expressions`. The others (window to directed) are for pairs.

    Raises
    ------
    UsageError
        Where nothing was accepted, or nothing rejected, or too little to learn from; for an option of the other items.
    """
    from colloc.answers.appraisal import appraising

    resources: dict[str, Any] = {"jobs": jobs, "memory": memory, "progress": progress}
    chosen: dict[str, Any] = {
        name: value
        for name, value in (
            ("min_words", min_words),
            ("max_words", max_words),
            ("min_docs", min_docs),
            ("names", names),
            ("common", common),
            ("fragments", fragments),
        )
        if value is not None
    }
    _check_items(
        items, {"window": window, "left": left, "right": right, "margins": margins, "directed": directed}, chosen
    )
    with reading(store) as opened:
        found: Labelled
        if items == "expressions":
            from colloc.answers.appraisal import of_expressions
            from colloc.answers.expressions.settings import ExpressionOptions

            wanted = ExpressionOptions(layer=layer, where=as_list(where), inside=inside, min_count=min_count, **chosen)
            if gold is not None:
                found = of_expressions.from_list(opened, gold, wanted, **resources)
            else:
                found = of_expressions.from_decisions(opened, wanted, by, **resources)
        else:
            from colloc.answers.appraisal import of_pairs

            options = pair_options(layer, window, left, right, False, inside, margins, directed, True, where, None)
            if gold is not None:
                found = of_pairs.from_list(opened, gold, options, min_count, **resources)
            else:
                found = of_pairs.from_decisions(opened, options, by, **resources)
        scores = found.scores(found.measures(show))
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


def _check_items(items: str, of_pairs: dict[str, Any], of_expressions: dict[str, Any]) -> None:
    if items not in ("pairs", "expressions"):
        raise UsageError(f"items are pairs or expressions, not {items!r}")
    others = of_expressions if items == "pairs" else {name: value for name, value in of_pairs.items() if value}
    if others:
        raise UsageError(f"{', '.join(others)} is nothing that {items} have: leave it out, or choose the other items")
