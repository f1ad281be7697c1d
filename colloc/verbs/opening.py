"""What every verb does first: the store opened, lists made of single values, options about pairs gathered."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from colloc.settings import Inside, Margins

if TYPE_CHECKING:
    from colloc.answers.questions import PairOptions
    from colloc.store.opening import Store

StorePath = str | os.PathLike[str]
ProgressCall = Callable[[float, int, str], None]
"""Called with the share done (0..1), tokens so far, and the phase."""


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
def reading(store: StorePath | Store) -> Iterator[Store]:
    """The store itself, or the one at a path, opened for the time of the block."""
    if isinstance(store, str | os.PathLike):
        with open_store(store) as opened:
            yield opened
    else:
        yield store


def store_path(store: StorePath | Store) -> Path:
    """Where a store lies."""
    return Path(store) if isinstance(store, str | os.PathLike) else store.path


def as_list(values: Sequence[str] | str) -> list[str]:
    """One text as a list of one: a text is a sequence too, of its letters."""
    return [values] if isinstance(values, str) else list(values)


def pair_options(
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
    """The options of a verb in the form that the answers take."""
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
        where=as_list(where),
        relation=relation,
    )
