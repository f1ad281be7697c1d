"""The public verbs: what ``import colloc`` gives and what each command calls.

Every verb that asks takes the path of a store or a store opened with
:func:`open_store`; where a path is given it is opened for the call. Options about
pairs mean the same everywhere; ``None`` means as the store was built:

layer
    ``form``, ``fold`` and what annotated text adds.
window, or left and right
    Words of reach on both sides, or unequal reach.
unit
    Count the units (``inside``) that hold both words, not windows.
inside
    ``sentence``, ``paragraph`` or ``document``: what no window reaches beyond.
margins
    What one observation is: ``pairs``, ``positions`` or ``tokens``.
directed
    (x, y) only where y follows x.
spanned
    With margins ``tokens``: divide by the number of pairs (True) or of tokens.
where
    Slices such as ``genre=log`` or ``year=1990..1999``, joined by "and".
relation
    Syntactic pairs in this relation; an empty name takes all.
"""

from __future__ import annotations

import contextlib
import os
from collections.abc import Callable, Iterator, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from colloc.errors import NotSeenError, UsageError
from colloc.settings import (
    DEFAULT_MEMORY,
    DEFAULT_MIN_COUNT,
    Inside,
    Margins,
    ReadSettings,
    SegmentSettings,
    TallySpec,
)

if TYPE_CHECKING:
    from numpy.typing import ArrayLike

    from colloc.answers.columns import Columns
    from colloc.answers.questions import PairOptions
    from colloc.build.building import BuildReport
    from colloc.store.checking import Finding
    from colloc.store.opening import Store

StorePath = str | os.PathLike[str]
ProgressCall = Callable[[float, int, str], None]
"""Called with the share done (0..1), tokens so far, and the phase."""

DEFAULT_LIMIT = 50


def open_store(path: StorePath) -> Store:
    """Open a store to ask it more than one question; a context manager.

    Raises
    ------
    NoInputError
        There is no such file.
    DataError
        Not a store, damaged, or made by a newer colloc.
    """
    from colloc.store.opening import open_for_reading

    return open_for_reading(path)


@contextlib.contextmanager
def _reading(store: StorePath | Store) -> Iterator[Store]:
    if isinstance(store, str | os.PathLike):
        with open_store(store) as opened:
            yield opened
    else:
        yield store


def _path(store: StorePath | Store) -> Path:
    return Path(store) if isinstance(store, str | os.PathLike) else store.path


def _names(values: Sequence[str] | str) -> list[str]:
    return [values] if isinstance(values, str) else list(values)


def _pair_options(
    layer: str | None,
    window: int | None,
    left: int | None,
    right: int | None,
    unit: bool,
    inside: Inside | None,
    margins: Margins | None,
    directed: bool,
    spanned: bool,
    where: Sequence[str] | str,
    relation: str | None,
) -> PairOptions:
    from colloc.answers.questions import PairOptions

    return PairOptions(
        layer=layer,
        window=window,
        left=left,
        right=right,
        unit=unit,
        inside=inside,
        margins=margins,
        directed=directed,
        spanned=spanned,
        where=_names(where),
        relation=relation,
    )


def build(
    store: StorePath | Store,
    inputs: Sequence[str] | str,
    *,
    read: ReadSettings | None = None,
    segment: SegmentSettings | None = None,
    tally: TallySpec | None = None,
    margins: Margins = "pairs",
    keep_text: bool = True,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: ProgressCall | None = None,
) -> BuildReport:
    """Read, segment, keep and count files, folders or globs into a new store.

    A build that was stopped goes on with the same call; on a complete store it does nothing.

    Raises
    ------
    NoInputError, DataError
        Input that is missing, holds no text, or is not what it claims to be.
    CannotCreateError
        The path holds something else, or cannot be written.
    """
    from colloc.build import building

    return building.build(
        _path(store),
        _names(inputs),
        read=read,
        segment=segment,
        tally=tally,
        margins=margins,
        keep_text=keep_text,
        jobs=jobs,
        memory=memory,
        temp=temp,
        progress=progress,
    )


def add(
    store: StorePath | Store,
    inputs: Sequence[str] | str,
    *,
    read: ReadSettings | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: ProgressCall | None = None,
) -> BuildReport:
    """Read more documents into a store and count only them."""
    from colloc.build import changing

    return changing.add(_path(store), _names(inputs), read=read, jobs=jobs, memory=memory, temp=temp, progress=progress)


def remove(
    store: StorePath | Store,
    *,
    identifiers: Sequence[str] | str = (),
    where: Sequence[str] | str = (),
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: ProgressCall | None = None,
) -> BuildReport:
    """Take documents out of a store, chosen by identifier or by metadata, and count them out of its tables."""
    from colloc.build import changing

    return changing.remove(
        _path(store),
        identifiers=_names(identifiers),
        where=_names(where),
        jobs=jobs,
        memory=memory,
        temp=temp,
        progress=progress,
    )


def merge(
    store: StorePath | Store,
    others: Sequence[StorePath],
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | None = None,
    progress: ProgressCall | None = None,
) -> BuildReport:
    """Join the documents and counts of other stores into this one; the others stay as they are."""
    from colloc.build import merging

    return merging.merge(
        _path(store), [Path(other) for other in others], jobs=jobs, memory=memory, temp=temp, progress=progress
    )


def tally(
    store: StorePath | Store,
    *,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    where: Sequence[str] | str = (),
    relation: str | None = None,
    drop: bool = False,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> dict[str, Any]:
    """Count another table and keep it in the store, so that questions about it are answered at once.

    With ``drop`` the table is dropped instead.

    Returns
    -------
    dict
        The table's settings, ``pairs`` (distinct pairs) and ``total``.

    Raises
    ------
    NotSeenError
        When the table to drop is not kept.
    UsageError
        When it is the one the store was built with.
    """
    import dataclasses

    from colloc.answers.questions import built_spec, resolve_spec
    from colloc.counts.tallying import obtain_tally
    from colloc.store import tallies as kept
    from colloc.store.opening import open_for_writing

    options = _pair_options(layer, window, left, right, unit, inside, margins, False, True, where, relation)
    with open_for_writing(_path(store), "tally") as opened:
        spec, _ = resolve_spec(opened, options)
        if drop and spec == built_spec(opened):
            raise UsageError(f"{opened.path}: this is the table the store was built with; it cannot be dropped")
        found = (
            kept.find(opened, spec)
            if drop
            else obtain_tally(opened, spec, jobs=jobs, memory=memory, keep=True, progress=progress)
        )
        if found is None:
            raise NotSeenError(f"{opened.path}: no such table is kept; `colloc tally STORE --list` lists them")
        record = {**dataclasses.asdict(spec), "pairs": found.n_pairs, "total": found.total}
        if drop:
            kept.drop(opened, spec)
        return record


def tallies(store: StorePath | Store) -> Columns:
    """The tables a store keeps, with their settings and sizes."""
    from colloc.answers.listing import kept_tallies

    with _reading(store) as opened:
        return kept_tallies(opened)


def documents(store: StorePath | Store) -> Iterator[Columns]:
    """The documents of a store with their metadata, some thousands at a time."""
    from colloc.answers.listing import document_rows

    with _reading(store) as opened:
        yield from document_rows(opened)


def check(store: StorePath | Store) -> list[Finding]:
    """Verify pages, sums and sizes; an empty list means that all is well."""
    from colloc.store import checking

    with _reading(store) as opened:
        return checking.check(opened)


def info(store: StorePath | Store) -> dict[str, Any]:
    """What is inside a store: sizes, settings, sources, layers and tables."""
    from colloc.answers.info import describe

    with _reading(store) as opened:
        return describe(opened)


def documents_by(store: StorePath | Store, key: str) -> Columns:
    """Documents, tokens and types for each value of a metadata key."""
    from colloc.answers.info import by_key

    with _reading(store) as opened:
        return by_key(opened, key)


def reading_settings(store: StorePath | Store) -> ReadSettings:
    """How the input of a store was read when it was built."""
    from colloc.store import facts

    with _reading(store) as opened:
        return ReadSettings.from_json(facts.get(opened, "read_settings"))


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

    with _reading(store) as opened:
        return ask_words(
            opened,
            layer=layer,
            where=_names(where),
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

    options = _pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, relation)
    with _reading(store) as opened:
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

    options = _pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, relation)
    with _reading(store) as opened:
        return ask_around(
            opened,
            _names(words),
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


def measure(table: Mapping[str, ArrayLike] | Columns, *, measures: Sequence[str] | None = None) -> Columns:
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
