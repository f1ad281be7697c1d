"""Verbs that compare: two sub-corpora, two words, a list from elsewhere, many slices."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Literal

from colloc.errors import UsageError
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, as_list, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.store.opening import Store

DEFAULT_LIMIT = 50


def contrast(
    store: StorePath | Store,
    first: str | None = None,
    second: str | None = None,
    *,
    this: Sequence[str] | str = (),
    that: Sequence[str] | str = (),
    pairs: bool = False,
    where: Sequence[str] | str = (),
    pattern: str | None = None,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    relation: str | None = None,
    min_count: int = DEFAULT_MIN_COUNT,
    min_word_count: int = 1,
    min_docs: int = 1,
    sort: Literal["documents", "bound", "log_ratio", "g2", "association"] = "documents",
    limit: int = DEFAULT_LIMIT,
    permutations: int = 0,
    seed: int = 1,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """Words, or with ``pairs`` pairs of words, that two slices use differently; or one pair on both sides.

    Parameters
    ----------
    first, second : str
        With both, the evidence for this pair side by side.
    this, that : str or sequences of str
        The slices; without ``that`` all other documents.
    sort : {"documents", "bound", "log_ratio", "g2", "association"}
        By the test over documents; by the end of the log ratio's interval nearer to 0; by the log ratio; by G2; or
        (pairs) by the difference of association instead of frequency.
    permutations : int
        Exchanges of document labels; p-values adjusted by max-T take the place of q-values.
    """
    options = pair_options(layer, window, left, right, unit, inside, margins, directed, True, where, relation)
    sides = {"this": as_list(this), "that": as_list(that)}
    if (first is None) != (second is None):
        raise UsageError("a contrast of one pair needs both words")
    with reading(store) as opened:
        if first is not None and second is not None:
            from colloc.answers.contrasts.card import contrast_pair

            return contrast_pair(
                opened, first, second, **sides, options=options, jobs=jobs, memory=memory, progress=progress
            )
        if pairs:
            from colloc.answers.contrasts.pairs import contrast_pairs

            if pattern is not None:
                raise UsageError("a pattern chooses words: leave it out with pairs")
            return contrast_pairs(
                opened,
                **sides,
                options=options,
                min_count=min_count,
                min_word_count=min_word_count,
                min_docs=min_docs,
                sort=sort,
                limit=limit,
                permutations=permutations,
                seed=seed,
                jobs=jobs,
                memory=memory,
                progress=progress,
            )
        from colloc.answers.contrasts.words import contrast_words

        if sort == "association":
            raise UsageError("sort by association goes with pairs: words alone have none")
        return contrast_words(
            opened,
            **sides,
            where=as_list(where),
            layer=layer,
            pattern=pattern,
            min_count=min_count,
            min_docs=min_docs,
            sort=sort,
            limit=limit,
            permutations=permutations,
            seed=seed,
            memory=memory,
        )
