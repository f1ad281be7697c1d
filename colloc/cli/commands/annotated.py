"""``sequences`` and ``conllu``: what only annotated text can be asked."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from colloc.cli import options as opt
from colloc.cli.output import Target, deliver, print_lines


def sequences(
    store: opt.StoreArgument,
    pattern: Annotated[
        str, typer.Argument(metavar="PATTERN", help="Word classes of adjacent words, as in 'NOUN (ADP NOUN)?'.")
    ],
    layer: Annotated[str, typer.Option("--layer", metavar="NAME", help="What words count as the same.")] = "lemma",
    where: opt.WhereOption = None,
    longest: Annotated[
        bool, typer.Option("--longest", help="Only the longest match at each word, not the shorter ones in it.")
    ] = False,
    min_count: opt.MinCountOption = 1,
    limit: opt.LimitOption = 50,
    format: opt.FormatOption = "table",
    output: opt.OutputOption = None,
    settings_beside: opt.BesideOption = False,
    quiet: opt.QuietOption = False,
) -> None:
    """List adjacent words that follow a pattern of word classes, the most frequent first.

    In a pattern A|B is either of two, ( ) holds several together, and what ? stands
    behind may be missing; + and * repeat; ANY is a word of any class. ADJ|NOUN NOUN is
    an adjective or a noun, and then a noun. Matches lie inside one sentence.
    """
    from colloc.verbs import annotated

    answer = annotated.sequences(
        store, pattern, layer=layer, where=where or (), longest=longest, min_count=min_count, limit=limit
    )
    deliver(answer, Target(format, output, quiet, settings_beside), "sequences")


def conllu(
    store: opt.StoreArgument,
    output: Annotated[Path, typer.Option("--output", "-o", metavar="FILE", help="The file to write.")],
    where: opt.WhereOption = None,
    quiet: opt.QuietOption = False,
) -> None:
    """Write annotated documents out again, as they were read.

    Forms, tags, heads, comments, multiword tokens, empty nodes and all columns are the
    same; plain text is passed over.
    """
    from colloc.verbs import annotated

    written = annotated.conllu(store, output, where=where or ())
    if not quiet:
        print_lines([f"{output}: {written:,} document{'s' if written != 1 else ''}"])


def register(app: typer.Typer) -> None:
    """Add the commands of this module."""
    for command in (sequences, conllu):
        app.command()(command)
