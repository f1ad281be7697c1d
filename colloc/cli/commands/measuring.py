"""``measure``: measures for counts from anywhere."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from colloc.cli import options as opt
from colloc.cli.output import Target, deliver_parts
from colloc.cli.tables_in import Rows, TableFormat, read_rows
from colloc.errors import DataError

if TYPE_CHECKING:
    from colloc.answers.columns import Columns


def measure(
    table: Annotated[
        Path, typer.Argument(metavar="TABLE", help="CSV, TSV or JSON Lines file; - reads standard input.")
    ],
    measures: Annotated[
        list[str] | None,
        typer.Option(
            "--measure",
            "-m",
            metavar="NAMES",
            help="Measures to append, separated by commas or repeated; all when not given.",
            autocompletion=opt.complete_measures,
        ),
    ] = None,
    input_format: Annotated[
        TableFormat, typer.Option("--input-format", help="auto goes by the file's ending, else by its first line.")
    ] = "auto",
    format: opt.FormatOption = "csv",
    output: opt.OutputOption = None,
    settings_beside: opt.BesideOption = False,
    quiet: opt.QuietOption = False,
) -> None:
    """Append measures to a table with the columns joint, first_total, second_total and total.

    Other columns pass through as they are, so a list of pairs can be piped in:
    colloc pairs STORE --format csv | colloc measure -
    """
    names = opt.shown_measures(measures)
    target = Target(format, output, quiet, settings_beside)
    settings: dict[str, Any] = {"table": "standard input" if str(table) == "-" else str(table), "measures": names}
    parts = _measured(read_rows(table, input_format), names)
    if format == "table":
        from colloc.answers.measuring import readable

        parts = map(readable, parts)
    deliver_parts(parts, settings, target, "measure")


def _measured(parts: Iterator[Rows], names: list[str] | None) -> Iterator[Columns]:
    """Each stretch with its measures; errors name file and line."""
    from colloc.answers.measuring import BadRowError, from_values, measured

    for rows in parts:
        try:
            yield measured(from_values(rows.columns), names)
        except BadRowError as error:
            raise DataError(f"{rows.name}:{rows.lines[error.row]}: {error.problem}") from error
        except DataError as error:
            raise DataError(f"{rows.name}:1: {error}") from error


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(measure)
