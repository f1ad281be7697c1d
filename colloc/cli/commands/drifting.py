"""``drift``: words and pairs over time."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, Literal

import typer

from colloc.cli import groups
from colloc.cli import options as opt
from colloc.cli.output import Target, deliver, print_lines, remark_picture
from colloc.cli.progress import ProgressLine
from colloc.errors import UsageError

if TYPE_CHECKING:
    from colloc.answers.columns import Columns

LIMIT = 50
LEAST = 20
TREND = ("tau", "tau_p", "slope", "slope_low", "slope_high", "document_z", "document_p")
PMI_TREND = ("pmi_tau", "pmi_tau_p", "pmi_slope", "pmi_slope_low", "pmi_slope_high", "pmi_left_out", "same_p")
NARROW = (
    "word",
    "first",
    "second",
    "shape",
    "count",
    "documents",
    "first_rate",
    "last_rate",
    "slope",
    "slope_low",
    "slope_high",
    "document_q",
    "says",
)


def drift(
    store: opt.StoreArgument,
    *,
    first: Annotated[str | None, typer.Argument(metavar="X", help="The word followed, or the first of a pair.")] = None,
    second: Annotated[str | None, typer.Argument(metavar="Y", help="The second word of the pair.")] = None,
    by: Annotated[str, typer.Option("--by", metavar="KEY", help="A metadata key with numbers, such as year.")] = "year",
    everything: Annotated[bool, typer.Option("--all", help="Rank all pairs by their trend instead.")] = False,
    words: Annotated[bool, typer.Option("--words", help="With --all: words instead of pairs.")] = False,
    bins: Annotated[
        int | None, typer.Option("--bins", metavar="N", help="So many periods of about equally many words.")
    ] = None,
    edges: Annotated[
        str | None, typer.Option("--edges", metavar="A,B,...", help="Values at which new periods begin.")
    ] = None,
    width: Annotated[
        float | None, typer.Option("--width", metavar="N", help="Periods of this length, such as 10 for decades.")
    ] = None,
    counting: groups.Counted,
    min_count: Annotated[
        int, typer.Option("--min-count", metavar="N", min=0, help="With --all: least count, all periods together.")
    ] = LEAST,
    min_docs: opt.MinDocsOption = 1,
    sort: Annotated[
        Literal["documents", "slope", "association"],
        typer.Option(
            "--sort", help="With --all: by the trend over documents, by slope, or by the trend of association."
        ),
    ] = "documents",
    limit: Annotated[
        int, typer.Option("--limit", "-n", metavar="N", min=0, help="With --all: rows shown; 0 for all.")
    ] = LIMIT,
    wide: opt.WideOption = False,
    plot: opt.PlotOption = None,
    resources: groups.Resources,
    result: groups.Result,
) -> None:
    """Follow a word or a pair over time, or rank what changed most.

    The intervals and the trend take documents, not words, as independent; rates are per million
    words, slopes in doublings for one unit of the key.
    """
    from colloc.verbs import drifting

    opt.check_plot(plot)
    target = result.target(whole=wide)
    with ProgressLine(quiet=result.quiet) as progress:
        answer = drifting.drift(
            store,
            first,
            second,
            by=by,
            everything=everything,
            words=words,
            bins=bins,
            edges=_numbers(edges),
            width=width,
            **counting.asked(),
            min_count=min_count,
            min_docs=min_docs,
            sort=sort,
            limit=limit,
            plot=plot,
            **resources.asked(),
            progress=progress,
        )
    if everything:
        if result.format == "table" and not wide and sort != "association":
            answer = answer.select(name for name in NARROW if name in answer)
        deliver(answer, target, "drift")
    else:
        _deliver_course(answer, target)
    if plot is not None:
        remark_picture(plot, quiet=result.quiet)


def _deliver_course(answer: Columns, target: Target) -> None:
    """The periods; the trend belongs to the settings, and in a table below it."""
    from colloc.answers.columns import Columns
    from colloc.answers.drifts.changed import bars

    if target.format != "table" or target.to_file:
        deliver(answer, target, "drift")
        return
    trend = {name: answer.settings[name] for name in (*TREND, *PMI_TREND, "says") if name in answer.settings}
    rest = {name: value for name, value in answer.settings.items() if name not in trend}
    deliver(Columns(answer.data, rest), target, "drift")
    shapes = [f"rate {bars(answer['per_million'])}"]
    if "pmi" in answer:
        shapes.append(f"PMI {bars(answer['pmi'])}")
    print_lines(["", "   ".join(shapes), _line("rate", trend, ""), *_pmi_lines(trend), str(trend["says"])])


def _pmi_lines(trend: dict[str, Any]) -> list[str]:
    if "pmi_slope" not in trend:
        return []
    same = f"; one odds ratio for all periods: p {trend['same_p']:.3g} (Breslow-Day)"
    return [_line("PMI", trend, "pmi_") + same]


def _line(what: str, trend: dict[str, Any], prefix: str) -> str:
    slope = "no slope"
    if trend[f"{prefix}slope"] == trend[f"{prefix}slope"]:
        bounds = f"{trend[f'{prefix}slope_low']:.4f} to {trend[f'{prefix}slope_high']:.4f}"
        slope = f"slope {trend[f'{prefix}slope']:.4f} bits a unit of time ({bounds})"
    text = f"{what}: {slope}; tau {trend[f'{prefix}tau']:.2f}, p {trend[f'{prefix}tau_p']:.3g} (Mann-Kendall)"
    return text if prefix else f"{text}; over documents p {trend['document_p']:.3g}"


def _numbers(text: str | None) -> list[float]:
    try:
        return [float(part) for part in text.split(",")] if text else []
    except ValueError as error:
        raise UsageError(f"--edges takes numbers with commas between them, such as 1880,1900, not {text!r}") from error


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(drift)
