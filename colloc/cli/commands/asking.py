"""``words``, ``pairs`` and ``around``: what a store holds, listed."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from colloc.cli import groups
from colloc.cli import options as opt
from colloc.cli.output import deliver, remark_picture, remark_unknown
from colloc.cli.progress import ProgressLine

LIMIT = 50


def words(
    store: opt.StoreArgument,
    *,
    pattern: Annotated[
        str | None, typer.Argument(metavar="PATTERN", help="Only words like this; * stands for any characters.")
    ] = None,
    layer: opt.LayerOption = None,
    where: opt.WhereOption = None,
    min_count: Annotated[int, typer.Option("--min-count", metavar="N", min=0, help="Least frequency shown.")] = 1,
    min_docs: opt.MinDocsOption = 1,
    sort: Annotated[
        Literal["count", "documents", "word", "dp_norm"], typer.Option("--sort", help="What the list is sorted by.")
    ] = "count",
    limit: opt.LimitOption = LIMIT,
    result: groups.Result,
) -> None:
    """List words with their frequency, rate per million, documents and dispersion."""
    from colloc.verbs import asking

    target = result.target()
    answer = asking.words(
        store,
        layer=layer,
        where=where or (),
        pattern=pattern,
        min_count=min_count,
        min_docs=min_docs,
        sort=sort,
        limit=limit,
    )
    deliver(answer, target, "words")


def pairs(
    store: opt.StoreArgument,
    *,
    measure: opt.MeasureOption = None,
    show: opt.ShowColumnsOption = None,
    counting: groups.Measured,
    held: groups.Held,
    upos: Annotated[
        str | None,
        typer.Option(
            "--upos",
            metavar="PATTERN",
            help="Only neighbours of these word classes, as in 'ADJ NOUN' or 'ADJ|NOUN NOUN'; annotated text.",
        ),
    ] = None,
    stop: opt.StopOption = None,
    no_self: opt.NoSelfOption = False,
    limit: opt.LimitOption = LIMIT,
    resources: groups.Resources,
    plot: opt.PlotOption = None,
    plot_as: opt.PlotListOption = None,
    result: groups.Result,
) -> None:
    """List the strongest pairs of words, or with --avoid those that keep apart.

    What is not said about the counting is as the store was built; another window,
    layer or slice is counted from the store, and kept there for the next time.
    """
    from colloc.verbs import asking
    from colloc.verbs.evidence import picture

    ranking = opt.one_ranking(measure)
    opt.check_plot(plot)
    target = result.target()
    with ProgressLine(quiet=result.quiet) as progress:
        answer = asking.pairs(
            store,
            measure=ranking,
            show=opt.shown_columns(show),
            **counting.asked(),
            **held.asked(),
            upos=upos,
            stop=stop or (),
            no_self=no_self,
            limit=limit,
            **resources.asked(),
            progress=progress,
        )
    deliver(answer, target, "pairs")
    if plot is not None:
        remark_picture(plot, picture(answer, plot, plot_as, store=store), quiet=result.quiet)


def around(
    store: opt.StoreArgument,
    *,
    words: Annotated[list[str] | None, typer.Argument(metavar="WORD", help="Words asked for.")] = None,
    words_from: Annotated[
        Path | None, typer.Option("--words-from", metavar="FILE", help="Also the words of this file, one a line.")
    ] = None,
    side: Annotated[
        Literal["both", "left", "right", "each"],
        typer.Option(
            "--side",
            help="Which side of the word the others stand on; each lists both apart. Relations: right are dependents.",
        ),
    ] = "both",
    upos: Annotated[
        list[str] | None,
        typer.Option(
            "--upos",
            metavar="NAMES",
            help="Only companions of these word classes, each listed apart; needs a layer with upos.",
        ),
    ] = None,
    measure: opt.MeasureOption = None,
    show: opt.ShowColumnsOption = None,
    counting: groups.MeasuredByRelation,
    held: groups.Held,
    stop: opt.StopOption = None,
    limit: Annotated[
        int, typer.Option("--limit", "-n", metavar="N", min=0, help="Rows shown for each word; 0 for all.")
    ] = LIMIT,
    resources: groups.Resources,
    plot: opt.PlotOption = None,
    plot_as: opt.PlotListOption = None,
    result: groups.Result,
) -> None:
    """List what stands around each word, strongest first; the word asked for is `first`."""
    from colloc.verbs import asking
    from colloc.verbs.evidence import picture

    ranking = opt.one_ranking(measure)
    opt.check_plot(plot)
    asked = opt.read_words(words or [], words_from)
    target = result.target()
    with ProgressLine(quiet=result.quiet) as progress:
        answer = asking.around(
            store,
            asked,
            side=side,
            upos=opt.split_names(upos) or (),
            measure=ranking,
            show=opt.shown_columns(show),
            **counting.asked(),
            **held.asked(),
            stop=stop or (),
            limit=limit,
            **resources.asked(),
            progress=progress,
        )
    deliver(answer, target, "around")
    remark_unknown(answer.settings, quiet=result.quiet)
    if plot is not None:
        remark_picture(plot, picture(answer, plot, plot_as, store=store), quiet=result.quiet)


def register(app: typer.Typer) -> None:
    """Add the commands of this module."""
    for command in (words, pairs, around):
        app.command()(command)
