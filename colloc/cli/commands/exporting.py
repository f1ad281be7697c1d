"""``export``: what was accepted, handed on in open formats."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from colloc.cli import options as opt
from colloc.cli.output import counted, remark, settings_line
from colloc.cli.progress import ProgressLine
from colloc.errors import UsageError


def export(
    store: opt.StoreArgument,
    output: Annotated[Path, typer.Argument(metavar="FILE", help="File to write; for csv a folder.")],
    format: Annotated[
        str | None,
        typer.Option(
            "--format",
            "-f",
            metavar="NAME",
            help="csv, xlsx, jsonl, dmlex-json, dmlex-xml, tei, turtle, jsonld or graphml; "
            "by the ending of FILE when not given.",
        ),
    ] = None,
    by: Annotated[str | None, typer.Option("--by", metavar="NAME", help="What this judge accepted.")] = None,
    language: Annotated[
        str, typer.Option("--language", metavar="TAG", help="Language of the words, as BCP 47.")
    ] = "und",
    title: Annotated[
        str, typer.Option("--title", metavar="TEXT", help="Title of the work.")
    ] = "Accepted word combinations",
    base_iri: Annotated[
        str, typer.Option("--base-iri", metavar="IRI", help="Where the names of an RDF file begin.")
    ] = "urn:colloc:",
    show: opt.ShowOption = None,
    layer: opt.LayerOption = None,
    window: opt.WindowOption = None,
    left: opt.LeftOption = None,
    right: opt.RightOption = None,
    inside: opt.InsideOption = None,
    margins: opt.MarginsOption = None,
    where: opt.WhereOption = None,
    quiet: opt.QuietOption = False,
) -> None:
    """Hand on what was accepted, with frequencies, scores, examples and sources.

    Without --by these are the pairs and expressions that somebody accepted and nobody
    rejected. Formats: CSV with a Data Package description, XLSX, JSON Lines, OASIS
    DMLex 1.0 (JSON, XML), TEI Lex-0, OntoLex-Lemon with FrAC (Turtle, JSON-LD), GraphML.
    """
    from colloc.exports.entries.formats import FORMATS
    from colloc.verbs import exporting

    endings = {made.ending: name for name, made in FORMATS.items()}
    chosen = format or endings.get(output.suffix.lower())
    if chosen is None:
        known = ", ".join(f"{ending} ({name})" for ending, name in endings.items() if ending)
        why = f"no format has the ending {output.suffix!r}"
        if output.suffix.lower() == ".csv":
            why = f"CSV goes into a folder, as several files: name one without the ending, such as {output.stem}"
        raise UsageError(f"{output}: {why}; endings of single files: {known}; or say in which format with --format")
    with ProgressLine(quiet=quiet) as progress:
        made = exporting.export(
            store,
            output,
            chosen,
            language=language,
            title=title,
            base_iri=base_iri,
            by=by,
            show=opt.shown_measures(show),
            layer=layer,
            window=window,
            left=left,
            right=right,
            inside=inside,
            margins=margins,
            where=where or (),
            progress=progress,
        )
    remark(settings_line("export", made.settings), quiet=quiet)
    left_out = f"; {made.disputed} left out, on which judges disagree" if made.disputed else ""
    remark(f"{counted(len(made.entries), 'entry', 'entries')} in {output}{left_out}", quiet=quiet)


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(export)
