"""``appraise``: which measure finds what was accepted, or what stands in a list."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from colloc.cli import options as opt
from colloc.cli.output import Target, counted, deliver, remark, remark_picture
from colloc.cli.progress import ProgressLine
from colloc.errors import UsageError
from colloc.settings import DEFAULT_MIN_COUNT


def appraise(
    store: opt.StoreArgument,
    items: Annotated[
        Literal["pairs", "expressions"],
        typer.Option("--items", help="Hold pairs against it, or expressions by the measures that rank those."),
    ] = "pairs",
    gold: Annotated[
        Path | None,
        typer.Option(
            "--gold",
            metavar="FILE",
            help="Hold the measures against this list of pairs or expressions, one a line, instead of the decisions.",
        ),
    ] = None,
    by: Annotated[str | None, typer.Option("--by", metavar="NAME", help="Decisions of this judge only.")] = None,
    show: Annotated[
        list[str] | None,
        typer.Option(
            "--show",
            metavar="NAMES",
            help="Measures held against it, joint among them (of expressions: strength, c_value, ...); all when not "
            "given.",
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
            "--ranking", metavar="FILE", help="With --combined: what the store has, by what was learnt, as CSV."
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
        int, typer.Option("--min-count", metavar="N", min=1, help="With --gold: least count of candidates.")
    ] = DEFAULT_MIN_COUNT,
    min_words: Annotated[
        int | None, typer.Option("--min-words", metavar="N", help="Of expressions: fewest words; 2 if not given.")
    ] = None,
    max_words: Annotated[
        int | None, typer.Option("--max-words", metavar="N", help="Of expressions: most words; 6 if not given.")
    ] = None,
    min_docs: Annotated[
        int | None, typer.Option("--min-docs", metavar="N", min=0, help="Of expressions: least number of documents.")
    ] = None,
    names: Annotated[
        Literal["drop", "keep"] | None, typer.Option("--names", help="Of expressions: as `colloc expressions` has it.")
    ] = None,
    common: Annotated[
        Literal["drop", "keep"] | None, typer.Option("--common", help="Of expressions: as `colloc expressions` has it.")
    ] = None,
    fragments: Annotated[
        Literal["fold", "keep"] | None,
        typer.Option("--fragments", help="Of expressions: as `colloc expressions` has it."),
    ] = None,
    repeats: Annotated[int, typer.Option("--repeats", metavar="N", min=1, help="Samples of the bootstrap.")] = 1000,
    seed: Annotated[int, typer.Option("--seed", metavar="N", min=0, help="Of the bootstrap and the folds.")] = 0,
    limit: Annotated[
        int, typer.Option("--limit", "-n", metavar="N", min=1, help="Rows written with --ranking.")
    ] = 1000,
    format: opt.FormatOption = "table",
    output: opt.OutputOption = None,
    settings_beside: opt.BesideOption = False,
    quiet: opt.QuietOption = False,
) -> None:
    """Say which measure finds what was accepted, or what stands in a list.

    Average precision is told with a 95 % interval by bootstrap over the candidates, the
    threshold is the one with the highest F1. The line `combined` is a regularised
    logistic regression over all measures, each pair or expression ranked by a model that
    has not seen its first word. With --items expressions the candidates are what `colloc
    expressions` lists, or the expressions that were decided.
    """
    from colloc.cli.word_lists import read_matters
    from colloc.verbs import appraising

    if ranking is not None and not combined:
        raise UsageError("--ranking writes what was learnt: give --combined too")
    target = Target(format, output, quiet, settings_beside)
    places = _places(at)
    with ProgressLine(quiet=quiet) as progress:
        found = appraising.appraise(
            store,
            items=items,
            gold=read_matters(gold) if gold is not None else None,
            by=by,
            show=_names(show, items),
            at=places,
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
            min_words=min_words,
            max_words=max_words,
            min_docs=min_docs,
            names=names,
            common=common,
            fragments=fragments,
            progress=progress,
        )
    deliver(found.measures, target, "appraise")
    candidates = found.measures.settings["candidates"]
    beyond = [str(place) for place in places if place > candidates]
    if beyond:
        there = counted(candidates, "candidate", "candidates")
        remark(f"{there}: nothing to tell at {', '.join(beyond)}; choose nearer places with --at", quiet=quiet)
    if plot is not None:
        remark_picture(plot, quiet=quiet)
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


def _names(values: list[str] | None, items: str) -> list[str] | None:
    """Measures, those of pairs (with ``joint``) checked; None for all."""
    names = opt.split_names(values)
    if names is None or "all" in names:
        return None
    for name in names if items == "pairs" else ():
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
