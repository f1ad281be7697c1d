"""``expressions``: sequences of two words and more."""

from __future__ import annotations

from typing import Annotated, Literal

import typer

from colloc.cli import options as opt
from colloc.cli.output import Target, deliver
from colloc.cli.progress import ProgressLine
from colloc.settings import DEFAULT_MIN_COUNT, Inside

LIMIT = 50


def expressions(
    store: opt.StoreArgument,
    min_words: Annotated[int, typer.Option("--min-words", metavar="N", help="Fewest words of an expression.")] = 2,
    max_words: Annotated[
        int | None,
        typer.Option(
            "--max-words", metavar="N", help="Most words of an expression, to 8: 6 if not given, 4 with --any-order."
        ),
    ] = None,
    rank: Annotated[
        Literal[
            "strength",
            "weakest_split",
            "specific_correlation",
            "specific_interaction",
            "best_split_g2",
            "c_value",
            "c_value_length",
            "count",
            "documents",
        ],
        typer.Option("--rank", help="What the list is sorted by, highest first."),
    ] = "strength",
    show: Annotated[
        list[str] | None,
        typer.Option("--show", metavar="NAMES", help="Columns shown, separated by commas; all for every one."),
    ] = None,
    layer: opt.LayerOption = None,
    inside: Annotated[Inside | None, typer.Option("--inside", help="What no expression reaches beyond.")] = None,
    where: opt.WhereOption = None,
    min_count: Annotated[
        int, typer.Option("--min-count", metavar="N", min=2, help="Least occurrences of an expression.")
    ] = DEFAULT_MIN_COUNT,
    min_docs: Annotated[
        int | None,
        typer.Option(
            "--min-docs",
            metavar="N",
            min=0,
            help="Least number of documents that hold the row; 3 when not given, or all where there are fewer.",
        ),
    ] = None,
    names: Annotated[
        Literal["drop", "keep"],
        typer.Option("--names", help="Sequences of which a third of the words or more are written with a capital."),
    ] = "drop",
    common: Annotated[
        Literal["drop", "keep"],
        typer.Option("--common", help="Sequences made only of the words that make up half of the running text."),
    ] = "drop",
    fragments: Annotated[
        Literal["fold", "keep"],
        typer.Option("--fragments", help="Fold sequences that live inside a longer one into it, or list them too."),
    ] = "fold",
    slots: Annotated[
        int,
        typer.Option(
            "--slots", metavar="N", min=0, help="Instead: frames with 1 to N open slots, and the words that fill them."
        ),
    ] = 0,
    any_order: Annotated[
        bool, typer.Option("--any-order", help="Instead: sets of words that meet in whatever order.")
    ] = False,
    gap: Annotated[
        int,
        typer.Option("--gap", metavar="N", min=0, help="With --any-order: at most N other words among those of a set."),
    ] = 0,
    pattern: Annotated[
        str | None,
        typer.Option("--pattern", metavar="CLASSES", help="Only sequences of these word classes, such as 'ADJ NOUN'."),
    ] = None,
    limit: opt.LimitOption = LIMIT,
    jobs: opt.JobsOption = None,
    memory: opt.MemoryOption = opt.DEFAULT_MEMORY,
    format: opt.FormatOption = "table",
    output: opt.OutputOption = None,
    settings_beside: opt.BesideOption = False,
    quiet: opt.QuietOption = False,
) -> None:
    """List expressions of two words and more that recur and hold together, complete ones first.

    Read the text behind one with `colloc lines STORE "THE EXPRESSION"`.
    """
    from colloc.verbs import expressions as finding

    target = Target(format, output, quiet, settings_beside)
    with ProgressLine(quiet=quiet) as progress:
        answer = finding.expressions(
            store,
            layer=layer,
            where=where or (),
            inside=inside,
            min_words=min_words,
            max_words=max_words,
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
            show=opt.split_names(show),
            limit=limit,
            jobs=jobs,
            memory=opt.memory_bytes(memory),
            progress=progress,
        )
    deliver(answer, target, "expressions")


def register(app: typer.Typer) -> None:
    """Add the commands of this module."""
    app.command()(expressions)
