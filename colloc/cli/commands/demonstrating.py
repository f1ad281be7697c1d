"""``demo``: an invented corpus, built and asked."""

from __future__ import annotations

from importlib.resources import as_file, files
from pathlib import Path
from typing import Annotated

import typer

from colloc.cli import options as opt
from colloc.cli.output import Target, deliver, print_lines
from colloc.cli.progress import ProgressLine
from colloc.errors import CannotCreateError

STORE_NAME = "demo.colloc"
WORD = "fog"
CORPUS = "corpora_demo"
"""The package that holds the demo texts, installed beside ``colloc``."""


def demo(
    folder: Annotated[
        Path, typer.Argument(metavar="FOLDER", help=f"Folder in which {STORE_NAME} is built; it is made if missing.")
    ] = Path("."),
    quiet: opt.QuietOption = False,
) -> None:
    """Build a store from the demo texts and show what can be asked of it.

    The texts are invented: the logbooks of a lighthouse service and the notices of
    a ferry company, over several years.
    """
    from colloc.verbs import asking, making

    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise CannotCreateError(f"cannot make the folder {folder}: {error.strerror}; name another one") from error
    store = folder / STORE_NAME
    with as_file(files(CORPUS)) as corpus, ProgressLine(quiet=quiet) as progress:
        texts = sorted(str(path) for path in corpus.glob("*.jsonl"))
        done = making.build(store, texts, progress=progress)
    target = Target(quiet=quiet)
    print_lines([f"{store}: {done.total_documents:,} documents, {done.pairs:,} pairs", "", "The strongest pairs:"])
    deliver(asking.pairs(store, limit=10), target, "pairs")
    print_lines(["", f"What stands around {WORD!r}:"])
    deliver(asking.around(store, [WORD], limit=10), target, "around")
    print_lines(
        [
            "",
            "Next:",
            f"  colloc info {store} --by genre",
            f"  colloc pairs {store} --measure g2 --where genre=log",
            f"  colloc around {store} heavy strong --window 1 --directed",
            f"  colloc words {store} 'light*'",
        ]
    )


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(demo)
