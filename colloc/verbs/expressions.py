"""The verb that finds expressions of two words and more."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Literal

from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT, Inside
from colloc.verbs.opening import ProgressCall, StorePath, as_list, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.store.opening import Store


def expressions(
    store: StorePath | Store,
    *,
    layer: str | None = None,
    where: Sequence[str] | str = (),
    inside: Inside | None = None,
    min_words: int = 2,
    max_words: int | None = None,
    min_count: int = DEFAULT_MIN_COUNT,
    min_docs: int | None = None,
    names: Literal["drop", "keep"] = "drop",
    common: Literal["drop", "keep"] = "drop",
    fragments: Literal["fold", "keep"] = "fold",
    slots: int = 0,
    any_order: bool = False,
    gap: int = 0,
    pattern: str | None = None,
    rank: str = "strength",
    show: Sequence[str] | str | None = None,
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """Sequences of words that recur and hold together, complete ones first.

    Parameters
    ----------
    max_words : int
        6 when not given, and 4 of sets in any order.
    names, common, fragments : str
        Whether to drop sequences that look like names or are made of the most frequent words only, and to fold
        those that live inside a longer one into it.
    slots : int
        0: words side by side. Else frames with 1 to so many open slots, with what fills them.
    any_order, gap : bool, int
        Sets of words in whatever order instead, side by side or with at most ``gap`` other words among them.
    pattern : str
        Only sequences of word classes such as ``ADJ NOUN``, in annotated text.
    rank : str
        ``strength``, ``weakest_split``, ``specific_correlation``, ``specific_interaction``, ``best_split_g2``,
        ``c_value``, ``c_value_length``, ``count`` or ``documents``.
    show : sequence of str
        Columns shown beside the expression; ``all`` for every one.
    limit : int
        Rows; 0 for all.

    Raises
    ------
    UsageError
        A length, threshold, name or slice that makes no sense.
    """
    from colloc.answers.expressions.ranking import expressions as find_expressions
    from colloc.answers.expressions.settings import LONGEST_SHOWN, MOST_OF_SETS, ExpressionOptions

    longest = max_words if max_words is not None else MOST_OF_SETS if any_order else LONGEST_SHOWN
    options = ExpressionOptions(
        layer=layer,
        where=as_list(where),
        inside=inside,
        min_words=min_words,
        max_words=longest,
        min_count=min_count,
        min_docs=min_docs,
        names=names,
        common=common,
        fragments=fragments,
        slots=slots,
        any_order=any_order,
        gap=gap,
        pattern=pattern,
        rank=rank,
    )
    with reading(store) as opened:
        return find_expressions(
            opened,
            options=options,
            show=None if show is None else as_list(show),
            limit=limit,
            jobs=jobs,
            memory=memory,
            progress=progress,
        )
