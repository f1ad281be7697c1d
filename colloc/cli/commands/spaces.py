"""``matrix``, ``vectors`` and ``similar``: words as rows of numbers."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from colloc.cli import groups
from colloc.cli import options as opt
from colloc.cli.output import Target, deliver, print_lines, remark, settings_line
from colloc.cli.progress import ProgressLine

OutputFile = Annotated[
    Path,
    typer.Option(
        "--output",
        "-o",
        metavar="FILE",
        help="Written to: .npz (scipy), .mtx (Matrix Market) or .arrow; without an ending .npz and .mtx.",
    ),
]
ShiftOption = Annotated[
    float, typer.Option("--shift", metavar="K", help="Take log2 K off before the cut at 0; 1 leaves PPMI.")
]
SmoothingOption = Annotated[
    float, typer.Option("--smoothing", metavar="A", help="Raise the totals of the contexts to this power, 0 to 1.")
]
WeightingOption = Annotated[
    Literal["flat", "harmonic", "linear"],
    typer.Option("--weighting", help="What a pair at distance d of a window of w counts: 1, 1/d, or (w+1-d)/w."),
]
RowsFromOption = Annotated[
    Path | None, typer.Option("--rows-from", metavar="FILE", help="Rows are the words of this file, one a line.")
]
ContextsFromOption = Annotated[
    Path | None,
    typer.Option("--contexts-from", metavar="FILE", help="Contexts are the words of this file, one a line."),
]
MinRowOption = Annotated[
    int, typer.Option("--min-row-count", metavar="N", min=1, help="Rows are words seen at least so often.")
]
MinContextOption = Annotated[
    int, typer.Option("--min-context-count", metavar="N", min=1, help="Contexts are words seen at least so often.")
]
LeastRowOption = Annotated[
    int | None,
    typer.Option(
        "--min-row-count", metavar="N", min=1, help="Rows are words seen at least so often; 5 when not given."
    ),
]
LeastContextOption = Annotated[
    int | None,
    typer.Option(
        "--min-context-count", metavar="N", min=1, help="Contexts are words seen at least so often; 5 when not given."
    ),
]
ReliableRowOption = Annotated[
    int | None,
    typer.Option(
        "--min-row-count",
        metavar="N",
        min=1,
        help="Words compared are those seen at least so often; when not given 50, in small texts 20.",
    ),
]
ReliableContextOption = Annotated[
    int | None,
    typer.Option(
        "--min-context-count",
        metavar="N",
        min=1,
        help="Contexts are words seen at least so often; when not given 50, in small texts 20.",
    ),
]
MostRowsOption = Annotated[
    int | None, typer.Option("--most-rows", metavar="N", min=1, help="Rows are the N most frequent words.")
]
MostContextsOption = Annotated[
    int | None, typer.Option("--most-contexts", metavar="N", min=1, help="Contexts are the N most frequent words.")
]

ContextLayerOption = Annotated[
    str | None,
    typer.Option(
        "--context-layer", metavar="NAME", help="Layer of the contexts, when it is another than that of the rows."
    ),
]


def listed(path: Path | None) -> list[str] | None:
    """The words of a file, or None without one."""
    return None if path is None else opt.read_words((), path)


def matrix(
    store: opt.StoreArgument,
    *,
    output: OutputFile,
    value: Annotated[
        Literal["ppmi", "npmi", "g2", "count"], typer.Option("--value", help="What the cells hold.")
    ] = "ppmi",
    shift: ShiftOption = 1.0,
    smoothing: SmoothingOption = 1.0,
    weighting: WeightingOption = "flat",
    rows_from: RowsFromOption = None,
    contexts_from: ContextsFromOption = None,
    min_row_count: MinRowOption = 1,
    min_context_count: MinContextOption = 1,
    most_rows: MostRowsOption = None,
    most_contexts: MostContextsOption = None,
    context_layer: ContextLayerOption = None,
    counting: groups.Measured,
    min_count: Annotated[float, typer.Option("--min-count", metavar="N", min=0, help="Least joint count kept.")] = 1,
    min_value: Annotated[
        float | None, typer.Option("--min-value", metavar="V", help="Least value of a cell kept.")
    ] = None,
    resources: groups.Resources,
    quiet: opt.QuietOption = False,
) -> None:
    """Write the sparse matrix of a table: words as rows, their company as columns.

    Labels and settings stand beside it as FILE.labels.json and FILE.settings.json.
    """
    from colloc.verbs import spaces

    with ProgressLine(quiet=quiet) as progress:
        made = spaces.matrix(
            store,
            output,
            value=value,
            shift=shift,
            smoothing=smoothing,
            weighting=weighting,
            rows=listed(rows_from),
            contexts=listed(contexts_from),
            min_row_count=min_row_count,
            min_context_count=min_context_count,
            most_rows=most_rows,
            most_contexts=most_contexts,
            context_layer=context_layer,
            **counting.asked(),
            min_count=min_count,
            min_value=min_value,
            **resources.asked(),
            progress=progress,
        )
    remark(settings_line("matrix", made.settings), quiet=quiet)
    if not quiet:
        print_lines([f"{output}: {len(made.rows)} rows, {len(made.columns)} columns, {made.values.nnz} cells"])


VECTOR_SMOOTHING = 0.75


def vectors(
    store: opt.StoreArgument,
    *,
    output: Annotated[
        Path | None,
        typer.Option(
            "--output", "-o", metavar="FILE", help="Written to: .npy or .txt; without an ending both. Labels beside it."
        ),
    ] = None,
    evaluate: Annotated[
        list[Path] | None,
        typer.Option(
            "--evaluate",
            metavar="FILE",
            help="Correlate cosines with judged pairs: two words and a number a line. Repeatable.",
        ),
    ] = None,
    dimensions: Annotated[
        int, typer.Option("--dimensions", "-d", metavar="N", min=1, help="Numbers in a vector.")
    ] = 300,
    power: Annotated[
        float, typer.Option("--power", metavar="P", help="Power of the singular values: 1, 0.5 or 0.")
    ] = 0.5,
    join_contexts: Annotated[
        bool, typer.Option("--join-contexts", help="Add the vector of the same word as a context.")
    ] = False,
    seed: Annotated[int, typer.Option("--seed", metavar="N", min=0, help="Equal seeds give equal vectors.")] = 0,
    shift: ShiftOption = 1.0,
    smoothing: SmoothingOption = VECTOR_SMOOTHING,
    weighting: WeightingOption = "flat",
    rows_from: RowsFromOption = None,
    contexts_from: ContextsFromOption = None,
    min_row_count: LeastRowOption = None,
    min_context_count: LeastContextOption = None,
    most_rows: MostRowsOption = None,
    most_contexts: MostContextsOption = None,
    context_layer: ContextLayerOption = None,
    counting: groups.Counted,
    min_count: Annotated[float, typer.Option("--min-count", metavar="N", min=0, help="Least joint count used.")] = 1,
    resources: groups.Resources,
    format: opt.FormatOption = "table",
    quiet: opt.QuietOption = False,
) -> None:
    """Write word vectors: the leading dimensions of the matrix of positive PMI.

    With --evaluate, how they agree with people is printed: Spearman's correlation, its interval and coverage.
    """
    from colloc.cli.tables_in import judged_rows
    from colloc.errors import UsageError
    from colloc.verbs import spaces

    if output is None and not evaluate:
        raise UsageError("name a file with -o, or lists of judged pairs with --evaluate")
    lists = {str(path): judged_rows(path) for path in evaluate or ()}
    with ProgressLine(quiet=quiet) as progress:
        made = spaces.vectors(
            store,
            output,
            dimensions=dimensions,
            power=power,
            join_contexts=join_contexts,
            seed=seed,
            shift=shift,
            smoothing=smoothing,
            weighting=weighting,
            rows=listed(rows_from),
            contexts=listed(contexts_from),
            min_row_count=min_row_count,
            min_context_count=min_context_count,
            most_rows=most_rows,
            most_contexts=most_contexts,
            context_layer=context_layer,
            **counting.asked(),
            min_count=min_count,
            **resources.asked(),
            progress=progress,
        )
    if lists:
        deliver(spaces.agreement(made, lists), Target(format, None, quiet), "vectors")
        return
    remark(settings_line("vectors", made.settings), quiet=quiet)
    if not quiet:
        print_lines([f"{output}: {len(made)} words, {dimensions} dimensions"])


def similar(
    store: opt.StoreArgument,
    *,
    words: Annotated[list[str] | None, typer.Argument(metavar="WORD", help="Words asked for.")] = None,
    words_from: Annotated[
        Path | None, typer.Option("--words-from", metavar="FILE", help="Also the words of this file, one a line.")
    ] = None,
    vectors: Annotated[
        Path | None,
        typer.Option("--vectors", metavar="FILE", help="Compare these vectors (.npy) instead of PPMI rows."),
    ] = None,
    shift: ShiftOption = 1.0,
    smoothing: SmoothingOption = VECTOR_SMOOTHING,
    weighting: WeightingOption = "flat",
    min_row_count: ReliableRowOption = None,
    min_context_count: ReliableContextOption = None,
    context_layer: ContextLayerOption = None,
    counting: groups.Counted,
    limit: Annotated[
        int, typer.Option("--limit", "-n", metavar="N", min=0, help="Rows shown for each word; 0 for all.")
    ] = 20,
    resources: groups.Resources,
    result: groups.Result,
) -> None:
    """List the words that keep the same company as a word, with the contexts that they share."""
    from colloc.verbs import spaces

    asked = opt.read_words(words or [], words_from)
    target = result.target()
    with ProgressLine(quiet=result.quiet) as progress:
        answer = spaces.similar(
            store,
            asked,
            vectors=vectors,
            shift=shift,
            smoothing=smoothing,
            weighting=weighting,
            min_row_count=min_row_count,
            min_context_count=min_context_count,
            context_layer=context_layer,
            **counting.asked(),
            limit=limit,
            **resources.asked(),
            progress=progress,
        )
    deliver(answer, target, "similar")


def register(app: typer.Typer) -> None:
    """Add the commands of this module."""
    for command in (matrix, vectors, similar):
        app.command()(command)
