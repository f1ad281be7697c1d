"""``build``, ``add``, ``remove`` and ``merge``: what is in a store."""

from __future__ import annotations

import dataclasses
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, Literal

import typer

from colloc.cli import options as opt
from colloc.cli.output import print_lines, remark
from colloc.cli.progress import ProgressLine
from colloc.cli.sizes import size_in_bytes, written_size
from colloc.processor import prefer_fast_sorting
from colloc.settings import DEFAULT_LAYER, DEFAULT_WINDOW, Inside, Margins

if TYPE_CHECKING:
    from colloc.build.building import BuildReport
    from colloc.build.estimating import Estimate
    from colloc.settings import TallySpec

Errors = Literal["strict", "replace"]
Duplicates = Literal["none", "document", "paragraph"]

# How input is read: build has defaults for these, add takes what the store was built with.
_INPUT_FORMAT = typer.Option(
    "--input-format", metavar="NAME", help="txt, jsonl, csv, tsv, ...; auto goes by the file name."
)
_ENCODING = typer.Option(
    "--encoding", metavar="NAME", help="Name of an encoding; detect guesses it for each file and tells which."
)
_ERRORS = typer.Option("--errors", help="Bytes that cannot be decoded: stop, or replace and count them.")
_TEXT_COLUMN = typer.Option("--text-column", metavar="NAME", help="Column or key that holds the text.")
_ID_COLUMN = typer.Option(
    "--id-column", metavar="NAME", help="Column that holds the identifier; id where there is one."
)
_META_FROM_PATH = typer.Option(
    "--meta-from-path",
    metavar="PATTERN",
    help="Metadata from the path, such as '{genre}/{year}-{id}.txt'; {id} is the identifier.",
)
_META_TABLE = typer.Option("--meta-table", metavar="FILE", help="Table of metadata; its first column names the files.")
_META_XPATH = typer.Option(
    "--meta-xpath",
    metavar="NAME=XPATH",
    help="Metadata from TEI headers, as in 'year=//date/@when'; repeatable.",
)
_SKIP_DUPLICATES = typer.Option("--skip-duplicates", help="Leave out what has the same words as something read before.")
_MAX_RECORD = typer.Option("--max-record", metavar="SIZE", help="Largest record of a JSON, CSV or TSV file.")
_MAX_UNPACKED = typer.Option("--max-unpacked", metavar="SIZE", help="Largest unpacked size of one compressed file.")

KeepOrDrop = Literal["keep", "drop"]


def build(
    store: opt.StoreArgument,
    inputs: opt.InputArgument,
    window: opt.WindowOption = None,
    left: opt.LeftOption = None,
    right: opt.RightOption = None,
    unit: opt.UnitOption = False,
    inside: Annotated[
        Inside, typer.Option("--inside", help="What both words stand in: no window reaches beyond it.")
    ] = "sentence",
    margins: Annotated[
        Margins,
        typer.Option(
            "--margins",
            help="What is one observation, and so what totals count: pairs of words, places in the text, or words.",
        ),
    ] = "pairs",
    layer: Annotated[
        str,
        typer.Option(
            "--layer",
            metavar="NAME",
            help="What counts as the same word: form (as written), fold (whatever the case), lemma, ...",
        ),
    ] = DEFAULT_LAYER,
    relation: opt.RelationOption = None,
    input_format: Annotated[str, _INPUT_FORMAT] = "auto",
    encoding: Annotated[str, _ENCODING] = "utf-8",
    errors: Annotated[Errors, _ERRORS] = "strict",
    text_column: Annotated[str, _TEXT_COLUMN] = "text",
    id_column: Annotated[str | None, _ID_COLUMN] = None,
    meta_from_path: Annotated[str | None, _META_FROM_PATH] = None,
    meta_table: Annotated[str | None, _META_TABLE] = None,
    meta_xpath: Annotated[list[str] | None, _META_XPATH] = None,
    skip_duplicates: Annotated[Duplicates, _SKIP_DUPLICATES] = "none",
    max_record: Annotated[str, _MAX_RECORD] = "64MB",
    max_unpacked: Annotated[str, _MAX_UNPACKED] = "64GB",
    hyphens: Annotated[
        Literal["keep", "split"], typer.Option("--hyphens", help="Words joined by a hyphen: one word, or its parts.")
    ] = "keep",
    numbers: Annotated[
        KeepOrDrop, typer.Option("--numbers", help="Numbers and other words without a letter.")
    ] = "keep",
    addresses: Annotated[
        Literal["keep", "drop", "split"],
        typer.Option("--addresses", help="Web and e-mail addresses: one word, no word, or their parts."),
    ] = "keep",
    line_ends: Annotated[
        Literal["paragraph", "space"],
        typer.Option("--line-ends", help="A line end ends the paragraph, or is a space as in wrapped text."),
    ] = "paragraph",
    abbreviations: Annotated[
        bool, typer.Option("--abbreviations/--no-abbreviations", help="No sentence ends after known abbreviations.")
    ] = True,
    max_token: Annotated[
        int, typer.Option("--max-token", metavar="N", help="Longer words, in characters, are left out.")
    ] = 256,
    pattern: Annotated[
        str | None,
        typer.Option(
            "--pattern", metavar="REGEX", help="A regular expression that finds words, instead of Unicode's rules."
        ),
    ] = None,
    scripts: Annotated[
        Literal["unicode", "dictionary"],
        typer.Option("--scripts", help="Words of Chinese, Japanese, Thai, ...: Unicode's rules, or by dictionary."),
    ] = "unicode",
    hashtags: Annotated[
        Literal["split", "keep"], typer.Option("--hashtags", help="#tag and @name: without the sign, or whole.")
    ] = "split",
    punctuation: Annotated[
        Literal["drop", "keep"],
        typer.Option("--punctuation", help="Marks outside of words: left out, or kept as words."),
    ] = "drop",
    folding: Annotated[
        list[str] | None,
        typer.Option(
            "--fold",
            metavar="NAMES",
            help="What layer fold takes for the same besides case: apostrophes, arabic, turkish, sharp-s, width, ...",
        ),
    ] = None,
    lemma: Annotated[
        str | None,
        typer.Option(
            "--lemma",
            metavar="LANG",
            help="Language whose dictionary gives lemmas to words that carry none, such as en.",
        ),
    ] = None,
    text: Annotated[
        bool, typer.Option("--text/--no-text", help="Keep the text in the store; lines can only be shown from it.")
    ] = True,
    jobs: opt.JobsOption = None,
    memory: opt.MemoryOption = opt.DEFAULT_MEMORY,
    temp: opt.TempOption = None,
    dry_run: Annotated[
        bool, typer.Option("--dry-run", help="Only estimate time, memory and disk, from a sample.")
    ] = False,
    quiet: opt.QuietOption = False,
) -> None:
    """Read text, find its words, and keep and count them in a new store.

    A build that was stopped goes on with the same command. Without --window or
    --left and --right, words within 5 of each other are counted.
    """
    from colloc.settings import ReadSettings, SegmentSettings

    prefer_fast_sorting()
    from colloc.verbs import making

    read = ReadSettings(
        format=input_format,
        encoding=encoding,
        errors=errors,
        text_column=text_column,
        id_column=id_column,
        meta_from_path=meta_from_path,
        meta_table=meta_table,
        max_record=size_in_bytes(max_record),
        max_unpacked=size_in_bytes(max_unpacked),
        skip_duplicates=skip_duplicates,
        meta_xpath=tuple(meta_xpath or ()),
    )
    segment = SegmentSettings(
        hyphens=hyphens,
        numbers=numbers,
        addresses=addresses,
        line_ends=line_ends,
        abbreviations=abbreviations,
        max_token=max_token,
        pattern=pattern,
        scripts=scripts,
        hashtags=hashtags,
        punctuation=punctuation,
        folding=tuple(opt.split_names(folding) or ()),
        lemma=lemma,
    )
    tally = _first_tally(layer, window, left, right, unit, inside, margins, relation)
    size = opt.memory_bytes(memory)
    if dry_run:
        from colloc.build.estimating import estimate

        expected = estimate(
            store,
            inputs,
            read=read,
            segment=segment,
            tally=tally,
            jobs=jobs,
            memory=size,
            temp=temp,
            keep_text=text,
        )
        print_lines(_estimate_lines(expected))
        return
    with ProgressLine(quiet=quiet) as progress:
        done = making.build(
            store,
            inputs,
            read=read,
            segment=segment,
            tally=tally,
            margins=margins,
            keep_text=text,
            jobs=jobs,
            memory=size,
            temp=temp,
            progress=progress,
        )
    _tell(done, quiet)
    if not quiet and not done.already_complete:
        _tell_apostrophes(store)


def _tell_apostrophes(path: Path) -> None:
    """One line where the same words are written with two kinds of apostrophes, with the option that joins them."""
    from colloc.answers.spelling import apostrophe_twins
    from colloc.verbs.opening import reading

    with reading(path) as store:
        twins = apostrophe_twins(store)
    if twins:
        remark(
            f"colloc: {twins:,} words stand with a curly and with a straight apostrophe and are counted apart; "
            "`build --fold apostrophes` takes them for one"
        )


def _first_tally(
    layer: str,
    window: int | None,
    left: int | None,
    right: int | None,
    unit: bool,
    inside: Inside,
    margins: Margins,
    relation: str | None,
) -> TallySpec:
    from colloc.answers.questions import PairOptions, chosen_spec
    from colloc.settings import TallySpec

    options = PairOptions(
        layer=layer, window=window, left=left, right=right, unit=unit, inside=inside, relation=relation
    )
    return chosen_spec(options, TallySpec(right=DEFAULT_WINDOW), margins)


def _estimate_lines(expected: Estimate) -> list[str]:
    return [
        f"tokens           {expected.tokens:,} (from a sample of {expected.sampled_tokens:,})",
        f"time             {expected.seconds:.0f} s",
        f"memory           {written_size(expected.memory)}",
        f"temporary files  {written_size(expected.temporary_bytes)}",
        f"store            {written_size(expected.store_bytes)}",
        f"free disk        {written_size(expected.free_bytes)}" + ("" if expected.fits else ", which is too little"),
    ]


def _tell(done: BuildReport, quiet: bool) -> None:
    """One line about what was done, and one for each thing that was left out."""
    if quiet:
        return
    if done.already_complete:
        print_lines([f"{done.path}: complete already, {done.total_documents:,} documents; nothing was done"])
        return
    read = done.read
    changed = f"{abs(read.documents):,} documents {'taken out' if read.documents < 0 else 'added'}"
    tokens = f", {read.tokens:,} tokens" if read.tokens else ""
    print_lines(
        [
            f"{done.path}: {changed}{tokens}; now {done.total_documents:,} documents, {done.pairs:,} pairs "
            f"({done.seconds:.1f} s)"
        ]
    )
    for number, what in (
        (read.dropped_tokens, "overlong tokens left out (--max-token)"),
        (read.replaced_bytes, "undecodable bytes replaced"),
        (read.repeated_documents, "repeated documents left out"),
        (read.repeated_paragraphs, "repeated paragraphs left out"),
    ):
        if number:
            remark(f"colloc: {number:,} {what}")
    if read.detected:
        chosen = ", ".join(f"{encoding} (files: {files:,})" for encoding, files in read.detected.items())
        remark(f"colloc: encoding detected, which is a guess: {chosen}; `colloc info` lists it by file")


def add(
    store: opt.StoreArgument,
    inputs: opt.InputArgument,
    input_format: Annotated[str | None, _INPUT_FORMAT] = None,
    encoding: Annotated[str | None, _ENCODING] = None,
    errors: Annotated[Errors | None, _ERRORS] = None,
    text_column: Annotated[str | None, _TEXT_COLUMN] = None,
    id_column: Annotated[str | None, _ID_COLUMN] = None,
    meta_from_path: Annotated[str | None, _META_FROM_PATH] = None,
    meta_table: Annotated[str | None, _META_TABLE] = None,
    meta_xpath: Annotated[list[str] | None, _META_XPATH] = None,
    skip_duplicates: Annotated[Duplicates | None, _SKIP_DUPLICATES] = None,
    max_record: Annotated[str | None, _MAX_RECORD] = None,
    max_unpacked: Annotated[str | None, _MAX_UNPACKED] = None,
    jobs: opt.JobsOption = None,
    memory: opt.MemoryOption = opt.DEFAULT_MEMORY,
    temp: opt.TempOption = None,
    quiet: opt.QuietOption = False,
) -> None:
    """Read more documents into a store and count only them.

    What is not said about reading is as it was when the store was built; an empty
    value, as in --meta-from-path '', switches a column, pattern or table off.
    """
    prefer_fast_sorting()
    from colloc.verbs import making

    given = {
        "format": input_format,
        "encoding": encoding,
        "errors": errors,
        "text_column": text_column,
        "id_column": id_column,
        "meta_from_path": meta_from_path,
        "meta_table": meta_table,
        "meta_xpath": tuple(meta_xpath) if meta_xpath else None,
        "skip_duplicates": skip_duplicates,
        "max_record": None if max_record is None else size_in_bytes(max_record),
        "max_unpacked": None if max_unpacked is None else size_in_bytes(max_unpacked),
    }
    changes: dict[str, Any] = {name: value or None for name, value in given.items() if value is not None}
    read = dataclasses.replace(making.reading_settings(store), **changes) if changes else None
    with ProgressLine(quiet=quiet) as progress:
        done = making.add(
            store,
            inputs,
            read=read,
            jobs=jobs,
            memory=opt.memory_bytes(memory),
            temp=temp,
            progress=progress,
        )
    _tell(done, quiet)


def remove(
    store: opt.StoreArgument,
    identifiers: Annotated[
        list[str] | None, typer.Argument(metavar="DOCUMENT", help="Identifiers of documents.")
    ] = None,
    where: opt.WhereOption = None,
    jobs: opt.JobsOption = None,
    memory: opt.MemoryOption = opt.DEFAULT_MEMORY,
    temp: opt.TempOption = None,
    quiet: opt.QuietOption = False,
) -> None:
    """Take documents out of a store, with their text, and count them out of its tables."""
    prefer_fast_sorting()
    from colloc.verbs import making

    with ProgressLine(quiet=quiet) as progress:
        done = making.remove(
            store,
            identifiers=identifiers or (),
            where=where or (),
            jobs=jobs,
            memory=opt.memory_bytes(memory),
            temp=temp,
            progress=progress,
        )
    _tell(done, quiet)


def merge(
    store: opt.StoreArgument,
    others: Annotated[list[Path], typer.Argument(metavar="OTHER", help="Stores to take in; they stay as they are.")],
    jobs: opt.JobsOption = None,
    memory: opt.MemoryOption = opt.DEFAULT_MEMORY,
    temp: opt.TempOption = None,
    quiet: opt.QuietOption = False,
) -> None:
    """Take the documents and counts of other stores into one that is there already.

    All must be built with the same settings; to leave every store as it is, copy one and merge into the copy.
    """
    prefer_fast_sorting()
    from colloc.verbs import making

    with ProgressLine(quiet=quiet) as progress:
        done = making.merge(store, others, jobs=jobs, memory=opt.memory_bytes(memory), temp=temp, progress=progress)
    _tell(done, quiet)


def register(app: typer.Typer) -> None:
    """Add the commands of this module."""
    for command in (build, add, remove, merge):
        app.command()(command)
