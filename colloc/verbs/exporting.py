"""The verb that hands accepted entries on."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

from colloc.settings import DEFAULT_MEMORY, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, as_list, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.judging.entries import Entries
    from colloc.store.opening import Store

BASE_IRI = "urn:colloc:"


def entries(
    store: StorePath | Store,
    *,
    by: str | None = None,
    show: Sequence[str] | None = None,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    inside: Inside | None = None,
    margins: Margins | None = None,
    where: Sequence[str] | str = (),
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Entries:
    """Everything that was accepted, with its numbers, examples and sources.

    Parameters
    ----------
    by : str
        What this judge accepted; when not given what somebody accepted and nobody rejected.
    show : sequence of str
        Measures of pairs.
    """
    from colloc.answers.judging.entries import accepted_entries

    options = pair_options(layer, window, left, right, False, inside, margins, False, True, where, None)
    with reading(store) as opened:
        return accepted_entries(
            opened, judge=by, measures=show, options=options, jobs=jobs, memory=memory, progress=progress
        )


def export(
    store: StorePath | Store,
    path: StorePath,
    format: str,
    *,
    language: str = "und",
    title: str = "Accepted word combinations",
    base_iri: str = BASE_IRI,
    by: str | None = None,
    show: Sequence[str] | None = None,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    inside: Inside | None = None,
    margins: Margins | None = None,
    where: Sequence[str] | str = (),
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Entries:
    """Write what was accepted to a file (``csv``: a folder) in an open format, and return it.

    Parameters
    ----------
    format : str
        A name of ``colloc.exports.entries.formats.FORMATS``.
    language : str
        BCP 47 tag of the words.
    base_iri : str
        Where the names of an RDF file begin.

    Raises
    ------
    DataError
        For text that the format cannot hold.
    """
    from colloc.exports.entries.formats import Wishes, find_format, write_entries

    find_format(format)
    made = entries(
        store,
        by=by,
        show=show,
        layer=layer,
        window=window,
        left=left,
        right=right,
        inside=inside,
        margins=margins,
        where=as_list(where),
        jobs=jobs,
        memory=memory,
        progress=progress,
    )
    created = datetime.now(UTC).isoformat(timespec="seconds")
    write_entries(made, format, Path(path), Wishes(language, title, created, base_iri))
    return made
