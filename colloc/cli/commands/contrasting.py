"""``contrast``: sub-corpora, near-synonyms and lists set against each other."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from colloc.cli import groups
from colloc.cli import options as opt
from colloc.cli.frequency_lists import read_counts
from colloc.cli.output import deliver, print_lines
from colloc.cli.progress import ProgressLine
from colloc.settings import DEFAULT_MIN_COUNT

LIMIT = 50
NARROW = (
    "word",
    "first",
    "second",
    "log_ratio",
    "formula_low",
    "formula_high",
    "count_this",
    "count_that",
    "joint_this",
    "joint_that",
    "documents_this",
    "documents_that",
    "g2",
    "document_q",
    "document_p",
    "says",
)
"""Columns of a table for the eye; files and ``--wide`` have all."""
STRENGTH = ("first", "second", "joint_this", "joint_that", "pmi_this", "pmi_that")
STRENGTH_DIFFERENCE = ("pmi_difference", "pmi_low", "pmi_high", "log_odds_q", "says")
"""The same where association ranks."""


def contrast(
    store: opt.StoreArgument,
    *,
    first: Annotated[str | None, typer.Argument(metavar="X", help="With Y, and --this or --by: this one pair.")] = None,
    second: Annotated[str | None, typer.Argument(metavar="Y")] = None,
    this: Annotated[
        list[str] | None, typer.Option("--this", metavar="SLICE", help="One side: key=value. Given again: both hold.")
    ] = None,
    that: Annotated[
        list[str] | None,
        typer.Option("--that", metavar="SLICE", help="The other side; all other documents when not given."),
    ] = None,
    by: Annotated[
        str | None, typer.Option("--by", metavar="KEY", help="Compare the documents of all values of this key.")
    ] = None,
    word: Annotated[
        list[str] | None,
        typer.Option("--word", metavar="WORD", help="Compare the company of two words: give it twice."),
    ] = None,
    listed: Annotated[
        Path | None,
        typer.Option("--list", metavar="FILE", help="Compare with a frequency list: columns word and count."),
    ] = None,
    list_total: Annotated[
        int | None,
        typer.Option("--list-total", metavar="N", min=1, help="Words that the whole list was counted in."),
    ] = None,
    reference: Annotated[
        str | None,
        typer.Option("--reference", metavar="LANG", help="Compare with general word frequencies of a language: en."),
    ] = None,
    pairs: Annotated[
        bool,
        typer.Option(
            "--pairs",
            help="Compare pairs of words instead of words; the 10,000 most different by G2 of either direction are "
            "tested over documents.",
        ),
    ] = False,
    side: Annotated[
        Literal["both", "left", "right"], typer.Option("--side", help="With --word: on which side of it.")
    ] = "both",
    pattern: Annotated[
        str | None, typer.Option("--pattern", metavar="PATTERN", help="Only words like this; * is any characters.")
    ] = None,
    counting: groups.Counted,
    min_count: Annotated[
        int, typer.Option("--min-count", metavar="N", min=0, help="Least count, both sides together.")
    ] = DEFAULT_MIN_COUNT,
    min_word_count: opt.MinWordCountOption = 1,
    min_docs: opt.MinDocsOption = 1,
    sort: Annotated[
        Literal["documents", "bound", "log_ratio", "g2", "association", "bits", "t", "log_odds"] | None,
        typer.Option(
            "--sort",
            help="documents: the test over documents; bound: the end of the interval nearer to 0; association: of "
            "--pairs, strength instead of frequency; bits: of --by; t, log_odds: of --word.",
        ),
    ] = None,
    permutations: Annotated[
        int,
        typer.Option(
            "--permutations",
            metavar="N",
            min=0,
            help="p-values from N random exchanges of documents between the sides (max-T).",
        ),
    ] = 0,
    seed: Annotated[
        int, typer.Option("--seed", metavar="N", min=0, help="Where the random numbers of --permutations begin.")
    ] = 1,
    limit: opt.LimitOption = LIMIT,
    wide: opt.WideOption = False,
    resources: groups.Resources,
    result: groups.Result,
) -> None:
    """Compare sub-corpora, near-synonyms, or the store with a frequency list; effect size first.

    With --this, rows of this come first, then rows of that. `q` takes every occurrence for
    independent evidence (G2); `document_q` is of a test over documents, which no single document
    can carry, and `says` tells what the two amount to.
    """
    from colloc.verbs import contrasting

    target = result.target(whole=wide)
    with ProgressLine(quiet=result.quiet) as progress:
        answer = contrasting.contrast(
            store,
            first,
            second,
            this=this or (),
            that=that or (),
            by=by,
            words=word or (),
            listed=read_counts(listed) if listed is not None else None,
            listed_total=list_total,
            listed_name=str(listed),
            reference=reference,
            pairs=pairs,
            side=side,
            pattern=pattern,
            **counting.asked(),
            min_count=min_count,
            min_word_count=min_word_count,
            min_docs=min_docs,
            sort=sort,
            limit=limit,
            permutations=permutations,
            seed=seed,
            **resources.asked(),
            progress=progress,
        )
    verdict = answer.settings.get("says")
    if result.format == "table" and not wide and this and first is None:
        shown = (*STRENGTH, *STRENGTH_DIFFERENCE) if sort == "association" else NARROW
        answer = answer.select(name for name in shown if name in answer)
    deliver(answer, target, "contrast")
    if verdict and result.format == "table" and not target.to_file:
        print_lines(["", str(verdict)])


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(contrast)
