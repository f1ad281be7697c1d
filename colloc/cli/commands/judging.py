"""``judge``, ``sheet`` and ``decisions``: what people accept and reject, recorded and listed."""

from __future__ import annotations

from collections import Counter
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, Literal

import typer

from colloc.cli import options as opt
from colloc.cli.output import Target, counted, deliver, deliver_bytes, remark
from colloc.cli.progress import ProgressLine
from colloc.errors import UsageError

if TYPE_CHECKING:
    from colloc.answers.judging.matters import Kind, Verdict

MORE_CANDIDATES = 200
_RECORDED_AS = {
    "pair": "a pair: the two words near each other, in any order",
    "directed": "a directed pair: the second word after the first",
    "expression": "an expression: the words in a row",
}
_NOWHERE: dict[Kind, str] = {
    "pair": "the two words never meet within reach of each other",
    "directed": "the second word never follows the first within reach",
    "expression": "never occurs in a row",
}
_COUNTED: dict[Kind, tuple[str, str]] = {
    "pair": ("pair", "pairs"),
    "directed": ("directed pair", "directed pairs"),
    "expression": ("expression", "expressions"),
}
"""Kinds of decisions in words, one and several."""
ByOption = Annotated[str | None, typer.Option("--by", metavar="NAME", help="Who decides.")]
KindOption = Annotated[
    Literal["pair", "directed", "expression"] | None,
    typer.Option("--kind", help="Two words in any order, the second after the first, or words in a row."),
]
WordsFromOption = Annotated[
    Path | None,
    typer.Option("--words-from", metavar="FILE", help="Candidates: the company of the words of this file."),
]
GivenOption = Annotated[
    Path | None,
    typer.Option(
        "--given", metavar="FILE", help="Candidates: the pairs and expressions of this file, or `first` and `second`."
    ),
]
ExpressionsOption = Annotated[
    bool, typer.Option("--expressions", help="Candidates: the ranking of expressions instead of pairs.")
]
CandidatesOption = Annotated[int, typer.Option("--limit", "-n", metavar="N", min=0, help="Candidates; 0 for all.")]
MinOption = Annotated[
    int | None, typer.Option("--min-count", metavar="N", min=0, help="Least joint count of candidates: 5 if not given.")
]


def judge(
    store: opt.StoreArgument,
    words: Annotated[
        list[str] | None,
        typer.Argument(metavar="X Y", help="A pair, or a quoted phrase: an expression such as 'by and large'."),
    ] = None,
    accept: Annotated[bool, typer.Option("--accept", help="It belongs in.")] = False,
    reject: Annotated[bool, typer.Option("--reject", help="It does not.")] = False,
    unsure: Annotated[bool, typer.Option("--unsure", help="To be decided later.")] = False,
    withdraw: Annotated[bool, typer.Option("--withdraw", help="As if NAME had not decided.")] = False,
    sense: Annotated[str, typer.Option("--sense", metavar="TEXT", help="What it means.")] = "",
    note: Annotated[str, typer.Option("--note", metavar="TEXT", help="Why.")] = "",
    label: Annotated[
        list[str] | None, typer.Option("--label", metavar="TEXT", help="A label; may be repeated.")
    ] = None,
    example: Annotated[
        list[str] | None,
        typer.Option("--example", metavar="DOC:OFFSET", help="A chosen line; OFFSET as `colloc lines -f csv` has it."),
    ] = None,
    by: ByOption = None,
    kind: KindOption = None,
    take: Annotated[
        Path | None,
        typer.Option("--from", metavar="FILE", help="Take a filled-in sheet, or decisions as JSON Lines."),
    ] = None,
    override: Annotated[
        bool, typer.Option("--override", help="With --from: rows win over decisions that they do not know of.")
    ] = False,
    words_from: WordsFromOption = None,
    given: GivenOption = None,
    expressions: ExpressionsOption = False,
    again: Annotated[bool, typer.Option("--again", help="By keys: also what NAME has decided already.")] = False,
    measure: opt.MeasureOption = None,
    layer: opt.LayerOption = None,
    window: opt.WindowOption = None,
    directed: opt.DirectedOption = False,
    where: opt.WhereOption = None,
    min_count: MinOption = None,
    limit: CandidatesOption = 50,
    quiet: opt.QuietOption = False,
) -> None:
    """Accept or reject pairs and expressions: one here, many by keys, or from a filled-in sheet.

    With words and a verdict one decision is recorded: of two words as a pair, of a
    quoted phrase or more words as an expression, unless --kind says otherwise; what
    was recorded is told. Without words the candidates
    are shown one after another, each with its numbers and lines, and one key decides.
    Nothing is overwritten: `colloc decisions --history` shows all that was decided.
    """
    from colloc.verbs import judging

    flags: dict[Verdict, bool] = {"accept": accept, "reject": reject, "unsure": unsure, "withdrawn": withdraw}
    chosen = [verdict for verdict, given_flag in flags.items() if given_flag]
    if take is not None:
        if words or chosen:
            raise UsageError("--from takes decisions from a file: leave out words and verdicts")
        _take(store, take, by, override, quiet)
        return
    if words:
        if len(chosen) != 1:
            raise UsageError("give one of --accept, --reject, --unsure and --withdraw")
        made = judging.judge(
            store,
            words,
            chosen[0],
            by=judging.check_judge(by),
            sense=sense,
            note=note,
            labels=label or (),
            examples=example or (),
            kind=kind,
            layer=layer,
        )
        remark(
            f"{' '.join(made.words)}: {made.verdict}, by {made.judge}; recorded as {_RECORDED_AS[made.kind]}",
            quiet=quiet,
        )
        if made.verdict != "withdrawn" and not judging.occurrences(store, made):
            remark(f"{' '.join(made.words)}: {_NOWHERE[made.kind]} in this store", quiet=quiet)
        return
    if chosen or sense or note or label or example:
        raise UsageError("say what is decided: X Y, or a quoted phrase")
    ranking = opt.one_ranking(measure)
    _by_keys(
        store,
        judging.check_judge(by),
        _choice(words_from, given)
        | {
            "kind": kind,
            "expressions": expressions,
            "again": again,
            "measure": ranking,
            "layer": layer,
            "window": window,
            "directed": directed,
            "where": where or (),
            "min_count": min_count,
            "limit": limit,
        },
        quiet,
    )


def _choice(words_from: Path | None, given: Path | None) -> dict[str, Any]:
    from colloc.cli.tables_in import read_lines
    from colloc.cli.word_lists import read_matters

    if words_from is not None and given is not None:
        raise UsageError("--words-from and --given contradict each other: give one of them")
    found: dict[str, Any] = {"words": read_lines(words_from) if words_from is not None else []}
    found["given"] = read_matters(given) if given is not None else []
    return found


def _take(store: Path, path: Path, by: str | None, override: bool, quiet: bool) -> None:
    from colloc.cli.sheets_in import decision_records, is_json_lines, sheet_rows
    from colloc.verbs import judging

    if is_json_lines(path):
        added = judging.take_decisions(store, decision_records(path))
        remark(counted(added, "new decision", "new decisions"), quiet=quiet)
        return
    filled = judging.take_sheet(store, sheet_rows(path), by=by or "", override=override)
    kinds = Counter(one.kind for one in filled.decisions)
    told = ", ".join(counted(kinds[kind], *names) for kind, names in _COUNTED.items() if kinds[kind])
    recorded = counted(len(filled.decisions), "decision", "decisions")
    remark(
        f"{recorded} recorded{f' ({told})' if told else ''}, {filled.unchanged} unchanged, {filled.empty} open",
        quiet=quiet,
    )
    for conflict in filled.conflicts:
        remark(f"overridden: {conflict}", quiet=quiet)


def _by_keys(store: Path, by: str, choice: dict[str, Any], quiet: bool) -> None:
    from colloc.cli.judging_keys import check_terminal, run

    check_terminal()
    from colloc.verbs import judging

    with ProgressLine(quiet=quiet) as progress:
        rows, measures = judging.candidates(store, by=by, progress=progress, **choice)
    run(store, by, rows, measures)


def sheet(
    store: opt.StoreArgument,
    words_from: WordsFromOption = None,
    given: GivenOption = None,
    expressions: ExpressionsOption = False,
    by: Annotated[
        str | None, typer.Option("--by", metavar="NAME", help="Who will decide; earlier decisions are filled in.")
    ] = None,
    kind: KindOption = None,
    open_only: Annotated[bool, typer.Option("--open", help="Only what NAME has not decided.")] = False,
    lines: Annotated[int, typer.Option("--lines", metavar="N", min=0, help="Example lines beside each row.")] = 3,
    measure: opt.MeasureOption = None,
    show: opt.ShowOption = None,
    layer: opt.LayerOption = None,
    window: opt.WindowOption = None,
    directed: opt.DirectedOption = False,
    where: opt.WhereOption = None,
    min_count: MinOption = None,
    limit: Annotated[
        int, typer.Option("--limit", "-n", metavar="N", min=0, help="Candidates; 0 for all.")
    ] = MORE_CANDIDATES,
    format: Annotated[
        Literal["csv", "tsv", "xlsx"] | None,
        typer.Option("--format", "-f", help="By the ending of FILE when not given, else csv."),
    ] = None,
    output: opt.OutputOption = None,
    quiet: opt.QuietOption = False,
) -> None:
    """Write candidates as a sheet to fill in; `colloc judge STORE --from FILE` takes it back.

    Fill in verdict (accept, reject, unsure), sense, note, labels (separated by ;) and
    examples (numbers of lines, or DOC:OFFSET). Rows may be sorted, filtered and deleted.
    """
    from colloc.verbs import judging

    ranking = opt.one_ranking(measure)
    ending = output.suffix.lower() if output is not None else ""
    chosen = format or ("xlsx" if ending == ".xlsx" else "tsv" if ending == ".tsv" else "csv")
    with ProgressLine(quiet=quiet) as progress:
        answer = judging.sheet(
            store,
            by=by or "",
            lines=lines,
            kind=kind,
            expressions=expressions,
            again=not open_only,
            measure=ranking,
            show=opt.shown_measures(show),
            layer=layer,
            window=window,
            directed=directed,
            where=where or (),
            min_count=min_count,
            limit=limit,
            progress=progress,
            **_choice(words_from, given),
        )
    if chosen == "xlsx":
        from colloc.exports.workbooks import sheet_workbook

        deliver_bytes(sheet_workbook(answer), answer.settings, Target("csv", output, quiet), "sheet")
        return
    deliver(answer, Target(chosen, output, quiet), "sheet")


def decisions(
    store: opt.StoreArgument,
    by: Annotated[str | None, typer.Option("--by", metavar="NAME", help="Only of this judge.")] = None,
    history: Annotated[bool, typer.Option("--history", help="All that was ever decided.")] = False,
    agreement: Annotated[bool, typer.Option("--agreement", help="Cohen's kappa of each two judges.")] = False,
    disagreements: Annotated[bool, typer.Option("--disagreements", help="Only what judges disagree on.")] = False,
    limit: opt.LimitOption = 0,
    format: opt.FormatOption = "table",
    output: opt.OutputOption = None,
    quiet: opt.QuietOption = False,
) -> None:
    """List what was decided, by whom and when; or how far judges agree.

    With --history --format jsonl the file can be taken into another store by
    `colloc judge STORE --from FILE`, such as one that was built anew.
    """
    from colloc.verbs import judging

    if agreement + disagreements + history > 1:
        raise UsageError("give one of --history, --agreement and --disagreements")
    target = Target(format, output, quiet)
    if agreement:
        answer = judging.judge_agreement(store)
    else:
        answer = judging.decisions(store, by=by, history=history, disagreements=disagreements)
    more = len(answer) - limit if limit else 0
    if more > 0:
        answer = answer[:limit]
    if format in ("table", "parquet") and not agreement:
        from colloc.answers.judging.sheets import written_cells

        answer = written_cells(answer)
    deliver(answer, target, "decisions")
    if more > 0:
        remark(f"{counted(more, 'row', 'rows')} more: --limit 0 for all", quiet=quiet)


def register(app: typer.Typer) -> None:
    """Add the commands of this module."""
    for command in (judge, sheet, decisions):
        app.command()(command)
