"""Verbs that show what stands behind a number: lines of text, and the evidence for a pair."""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Literal

from colloc.errors import UsageError
from colloc.settings import DEFAULT_MEASURE, DEFAULT_MEMORY, DEFAULT_MIN_COUNT, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.answers.evidence.card import Evidence
    from colloc.store.opening import Store

DEFAULT_CONTEXT = 20
DEFAULT_LINES = 50
DEFAULT_EXAMPLES = 4

PictureKind = Literal["positions", "spread", "both", "frequency", "network"]


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


def picture(
    answer: Evidence | Columns,
    path: str | os.PathLike[str],
    kind: PictureKind | None = None,
    *,
    store: StorePath | Store,
) -> str | None:
    """Draw an answer into an SVG or PNG file; needs matplotlib (``colloc[plots]``).

    Parameters
    ----------
    answer : Evidence or Columns
        What ``explain``, ``pairs`` or ``around`` gave.
    kind : str
        ``positions``, ``spread`` or ``both`` for a card (both when not given); ``frequency`` (a measure against the
        expected count, with the chance floors that the store keeps) or ``network`` (one word and its company) for a
        list; when not given the network where there is one first word.
    store : path or Store
        Where the answer came from.

    Returns
    -------
    str or None
        What the picture lacks, and how to get it: chance floors that the store does not keep.

    Raises
    ------
    UsageError
        For a kind that does not fit the answer, or a file that is neither SVG nor PNG.
    MissingExtraError
        Where matplotlib is not installed.
    """
    from colloc.answers.evidence.card import Evidence

    target = Path(path)
    if isinstance(answer, Evidence):
        from colloc.exports.pictures import evidence as cards

        drawn = {"positions": cards.draw_positions, "spread": cards.draw_spread, "both": cards.draw_evidence}
        if (kind or "both") not in drawn:
            raise UsageError(f"a card is drawn as {', '.join(drawn)}, not as {kind!r}")
        drawn[kind or "both"](answer, target)
        return None
    return _draw_list(answer, target, kind, store)


def _draw_list(answer: Columns, target: Path, kind: PictureKind | None, store: StorePath | Store) -> str | None:
    from colloc.answers.evidence.linking import kept_floors, partner_links, question_of
    from colloc.exports.pictures import frequency, network

    if "first" not in answer or kind in ("positions", "spread", "both"):
        raise UsageError(f"a list of pairs is drawn as frequency or network, not as {kind!r}")
    if not len(answer):
        raise UsageError("there is nothing to draw: the answer has no rows")
    words = set(answer["first"].tolist())
    kind = kind or ("network" if len(words) == 1 else "frequency")
    measure = answer.settings["measure"]
    # Frequency itself is no strength; pairs ranked by it are drawn by the default measure.
    measure = measure if measure != "joint" else next(name for name in (DEFAULT_MEASURE, "pmi") if name in answer)
    if kind == "network" and len(words) > 1:
        raise UsageError("a network is drawn around one word: ask for one, or draw the frequency")
    with reading(store) as opened:
        question = question_of(opened, answer.settings)
        if kind == "frequency":
            floors = [kept for kept in kept_floors(question) if measure in kept.values]
            frequency.draw_frequency(answer, measure, floors, target)
            lacking = (
                f"no chance floors of {measure} are kept: `colloc floors {opened.path}`, counting alike, adds them"
            )
            return None if floors else lacking
        links = partner_links(question, answer, measure, network.MOST, DEFAULT_MIN_COUNT)
    network.draw_network(answer, measure, links, target)
    return None
