"""Options that several commands share: the same idea has the same name and help everywhere."""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Annotated, Any, Literal, get_args

import typer

from colloc import settings
from colloc.cli.sizes import size_in_bytes, written_size
from colloc.errors import UsageError
from colloc.settings import Inside, Margins

Format = Literal["table", "csv", "tsv", "jsonl", "json", "parquet"]


def complete_measures(incomplete: str) -> list[str]:
    """Names of measures for shell completion, after those that stand before a comma."""
    from colloc.measures.catalogue import MEASURES

    return _completed(incomplete, ["joint", *MEASURES])


def complete_columns(incomplete: str) -> list[str]:
    """Names that ``--show`` takes of an answer with columns of sureness, for shell completion."""
    from colloc.answers.sureness.wishes import SHOWN_COLUMNS
    from colloc.measures.catalogue import MEASURES

    return _completed(incomplete, [*MEASURES, *SHOWN_COLUMNS, "all"])


def _completed(incomplete: str, names: Iterable[str]) -> list[str]:
    before, comma, begun = incomplete.rpartition(",")
    return [f"{before}{comma}{name}" for name in names if name.startswith(begun)]


def complete_rankings(context: typer.Context, incomplete: str) -> list[str]:
    """Names that ``--measure`` ranks by, with the margins given so far, for shell completion."""
    from colloc.measures.catalogue import MEASURES

    cells = context.params.get("margins") != "tokens"
    usable = [name for name, one in MEASURES.items() if one.tells != "error" and (cells or not one.needs_cells)]
    return [name for name in ("joint", *usable) if name.startswith(incomplete)]


def split_names(values: Iterable[str] | None) -> list[str] | None:
    """``--show pmi,g2 --show dice`` as one list without repeats; None where the option was not given."""
    if not values:
        return None
    names = [name.strip() for value in values for name in value.split(",")]
    return list(dict.fromkeys(name for name in names if name))


def shown_measures(values: Iterable[str] | None) -> list[str] | None:
    """Names given with ``--show``, ``all`` standing for the whole catalogue.

    Raises
    ------
    UsageError
        For an unknown name, with the nearest known one.
    """
    return _shown(values, ())


def shown_columns(values: Iterable[str] | None) -> list[str] | None:
    """The same where word frequencies and columns of sureness can be shown beside measures."""
    from colloc.answers.sureness.wishes import SHOWN_COLUMNS

    return _shown(values, SHOWN_COLUMNS)


def _shown(values: Iterable[str] | None, others: Sequence[str]) -> list[str] | None:
    from colloc.measures.catalogue import MEASURES

    names = split_names(values)
    if names is None:
        return None
    if "all" in names:
        return [*MEASURES, *(name for name in names if name in others)]
    for name in names:
        _check_known(name, [*MEASURES, *others])
    return names


def one_ranking(values: Iterable[str] | None) -> str | None:
    """The one name given with ``--measure``; None where the option was not given.

    Raises
    ------
    UsageError
        For several names, and for one that is neither ``joint`` nor in the catalogue.
    """
    names = split_names(values)
    if names is None:
        return None
    if len(names) > 1:
        raise UsageError(
            f"--measure ranks by one measure, not by {' and '.join(names)}: add --show {','.join(names[1:])} to see "
            f"{'it' if len(names) == 2 else 'them'} beside {names[0]}"
        )
    name = names[0] if names else ""
    check_ranking(name)
    return name


def check_ranking(name: str) -> None:
    """Raise UsageError for a measure that is neither ``joint`` nor in the catalogue."""
    from colloc.measures.catalogue import MEASURES

    _check_known(name, ["joint", *MEASURES])


def _check_known(name: str, known: list[str]) -> None:
    if name not in known:
        near = difflib.get_close_matches(name, known, n=1)
        meant = f"did you mean {near[0]!r}? " if near else ""
        raise UsageError(f"unknown measure {name!r}; {meant}choose from {', '.join(known)}")


def read_words(words: Sequence[str], listed: Path | None) -> list[str]:
    """Words given as arguments, then those of a file, one a line.

    Raises
    ------
    UsageError
        Where there is no word at all.
    NoInputError, DataError
        Where the file is missing, or not UTF-8.
    """
    from colloc.cli.tables_in import read_lines

    found = [*words, *(read_lines(listed) if listed is not None else [])]
    if not found:
        raise UsageError("give at least one word, or a file of words with --words-from")
    return found


def check_plot(path: Path | None) -> None:
    """Raise UsageError for a picture that could not be written, before anything is counted."""
    if path is not None:
        from colloc.exports.pictures.canvas import picture_format

        picture_format(path)


def _option(*names: str, help: str, **more: Any) -> Any:
    return typer.Option(*names, help=help, **more)


StoreArgument = Annotated[Path, typer.Argument(metavar="STORE", help="The store: one SQLite file.")]
InputArgument = Annotated[
    list[str],
    typer.Argument(metavar="INPUT", help="Files, folders or quoted globs; - reads standard input."),
]

ENDINGS = {
    ".csv": "csv",
    ".tsv": "tsv",
    ".jsonl": "jsonl",
    ".json": "json",
    ".parquet": "parquet",
    ".html": "html",
}
"""Formats that the ending of a file stands for."""


def format_option(formats: Any) -> Any:
    """``--format`` of a command that writes the formats of this Literal: goes by FILE's ending when not given."""
    choices = get_args(formats)

    def by_ending(context: typer.Context, value: str) -> str:
        output = context.params.get("output")  # there already: options that are given are read before those left out
        source = context.get_parameter_source("format")
        given = source is not None and source.name != "DEFAULT"
        if given or output is None or context.resilient_parsing:
            return value
        wanted = ENDINGS.get(Path(output).suffix.lower(), value)
        if wanted not in choices:
            listed = ", ".join(choices)
            raise UsageError(f"{output}: {context.info_name} writes no {wanted}; choose --format from {listed}")
        return wanted

    shown = "How the result is written; by the ending of FILE when not given."
    return _option("--format", "-f", help=shown, callback=by_ending)


# Result
FormatOption = Annotated[Format, format_option(Format)]
OutputOption = Annotated[
    Path | None, _option("--output", "-o", help="Write to this file instead of standard output.", metavar="FILE")
]
QuietOption = Annotated[bool, _option("--quiet", "-q", help="No settings line, progress or remarks.")]
BesideOption = Annotated[
    bool, _option("--settings-beside", help="Also write the settings as JSON to FILE.settings.json; needs -o.")
]
PlotOption = Annotated[
    Path | None, _option("--plot", metavar="FILE", help="Also draw the answer into this file, .svg or .png.")
]
PlotListOption = Annotated[
    Literal["frequency", "network"] | None,
    _option(
        "--plot-as",
        help="frequency: strength against expected count, with the chance floors; network: one word and its company.",
    ),
]
WideOption = Annotated[
    bool, _option("--wide", help="All columns in the table, as files have them, however wide they are.")
]
LimitOption = Annotated[int, _option("--limit", "-n", metavar="N", min=0, help="Rows shown; 0 for all.")]

# Measures
MeasureOption = Annotated[
    list[str] | None,
    _option(
        "--measure",
        "-m",
        metavar="NAME",
        help="The measure that ranks, npmi when not given; joint ranks by how often two words meet.",
        autocompletion=complete_rankings,
    ),
]
"""A list, so that a second one is seen and refused: see `one_ranking`."""
ShowOption = Annotated[
    list[str] | None,
    _option(
        "--show",
        help="Measures to show, separated by commas or repeated; all for the whole catalogue.",
        metavar="NAMES",
        autocompletion=complete_measures,
    ),
]
ShowColumnsOption = Annotated[
    list[str] | None,
    _option(
        "--show",
        help="Measures to show, separated by commas or repeated, all for the whole catalogue; also first_count and "
        "second_count, the frequencies of the words, and columns of --sure.",
        metavar="NAMES",
        autocompletion=complete_columns,
    ),
]

# Which co-occurrences
LayerOption = Annotated[
    str | None,
    _option(
        "--layer",
        metavar="NAME",
        help="What counts as the same word: form (as written), fold (whatever the case), lemma, ...",
    ),
]
WindowOption = Annotated[
    int | None, _option("--window", "-w", metavar="N", help="How many words apart two words may stand, on either side.")
]
LeftOption = Annotated[
    int | None, _option("--left", metavar="N", help="The same for the left side alone; goes with --right.")
]
RightOption = Annotated[
    int | None, _option("--right", metavar="N", help="The same for the right side alone; goes with --left.")
]
UnitOption = Annotated[
    bool,
    _option(
        "--unit", help="Instead of windows: count the sentences, paragraphs or documents (--inside) with both words."
    ),
]
InsideOption = Annotated[
    Inside | None, _option("--inside", help="What both words stand in: no window reaches beyond it.")
]
MarginsOption = Annotated[
    Margins | None,
    _option(
        "--margins",
        help="What is one observation, and so what totals count: pairs of words, places in the text, or words.",
    ),
]
DirectedOption = Annotated[bool, _option("--directed", help="Count (x, y) only where y follows x.")]
NoSpanOption = Annotated[
    bool, _option("--no-span", help="With --margins tokens: divide by the number of words, not of pairs.")
]
WhereOption = Annotated[
    list[str] | None,
    _option(
        "--where",
        metavar="SLICE",
        help="Only documents with this metadata: key=value, key=a,b or key=1990..1999. Given again: both hold.",
    ),
]
RelationOption = Annotated[
    str | None,
    _option(
        "--relation",
        metavar="NAME",
        help="Pairs of head and dependent in this relation; nmod:* with subtypes, an empty name all together.",
    ),
]

# Thresholds
MinCountOption = Annotated[int, _option("--min-count", metavar="N", min=0, help="How often a row occurs at least.")]
MinWordCountOption = Annotated[
    int, _option("--min-word-count", metavar="N", min=0, help="Least frequency of each word shown.")
]
MinDocsOption = Annotated[
    int, _option("--min-docs", metavar="N", min=0, help="Least number of documents that hold the row.")
]
MinDocsOfPairOption = Annotated[
    int | None,
    _option(
        "--min-docs",
        metavar="N",
        min=0,
        help="Least number of documents that hold the row. When not given: 3 where 20 documents or more are asked "
        "about, else 1; 1 too with --min-count below 5, --limit 0, --avoid or --relation all.",
    ),
]
MinJointOption = Annotated[
    int | None,
    _option(
        "--min-count", metavar="N", min=0, help="How often two words meet at least: 5 when not given, 0 with --avoid."
    ),
]

# Sureness
SureOption = Annotated[
    bool, _option("--sure", help="Show how sure each row is: documents, intervals, q-values, chance floors.")
]
MaxQOption = Annotated[
    float | None,
    _option(
        "--max-q", metavar="Q", help="Largest q-value shown: the share of false findings to expect among all up to it."
    ),
]
AboveChanceOption = Annotated[
    Literal["order", "corpus"] | None,
    _option(
        "--above-chance",
        help="Only rows stronger than text shuffled in documents (order) or across all (corpus); see colloc floors. "
        "Rows so rarely expected that no floor is known for them do not pass.",
    ),
]
IntervalAboveOption = Annotated[
    float | None,
    _option("--interval-above", metavar="BITS", help="Only rows whose 95 % interval of PMI lies above this."),
]
AnyStrengthOption = Annotated[
    bool,
    _option(
        "--any-strength",
        help="Also pairs that meet as often as chance has it, or less; not only those that meet more often.",
    ),
]
AvoidOption = Annotated[
    bool, _option("--avoid", help="Instead: pairs that meet much less often than chance has it, or never.")
]
StopOption = Annotated[
    list[str] | None,
    typer.Option(
        "--stop",
        metavar="LANG|FILE|top:N|numbers",
        help="Leave these words out of the list: of a language, of a file (one a line), the N most frequent, or all "
        "without a letter.",
    ),
]
NoSelfOption = Annotated[bool, _option("--no-self", help="Leave out pairs of a word with itself, such as tut tut.")]
MinExpectedOption = Annotated[
    float,
    _option(
        "--min-expected",
        metavar="E",
        help="With --avoid: least expected count of a row that is shown.",
    ),
]

# Resources
JobsOption = Annotated[
    int | None, _option("--jobs", "-j", metavar="N", min=1, help="Processes; all cores when not given.")
]
MemoryOption = Annotated[str, _option("--memory", metavar="SIZE", help="Memory to stay below, all processes together.")]
TempOption = Annotated[
    str | None, _option("--temp", metavar="FOLDER", help="Folder for temporary files; the system's when not given.")
]

DEFAULT_MEMORY = written_size(settings.DEFAULT_MEMORY).replace(" ", "")


def memory_bytes(text: str) -> int:
    """The value of ``--memory``.

    Raises
    ------
    UsageError
        Where it is no size, or less than counting needs at all.
    """
    memory = size_in_bytes(text)
    if memory < settings.SMALLEST_MEMORY:
        raise UsageError(f"--memory must be at least {written_size(settings.SMALLEST_MEMORY)}, not {text}")
    return memory
