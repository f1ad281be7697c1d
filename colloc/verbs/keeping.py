"""Verbs that look after a store: tally, check, info and the lists of what it keeps."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from colloc.errors import NotSeenError, UsageError
from colloc.settings import DEFAULT_MEMORY, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, pair_options, reading, store_path

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.answers.methods.paragraph import Methods
    from colloc.store.checking import Finding
    from colloc.store.opening import Store


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

    options = pair_options(layer, window, left, right, unit, inside, margins, False, True, where, relation)
    with open_for_writing(store_path(store), "tally") as opened:
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

    with reading(store) as opened:
        return kept_tallies(opened)


def check(store: StorePath | Store) -> list[Finding]:
    """Verify pages, sums and sizes; an empty list means that all is well."""
    from colloc.store import checking

    with reading(store) as opened:
        return checking.check(opened)


def info(store: StorePath | Store) -> dict[str, Any]:
    """What is inside a store: sizes, settings, sources, layers and tables."""
    from colloc.answers.info import describe

    with reading(store) as opened:
        return describe(opened)


def methods(
    store: StorePath | Store, *, measures: Sequence[str] | None = None, result: Mapping[str, Any] | None = None
) -> Methods:
    """What was done, as a paragraph and as BibTeX, exact enough to repeat it.

    Parameters
    ----------
    measures : sequence of str
        Names of the catalogue; those shown by default when not given.
    result : mapping
        The settings that were written beside a result (``--settings-beside``): its thresholds, slices and seeds.
    """
    from colloc.answers.methods.paragraph import methods as describe_methods
    from colloc.answers.questions import DEFAULT_SHOWN

    with reading(store) as opened:
        return describe_methods(opened, measures=measures or DEFAULT_SHOWN, result=result)


def documents(store: StorePath | Store) -> Iterator[Columns]:
    """The documents of a store with their metadata, some thousands at a time."""
    from colloc.answers.listing import document_rows

    with reading(store) as opened:
        yield from document_rows(opened)


def documents_by(store: StorePath | Store, key: str) -> Columns:
    """Documents, tokens and types for each value of a metadata key."""
    from colloc.answers.info import by_key

    with reading(store) as opened:
        return by_key(opened, key)
