"""Verb for engineers: association of given pairs."""

from __future__ import annotations

import contextlib
from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from colloc.settings import DEFAULT_MEMORY, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.answers.scoring import Scorer
    from colloc.store.opening import Store


def score(
    store: StorePath | Store,
    pairs: Sequence[tuple[str, str]] | Mapping[str, Any] | Columns,
    *,
    show: Sequence[str] | None = None,
    **options: Any,
) -> Columns:
    """Counts and measures of given pairs, in their order; unknown words are named in the column ``unknown``.

    Parameters
    ----------
    pairs : sequence of (str, str), mapping or Columns
        A table needs the columns ``first`` and ``second``; its other columns pass through.
    show : sequence of str, optional
        Measures of the catalogue; all but Fisher's exact test when not given.
    options
        Those of :func:`scorer`, which also scores one lot after the other.
    """
    from colloc.answers.columns import Columns

    if isinstance(pairs, Columns):
        table: Mapping[str, Any] = pairs.data
    elif isinstance(pairs, Mapping):
        table = pairs
    else:
        table = {"first": [pair[0] for pair in pairs], "second": [pair[1] for pair in pairs]}
    with scorer(store, show=show, **options) as prepared:
        found = prepared.score(table)
        return Columns(found.data, prepared.settings)


@contextlib.contextmanager
def scorer(
    store: StorePath | Store,
    *,
    show: Sequence[str] | None = None,
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
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Iterator[Scorer]:
    """A context manager whose ``score(table)`` scores one lot of pairs after the other against the same counts."""
    from colloc.answers.questions import ask, resolve_spec
    from colloc.answers.scoring import Scorer, scoring_measures

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, relation)
    with reading(store) as opened:
        names = scoring_measures(show, resolve_spec(opened, options)[1])
        yield Scorer(ask(opened, options, names, jobs=jobs, memory=memory, progress=progress), names)
