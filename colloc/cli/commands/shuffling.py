"""``floors``: how strong chance alone makes pairs."""

from __future__ import annotations

import typer

from colloc.cli import options as opt
from colloc.cli.output import Target, deliver
from colloc.cli.progress import ProgressLine


def floors(
    store: opt.StoreArgument,
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
    jobs: opt.JobsOption = None,
    memory: opt.MemoryOption = opt.DEFAULT_MEMORY,
    format: opt.FormatOption = "table",
    output: opt.OutputOption = None,
    settings_beside: opt.BesideOption = False,
    quiet: opt.QuietOption = False,
) -> None:
    """Shuffle the words, count again, and keep how strong pairs come out by chance.

    The chance floors that --sure and --above-chance go by: for each band of expected
    counts the value that 1 % of the pairs exceed when words are shuffled within each
    document (order) and across all documents (corpus). They are made anew when the
    documents have changed.
    """
    from colloc.verbs import asking

    target = Target(format, output, quiet, settings_beside)
    with ProgressLine(quiet=quiet) as progress:
        answer = asking.floors(
            store,
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
            jobs=jobs,
            memory=opt.memory_bytes(memory),
            progress=progress,
        )
    deliver(answer, target, "floors")


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(floors)
