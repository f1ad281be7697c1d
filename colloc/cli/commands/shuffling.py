"""``floors``: how strong chance alone makes pairs."""

from __future__ import annotations

import typer

from colloc.cli import groups
from colloc.cli import options as opt
from colloc.cli.output import deliver
from colloc.cli.progress import ProgressLine


def floors(
    store: opt.StoreArgument,
    *,
    counting: groups.Shuffled,
    resources: groups.Resources,
    result: groups.Result,
) -> None:
    """Shuffle the words, count again, and keep how strong pairs come out by chance.

    The chance floors that --sure and --above-chance go by: for each band of expected
    counts the value that 1 % of the pairs exceed when words are shuffled within each
    document (order) and across all documents (corpus). They are made anew when the
    documents have changed.
    """
    from colloc.verbs import asking

    target = result.target()
    with ProgressLine(quiet=result.quiet) as progress:
        answer = asking.floors(
            store,
            **counting.asked(),
            **resources.asked(),
            progress=progress,
        )
    deliver(answer, target, "floors")


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(floors)
