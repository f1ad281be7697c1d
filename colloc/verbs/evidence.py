"""Verbs that show what stands behind a number: lines of text, and the evidence for a pair."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Literal

from colloc.settings import DEFAULT_MEMORY, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.answers.evidence.card import Evidence
    from colloc.store.opening import Store

DEFAULT_CONTEXT = 20
DEFAULT_LINES = 50
DEFAULT_EXAMPLES = 4


def lines(
    store: StorePath | Store,
    first: str,
    second: str | None = None,
    *,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    where: Sequence[str] | str = (),
    sort: Literal["text", "document", "before", "after", "random"] = "text",
    seed: int = 0,
    best: bool = False,
    one_per_document: bool = False,
    context: int = DEFAULT_CONTEXT,
    sentences: bool = False,
    limit: int = DEFAULT_LINES,
) -> Columns:
    """Lines of text that hold a word, a phrase or a pattern with ``*``; with a second one only where it is in reach.

    ``best`` picks good example sentences instead; ``settings["found"]`` says how many lines there are in all.

    Raises
    ------
    NotSeenError
        When nothing is found.
    UsageError
        When the store keeps no text.
    """
    from colloc.answers.concordance.lines import lines as find_lines

    options = pair_options(layer, window, left, right, unit, inside, None, False, True, where, None)
    with reading(store) as opened:
        return find_lines(
            opened,
            first,
            second,
            options=options,
            sort=sort,
            seed=seed,
            best=best,
            one_per_document=one_per_document,
            context=context,
            sentences=sentences,
            limit=limit,
        )


def explain(
    store: StorePath | Store,
    first: str,
    second: str,
    *,
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
    examples: int = DEFAULT_EXAMPLES,
    seed: int = 0,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Evidence:
    """The evidence card of a pair: table, probabilities, measures, intervals, spread, positions, forms, lines.

    Raises
    ------
    NotSeenError
        When one of the words never occurs.
    """
    from colloc.answers.evidence.explaining import explain as ask_explain

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, None)
    with reading(store) as opened:
        return ask_explain(
            opened,
            first,
            second,
            options=options,
            examples=examples,
            seed=seed,
            jobs=jobs,
            memory=memory,
            progress=progress,
        )
