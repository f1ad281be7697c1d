"""``lines`` and ``explain``: what stands behind a number."""

from __future__ import annotations

from typing import Annotated, Literal

import typer

from colloc.cli import options as opt
from colloc.cli.output import Target, deliver, deliver_bytes, remark_picture
from colloc.cli.progress import ProgressLine
from colloc.errors import UsageError

LinesFormat = Literal["table", "csv", "tsv", "jsonl", "json", "parquet", "html"]
CardFormat = Literal["text", "json", "html"]


def lines(
    store: opt.StoreArgument,
    first: Annotated[str, typer.Argument(metavar="X", help="A word, a quoted phrase, or words with * in them.")],
    second: Annotated[
        str | None, typer.Argument(metavar="Y", help="Only lines with this within reach of the first.")
    ] = None,
    layer: opt.LayerOption = None,
    window: opt.WindowOption = None,
    left: opt.LeftOption = None,
    right: opt.RightOption = None,
    unit: opt.UnitOption = False,
    inside: opt.InsideOption = None,
    where: opt.WhereOption = None,
    sort: Annotated[
        Literal["text", "document", "before", "after", "random"],
        typer.Option("--sort", help="Order of the lines; before and after go by the neighbouring words."),
    ] = "text",
    seed: Annotated[int, typer.Option("--seed", metavar="N", min=0, help="Of the random order.")] = 0,
    best: Annotated[bool, typer.Option("--best", help="Good example sentences only, the best first.")] = False,
    one_per_document: Annotated[
        bool, typer.Option("--one-per-document", help="Only the first line of each document.")
    ] = False,
    context: Annotated[int, typer.Option("--context", metavar="N", min=0, help="Words on either side.")] = 20,
    sentences: Annotated[
        bool, typer.Option("--sentences", help="Whole sentences instead of a number of words.")
    ] = False,
    keys: Annotated[
        list[str] | None,
        typer.Option("--keys", metavar="NAMES", help="Metadata shown beside the document in a table."),
    ] = None,
    limit: opt.LimitOption = 50,
    format: Annotated[LinesFormat, opt.format_option(LinesFormat)] = "table",
    output: opt.OutputOption = None,
    settings_beside: opt.BesideOption = False,
    quiet: opt.QuietOption = False,
) -> None:
    """Show lines of text around a word, a phrase or a pair of words.

    The lines come from the stored text. A line is one occurrence of X; with Y, one that
    has Y within reach. Tables are cut to the width of the terminal, other formats are whole.
    Tables and pages count the words of a document from 1; token and character in csv, tsv,
    jsonl, json and parquet are offsets from 0 in words and in code points.
    """
    from colloc.verbs import evidence

    if best and (one_per_document or sort != "text"):
        raise UsageError(
            "--best has an order and a choice of documents of its own: leave out --sort, --one-per-document"
        )
    target = Target(format, output, quiet, settings_beside)
    answer = evidence.lines(
        store,
        first,
        second,
        layer=layer,
        window=window,
        left=left,
        right=right,
        unit=unit,
        inside=inside,
        where=where or (),
        sort=sort,
        seed=seed,
        best=best,
        one_per_document=one_per_document,
        context=context,
        sentences=sentences,
        limit=limit,
    )
    shown_keys = opt.split_names(keys) or []
    for key in shown_keys:
        if key not in answer:
            raise UsageError(f"no document has the key {key!r}; columns are {', '.join(answer.names)}")
    if format == "html":
        from colloc.exports.pages.lines import lines_page

        deliver_bytes(lines_page(answer), answer.settings, target, "lines")
    elif format == "table":
        from colloc.cli.kwic import kwic_lines, sentence_lines, terminal_width

        shown = (
            sentence_lines(answer, terminal_width(), shown_keys)
            if best or sentences
            else kwic_lines(answer, terminal_width(), shown_keys)
        )
        deliver_bytes("".join(f"{line}\n" for line in shown).encode(), answer.settings, target, "lines")
    else:
        deliver(answer, target, "lines")


def explain(
    store: opt.StoreArgument,
    first: Annotated[str, typer.Argument(metavar="X", help="A word.")],
    second: Annotated[str, typer.Argument(metavar="Y", help="Another one, or the same.")],
    layer: opt.LayerOption = None,
    window: opt.WindowOption = None,
    left: opt.LeftOption = None,
    right: opt.RightOption = None,
    unit: opt.UnitOption = False,
    inside: opt.InsideOption = None,
    margins: opt.MarginsOption = None,
    directed: opt.DirectedOption = False,
    no_span: opt.NoSpanOption = False,
    where: opt.WhereOption = None,
    examples: Annotated[int, typer.Option("--examples", metavar="N", min=0, help="Example lines shown.")] = 4,
    seed: Annotated[
        int, typer.Option("--seed", metavar="N", min=0, help="Of the sample that examples are chosen from.")
    ] = 0,
    jobs: opt.JobsOption = None,
    memory: opt.MemoryOption = opt.DEFAULT_MEMORY,
    plot: opt.PlotOption = None,
    plot_as: Annotated[
        Literal["positions", "spread", "both"],
        typer.Option("--plot-as", help="Positions of the second word, spread over documents, or both."),
    ] = "both",
    format: Annotated[CardFormat, opt.format_option(CardFormat)] = "text",
    output: opt.OutputOption = None,
    settings_beside: opt.BesideOption = False,
    quiet: opt.QuietOption = False,
) -> None:
    """Show the evidence for one pair of words, and what the text can and cannot bear.

    One card with the table, probabilities and surprisal, all measures, intervals, spread
    over documents, positions, relations (of annotated text), slices, forms and example lines.
    """
    from colloc.verbs import evidence

    opt.check_plot(plot)
    target = Target(format, output, quiet, settings_beside)
    with ProgressLine(quiet=quiet) as progress:
        card = evidence.explain(
            store,
            first,
            second,
            layer=layer,
            window=window,
            left=left,
            right=right,
            unit=unit,
            inside=inside,
            margins=margins,
            directed=directed,
            spanned=not no_span,
            where=where or (),
            examples=examples,
            seed=seed,
            jobs=jobs,
            memory=opt.memory_bytes(memory),
            progress=progress,
        )
    if format == "json":
        data = f"{card.to_json()}\n".encode()
    elif format == "html":
        from colloc.exports.pages.card import card_page

        data = card_page(card)
    else:
        from colloc.answers.evidence.text import card_lines
        from colloc.cli.kwic import terminal_width

        data = "".join(f"{line}\n" for line in card_lines(card, terminal_width())).encode()
    deliver_bytes(data, card.settings, target, "explain")
    if plot is not None:
        remark_picture(plot, evidence.picture(card, plot, plot_as, store=store), quiet=quiet)


def register(app: typer.Typer) -> None:
    """Add the commands of this module."""
    for command in (lines, explain):
        app.command()(command)
