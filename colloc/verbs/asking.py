"""Verbs that ask: words, pairs, around, and measures for tables from elsewhere."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, as_list, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.exports.matrix import Matrix
    from colloc.store.opening import Store

DEFAULT_LIMIT = 50


def words(
    store: StorePath | Store,
    *,
    layer: str | None = None,
    where: Sequence[str] | str = (),
    pattern: str | None = None,
    min_count: int = 1,
    min_docs: int = 1,
    sort: Literal["count", "documents", "word", "dp_norm"] = "count",
    limit: int = DEFAULT_LIMIT,
) -> Columns:
    """Words with count, rate per million, documents and dispersion; ``limit=0`` gives all."""
    from colloc.answers.words import words as ask_words

    with reading(store) as opened:
        return ask_words(
            opened,
            layer=layer,
            where=as_list(where),
            pattern=pattern,
            min_count=min_count,
            min_docs=min_docs,
            sort=sort,
            limit=limit,
        )


def pairs(
    store: StorePath | Store,
    *,
    measure: str | None = None,
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
    min_count: int = DEFAULT_MIN_COUNT,
    min_word_count: int = 1,
    min_docs: int = 1,
    avoid: bool = False,
    limit: int = DEFAULT_LIMIT,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """The pairs that rank highest by one measure (NPMI when not given); ``limit=0`` gives all.

    Only attraction is shown, unless ``avoid`` lets other pairs in. Thresholds act on
    what is shown, never on the margins.
    """
    from colloc.answers.pairs import pairs as ask_pairs

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, relation)
    with reading(store) as opened:
        return ask_pairs(
            opened,
            measure=measure,
            show=show,
            options=options,
            min_count=min_count,
            min_word_count=min_word_count,
            min_docs=min_docs,
            repulsion=avoid,
            limit=limit,
            jobs=jobs,
            memory=memory,
            progress=progress,
        )


def around(
    store: StorePath | Store,
    words: Sequence[str] | str,
    *,
    side: Literal["both", "left", "right"] = "both",
    measure: str | None = None,
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
    min_count: int = DEFAULT_MIN_COUNT,
    min_word_count: int = 1,
    min_docs: int = 1,
    avoid: bool = False,
    limit: int = DEFAULT_LIMIT,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """The company of each word, strongest first, ``limit`` rows a word; the word asked for is ``first``.

    Raises
    ------
    NotSeenError
        When none of the words is in the store.
    """
    from colloc.answers.around import around as ask_around

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, relation)
    with reading(store) as opened:
        return ask_around(
            opened,
            as_list(words),
            side=side,
            measure=measure,
            show=show,
            options=options,
            min_count=min_count,
            min_word_count=min_word_count,
            min_docs=min_docs,
            repulsion=avoid,
            limit=limit,
            jobs=jobs,
            memory=memory,
            progress=progress,
        )


def measure(table: Mapping[str, Any] | Columns, *, measures: Sequence[str] | None = None) -> Columns:
    """Measures for counts from anywhere.

    Parameters
    ----------
    table : mapping of str to array-like
        With the columns joint, first_total, second_total and total; others pass through.
    measures : sequence of str
        Names of the catalogue; all when not given.

    Raises
    ------
    DataError
        For a missing column, or counts that no table can have.
    """
    from colloc.answers.measuring import measured

    return measured(table, measures)


def matrix(
    store: StorePath | Store,
    stem: StorePath,
    *,
    shift: float = 1.0,
    smoothing: float = 1.0,
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
    min_count: int = 1,
    min_word_count: int = 1,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Matrix:
    """Write the sparse positive PMI of every pair to ``stem``.npz and .mtx, with labels and settings beside them.

    ``shift`` k takes log2 k off before the cut at 0; ``smoothing`` raises the totals of the
    columns to a power (Levy, Goldberg & Dagan 2015). The matrix is also returned.
    """
    from colloc.exports.matrix import ppmi_matrix, write_matrix

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, relation)
    with reading(store) as opened:
        made = ppmi_matrix(
            opened,
            options=options,
            shift=shift,
            smoothing=smoothing,
            min_count=min_count,
            min_word_count=min_word_count,
            jobs=jobs,
            memory=memory,
            progress=progress,
        )
    write_matrix(made, Path(stem))
    return made
