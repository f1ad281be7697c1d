"""``info``, ``check`` and ``tally``: looking after a store."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Annotated, Any

import typer

from colloc.cli import groups
from colloc.cli import options as opt
from colloc.cli.output import Target, deliver, deliver_parts, opened, print_lines, write_settings
from colloc.cli.progress import ProgressLine
from colloc.errors import DataError, NoInputError, UsageError
from colloc.processor import prefer_fast_sorting


def info(
    store: opt.StoreArgument,
    *,
    by: Annotated[
        str | None, typer.Option("--by", metavar="KEY", help="Documents, tokens and types for each value of this key.")
    ] = None,
    documents: Annotated[bool, typer.Option("--documents", help="List the documents with their metadata.")] = False,
    methods: Annotated[
        bool, typer.Option("--methods", help="Tell what was done, as a paragraph and as BibTeX, to be repeated.")
    ] = False,
    show: Annotated[
        list[str] | None, typer.Option("--show", metavar="NAMES", help="With --methods: the measures that were used.")
    ] = None,
    result: Annotated[
        Path | None,
        typer.Option("--result", metavar="FILE", help="With --methods: what --settings-beside wrote for a result."),
    ] = None,
    written: groups.Result,
) -> None:
    """Tell what is inside a store: sizes, settings, layers, tables and sources."""
    from colloc.verbs import keeping

    target = written.target()
    if by is not None and documents:
        raise UsageError("--by and --documents are two questions: ask one at a time")
    if methods and (by is not None or documents):
        raise UsageError("--methods is a question of its own: leave out --by and --documents")
    if not methods and (show or result is not None):
        raise UsageError("--show and --result go with --methods")
    if methods:
        _deliver_methods(store, opt.shown_measures(show), result, target)
    elif by is not None:
        deliver(keeping.documents_by(store, by), target, "info")
    elif documents:
        deliver_parts(keeping.documents(store), {"store": str(store)}, target, "info")
    elif target.format == "json":
        with opened(target.path) as stream:
            stream.write((json.dumps(keeping.info(store), ensure_ascii=False, indent=2) + "\n").encode())
        if target.settings_beside and target.path is not None:
            write_settings(target.path, {"store": str(store)}, "info")
    else:
        from colloc.answers.columns import Columns

        rows = list(_flattened("", keeping.info(store)))
        answer = Columns(
            {"item": [name for name, _ in rows], "value": [value for _, value in rows]}, {"store": str(store)}
        )
        deliver(answer, target, "info")


def _deliver_methods(store: Path, measures: list[str] | None, result: Path | None, target: Target) -> None:
    """The paragraph and the BibTeX under each other, or as JSON."""
    from colloc.verbs import keeping

    if target.format not in ("table", "json"):
        raise UsageError("--methods is text, or JSON with --format json")
    settings = _read_settings(result) if result is not None else None
    told = keeping.methods(store, measures=measures, result=settings)
    text = f"{told.paragraph}\n\n{told.bibtex}\n"
    if target.format == "json":
        text = json.dumps({"paragraph": told.paragraph, "bibtex": told.bibtex}, ensure_ascii=False, indent=2) + "\n"
    with opened(target.path) as stream:
        stream.write(text.encode())
    if target.settings_beside and target.path is not None:
        write_settings(target.path, {"store": str(store), "measures": measures, "result": str(result)}, "info")


def _read_settings(path: Path) -> dict[str, Any]:
    """What ``--settings-beside`` wrote."""
    try:
        found = json.loads(path.read_text(encoding="utf-8"))
    except FileNotFoundError as error:
        raise NoInputError(f"{path}: no such file; write it with --settings-beside") from error
    except (OSError, ValueError) as error:
        raise DataError(f"{path}: not the settings of a result: {error}") from error
    if not isinstance(found, dict) or not isinstance(found.get("settings"), dict):
        raise DataError(f"{path}: not the settings of a result: it needs the keys command and settings")
    return found


def _flattened(prefix: str, value: Any) -> Iterator[tuple[str, str]]:
    """Nested values as dotted names and text: ``settings.read.encoding``, ``sources.1.name``."""
    if isinstance(value, Mapping):
        inner = [(str(key), item) for key, item in value.items()]
    elif isinstance(value, list | tuple) and any(isinstance(item, Mapping) for item in value):
        inner = [(str(number), item) for number, item in enumerate(value, start=1)]
    else:
        plain = ", ".join(map(str, value)) if isinstance(value, list | tuple) else "" if value is None else str(value)
        yield prefix, plain
        return
    for name, item in inner:
        yield from _flattened(f"{prefix}.{name}" if prefix else name, item)


def check(store: opt.StoreArgument, quiet: opt.QuietOption = False) -> None:
    """Verify a store: pages, sums and sizes. The exit code is 1 where something is wrong."""
    from colloc.verbs import keeping

    findings = keeping.check(store)
    if findings:
        print_lines(f"{store}: {finding}" for finding in findings)
        raise typer.Exit(1)
    if not quiet:
        print_lines([f"{store}: all is well"])


def tally(
    store: opt.StoreArgument,
    *,
    counting: groups.Tabled,
    drop: Annotated[bool, typer.Option("--drop", help="Drop this table instead of counting it.")] = False,
    listed: Annotated[bool, typer.Option("--list", help="List the tables that are kept, and count nothing.")] = False,
    resources: groups.Resources,
    result: groups.Result,
) -> None:
    """Count another table and keep it, so that questions about it are answered at once.

    What is not said is as the store was built. The result is the list of tables kept.
    """
    prefer_fast_sorting()
    from colloc.verbs import keeping

    target = result.target()
    if listed and drop:
        raise UsageError("--list changes nothing: leave out --drop")
    if not listed:
        with ProgressLine(quiet=result.quiet) as progress:
            keeping.tally(
                store,
                **counting.asked(),
                drop=drop,
                **resources.asked(),
                progress=progress,
            )
    deliver(keeping.tallies(store), target, "tally")


def register(app: typer.Typer) -> None:
    """Add the commands of this module."""
    for command in (info, check, tally):
        app.command()(command)
