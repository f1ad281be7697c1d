"""``features``: what tells the labels of documents apart."""

from __future__ import annotations

from typing import Annotated, Literal

import typer

from colloc.cli import groups
from colloc.cli import options as opt
from colloc.cli.output import deliver
from colloc.cli.progress import ProgressLine


def features(
    store: opt.StoreArgument,
    *,
    label: Annotated[str, typer.Option("--label", metavar="KEY", help="Metadata key that holds the label.")],
    pairs: Annotated[bool, typer.Option("--pairs", help="Pairs of words instead of words.")] = False,
    sort: Annotated[
        Literal["mutual_information", "chi2", "contribution"],
        typer.Option("--sort", help="What the list is sorted by, highest first."),
    ] = "mutual_information",
    each_label: Annotated[
        bool, typer.Option("--each-label", help="Also the documents and the contribution of every label.")
    ] = False,
    counting: groups.Counted,
    min_docs: Annotated[
        int,
        typer.Option("--min-docs", metavar="N", min=1, help="Tested is what N documents have and N others have not."),
    ] = 3,
    most_pairs: Annotated[
        int, typer.Option("--most-pairs", metavar="N", min=1, help="Look at the N pairs met most often.")
    ] = 20_000,
    limit: opt.LimitOption = 50,
    resources: groups.Resources,
    result: groups.Result,
) -> None:
    """List words, or pairs, whose presence in a document tells most about its label.

    Mutual information and contributions are in bits; chi2 is Pearson's over presence and
    absence, chi2_present the part of it from presence alone.
    """
    from colloc.verbs import features as verbs

    target = result.target()
    with ProgressLine(quiet=result.quiet) as progress:
        answer = verbs.features(
            store,
            label,
            pairs=pairs,
            **counting.asked(),
            min_docs=min_docs,
            most_pairs=most_pairs,
            sort=sort,
            each_label=each_label,
            limit=limit,
            **resources.asked(),
            progress=progress,
        )
    deliver(answer, target, "features")


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(features)
