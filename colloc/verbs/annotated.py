"""Verbs for annotated text: sequences of word classes, and documents written out again."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from colloc.verbs.opening import StorePath, as_list, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.store.opening import Store

DEFAULT_LIMIT = 50


def sequences(
    store: StorePath | Store,
    pattern: str,
    *,
    layer: str = "lemma",
    where: Sequence[str] | str = (),
    longest: bool = False,
    min_count: int = 1,
    limit: int = DEFAULT_LIMIT,
) -> Columns:
    """Adjacent words whose word classes follow a pattern such as ``NOUN (ADP NOUN)?``, the most frequent first.

    ``A|B`` is either of two word classes (or brackets), ``( )`` holds several together, ``?`` says that what stands
    before it may be missing, ``+`` and ``*`` that it may be repeated; ``ANY`` is a word of any class. Matches lie
    inside one sentence and have at most 32 words. ``limit=0`` gives all.

    Parameters
    ----------
    longest : bool
        Only the longest match at each word; otherwise all of them.

    Raises
    ------
    UsageError
        The pattern cannot be read, or the text is not annotated.
    """
    from colloc.answers.sequences import sequences as find
    from colloc.store.slices import canonical

    with reading(store) as opened:
        return find(
            opened,
            pattern,
            layer=layer,
            where=canonical(as_list(where)),
            longest=longest,
            min_count=min_count,
            limit=limit,
        )


def conllu(store: StorePath | Store, path: StorePath, *, where: Sequence[str] | str = ()) -> int:
    """Write annotated documents into a CoNLL-U file as they were read; how many they were.

    Raises
    ------
    NotSeenError
        No document is annotated.
    UsageError
        The store keeps no text, or the documents have different columns.
    CannotCreateError
        The file cannot be written.
    """
    from colloc.exports.conllu import write_conllu
    from colloc.store.slices import canonical

    with reading(store) as opened:
        return write_conllu(opened, Path(path), canonical(as_list(where)))
