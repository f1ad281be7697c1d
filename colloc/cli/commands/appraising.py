"""``appraise``: which measure finds what was accepted, or what stands in a list."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from colloc.cli import options as opt
from colloc.cli.output import Target, deliver, remark
from colloc.cli.progress import ProgressLine
from colloc.errors import UsageError
from colloc.settings import DEFAULT_MIN_COUNT


def appraise(
    store: opt.StoreArgument,
    gold: Annotated[
        Path | None,
        typer.Option(
            "--gold",
            metavar="FILE",
            help="Hold the measures against this list of pairs, one a line, instead of the decisions.",
        ),
    ] = None,
    by: Annotated[str | None, typer.Option("--by", metavar="NAME", help="Decisions of this judge only.")] = None,
    show: Annotated[
        list[str] | None,
        typer.Option(
            "--show",
            metavar="NAMES",
            help="Measures held against it, joint among them; all when not given.",
            autocompletion=opt.complete_measures,
        ),
    ] = None,
    at: Annotated[
        str, typer.Option("--at", metavar="PLACES", help="Places at which precision and recall are told.")
    ] = "100",
    combined: Annotated[
        bool, typer.Option("--combined", help="Also learn a ranking from all measures, cross-validated.")
    ] = False,
    ranking: Annotated[
        Path | None,
        typer.Option(
            "--ranking", metavar="FILE", help="With --combined: the store's pairs by what was learnt, as CSV."
        ),
    ] = None,
    plot: Annotated[
        Path | None, typer.Option("--plot", metavar="FILE", help="Draw precision against recall: .svg or .png.")
    ] = None,
    layer: opt.LayerOption = None,
    window: opt.WindowOption = None,
    left: opt.LeftOption = None,
    right: opt.RightOption = None,
    inside: opt.InsideOption = None,
    margins: opt.MarginsOption = None,
    directed: opt.DirectedOption = False,
    where: opt.WhereOption = None,
    min_count: Annotated[
        int, typer.Option("--min-count", metavar="N", min=1, help="With --gold: least joint count of candidates.")
    ] = DEFAULT_MIN_COUNT,
    repeats: Annotated[int, typer.Option("--repeats", metavar="N", min=1, help="Samples of the bootstrap.")] = 1000,
    seed: Annotated[int, typer.Option("--seed", metavar="N", min=0, help="Of the bootstrap and the folds.")] = 0,
    limit: Annotated[
        int, typer.Option("--limit", "-n", metavar="N", min=1, help="Pairs written with --ranking.")
    ] = 1000,
    format: opt.FormatOption = "table",
    output: opt.OutputOption = None,
    settings_beside: opt.BesideOption = False,
    quiet: opt.QuietOption = False,
) -> None:
    """Say which measure finds what was accepted, or what stands in a list.

    Average precision is told with a 95 % interval by bootstrap over the candidates, the
    threshold is the one with the highest F1. The line `combined` is a regularised
    logistic regression over all measures, each pair ranked by a model that has not seen
    its first word.
    """
    from colloc.cli.word_lists import read_matters
    from colloc.verbs import appraising

    if ranking is not None and not combined:
        raise UsageError("--ranking writes what was learnt: give --combined too")
    target = Target(format, output, quiet, settings_beside)
    with ProgressLine(quiet=quiet) as progress:
        found = appraising.appraise(
            store,
            gold=read_matters(gold) if gold is not None else None,
            by=by,
            show=_names(show),
            at=_places(at),
            min_count=min_count,
            combined=combined,
            limit=limit if ranking is not None else 0,
            plot=plot,
            repeats=repeats,
            seed=seed,
            layer=layer,
            window=window,
            left=left,
            right=right,
            inside=inside,
            margins=margins,
            directed=directed,
            where=where or (),
            progress=progress,
        )
    deliver(found.measures, target, "appraise")
    if found.folds is not None and found.weights is not None:
        ours, single = found.folds["combined"].mean(), found.folds["single"].mean()
        chosen = ", ".join(dict.fromkeys(found.folds["measure"].tolist()))
        remark(
            f"mean over {len(found.folds)} folds: combined {ours:.4f}, best measure of the training part "
            f"{single:.4f} ({chosen})",
            quiet=quiet,
        )
        weights = [f"{row['measure']} {row['weight']:+.2f}" for row in found.weights.to_dicts()[:8]]
        remark(f"largest weights: {', '.join(weights)}", quiet=quiet)
    if found.ranking is not None and ranking is not None:
        deliver(found.ranking, Target("csv", ranking, True), "appraise")


def _names(values: list[str] | None) -> list[str] | None:
    """Measures and ``joint``; None for all."""
    names = opt.split_names(values)
    if names is None or "all" in names:
        return None
    for name in names:
        opt.check_ranking(name)
    return names


def _places(text: str) -> list[int]:
    names = opt.split_names([text]) or []
    if not names or not all(name.isascii() and name.isdigit() for name in names):
        raise UsageError(f"--at takes places such as 10,50,100, not {text!r}")
    return [int(name) for name in names]


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(appraise)
