"""``score``: association of given pairs."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from colloc.cli import groups
from colloc.cli import options as opt
from colloc.cli.output import deliver_parts
from colloc.cli.progress import ProgressLine
from colloc.cli.tables_in import Rows, TableFormat, read_rows
from colloc.errors import DataError

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.answers.scoring import Scorer


def score(
    store: opt.StoreArgument,
    *,
    pairs: Annotated[
        Path,
        typer.Argument(
            metavar="PAIRS", help="CSV, TSV or JSON Lines with the columns first and second; - reads standard input."
        ),
    ],
    show: opt.ShowOption = None,
    input_format: Annotated[
        TableFormat, typer.Option("--input-format", help="auto goes by the file's ending, else by its first line.")
    ] = "auto",
    counting: groups.Measured,
    resources: groups.Resources,
    result: groups.CsvResult,
) -> None:
    """Append counts and measures to a list of pairs, in its order.

    Shown is every measure but Fisher's exact test, which takes longer than all others together; --show all adds it.
    Other columns pass through. A word that the store does not know is named in the column unknown.
    """
    from colloc.verbs import scoring

    target = result.target()
    with (
        ProgressLine(quiet=result.quiet) as progress,
        scoring.scorer(
            store,
            show=opt.shown_measures(show),
            **counting.asked(),
            **resources.asked(),
            progress=progress,
        ) as prepared,
    ):
        deliver_parts(_scored(prepared, read_rows(pairs, input_format)), prepared.settings, target, "score")


def _scored(prepared: Scorer, parts: Iterator[Rows]) -> Iterator[Columns]:
    for rows in parts:
        try:
            yield prepared.score(rows.columns)
        except DataError as error:
            raise DataError(f"{rows.name}:1: {error}") from error


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(score)
