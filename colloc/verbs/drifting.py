"""Verbs about change over time."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from colloc.errors import UsageError
from colloc.settings import DEFAULT_MEMORY, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, as_list, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.store.opening import Store

DEFAULT_LIMIT = 50
DEFAULT_LEAST = 20
"""Least count of what is ranked: rarer things show no trend."""


def drift(
    store: StorePath | Store,
    first: str | None = None,
    second: str | None = None,
    *,
    by: str,
    everything: bool = False,
    words: bool = False,
    bins: int | None = None,
    edges: Sequence[float] = (),
    width: float | None = None,
    where: Sequence[str] | str = (),
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    relation: str | None = None,
    min_count: int = DEFAULT_LEAST,
    min_docs: int = 1,
    sort: Literal["documents", "slope", "association"] = "documents",
    limit: int = DEFAULT_LIMIT,
    plot: str | Path | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """A word, or a pair and its association, over the periods of a numeric metadata key; or what changed most.

    Parameters
    ----------
    everything : bool
        Rank the pairs, or with ``words`` the words, by their trend, instead of following one.
    bins, edges, width
        So many periods of about equally many tokens; or where new periods begin; or periods of this length. When
        none is given, at most ten with at least five documents each.
    sort : {"documents", "slope", "association"}
        With ``everything``: by the trend of the rate over documents; by its slope; or (pairs) by the trend of the
        log odds ratio.
    plot : path
        Also draw the course into this .svg or .png file.

    Raises
    ------
    UsageError
        Neither a word nor ``everything`` is given, or both, or there are fewer than three periods.
    """
    if (first is None) != everything:
        raise UsageError("drift follows one word or pair, or ranks them all: give X [Y], or --all")
    if words and not everything:
        raise UsageError("--words ranks all words: it goes with --all")
    if plot is not None and everything:
        raise UsageError("only the course of one word or pair is drawn: leave out --plot or --all")
    options = pair_options(layer, window, left, right, unit, inside, margins, directed, True, where, relation)
    periods: dict[str, Any] = {"by": by, "bins": bins, "edges": edges, "width": width}
    counting: dict[str, Any] = {"options": options, "jobs": jobs, "memory": memory, "progress": progress}
    ranking: dict[str, Any] = {"min_count": min_count, "min_docs": min_docs, "sort": sort, "limit": limit}
    with reading(store) as opened:
        if first is not None:
            from colloc.answers.drifts.course import drift as follow

            answer = follow(opened, first, second, **periods, **counting)
            if plot is not None:
                from colloc.exports.pictures.course import draw_course

                draw_course(answer, Path(plot))
            return answer
        from colloc.answers.drifts.changed import drift_pairs, drift_words

        if words:
            return drift_words(opened, **periods, where=as_list(where), layer=layer, memory=memory, **ranking)
        return drift_pairs(opened, **periods, **counting, **ranking)
