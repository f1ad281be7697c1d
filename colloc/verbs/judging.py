"""Verbs about decisions: record one, take filled-in sheets and lists, list them, compare judges."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from datetime import UTC, datetime
from typing import TYPE_CHECKING, Any

from colloc.errors import DataError, UsageError
from colloc.settings import DEFAULT_MEMORY, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, as_list, pair_options, reading, store_path

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.answers.judging.candidates import Candidate
    from colloc.answers.judging.sheets import Filled, SheetRow
    from colloc.store.decisions import Decision, Example, Kind, Verdict
    from colloc.store.opening import Store

MOST_PROBLEMS = 20
"""Rows named in one error message."""


def _now() -> str:
    return datetime.now(UTC).isoformat(timespec="milliseconds")


def judge(
    store: StorePath | Store,
    words: Sequence[str] | str,
    verdict: Verdict,
    *,
    by: str,
    sense: str = "",
    note: str = "",
    labels: Sequence[str] | str = (),
    examples: Sequence[str | Example] | str = (),
    kind: Kind | None = None,
    layer: str | None = None,
    decided: str | None = None,
) -> Decision:
    """Record one decision; what was decided before stays in the history.

    Parameters
    ----------
    words : sequence of str
        Two words, or an expression: more words, or one text such as "by and large".
    verdict : {"accept", "reject", "unsure", "withdrawn"}
    by : str
        Who decides.
    examples : sequence of str
        Chosen lines, ``DOCUMENT:OFFSET`` with the offset that ``lines`` gives as ``character``.
    kind : {"pair", "directed", "expression"}, optional
        ``pair`` for two words and ``expression`` for more when not given.
    decided : str, optional
        When, in ISO 8601; now when not given.

    Raises
    ------
    NotSeenError
        For a word that the store does not have, or a place where the words do not stand.
    """
    from colloc.answers.judging.examples import example_at, read_place
    from colloc.answers.judging.matters import make_matter
    from colloc.store.decisions import Decision, append
    from colloc.store.opening import open_for_writing

    with reading(store) as opened:
        matter = make_matter(opened, as_list(words), kind, layer)
        chosen = [examples] if isinstance(examples, str) else examples
        found = [example_at(opened, matter, *read_place(one)) if isinstance(one, str) else one for one in chosen]
    decision = Decision(
        matter.layer,
        matter.kind,
        matter.words,
        verdict,
        by.strip(),
        decided or _now(),
        sense=sense,
        note=note,
        labels=tuple(as_list(labels)),
        examples=tuple(found),
    )
    with open_for_writing(store_path(store), "judge") as writing, writing.transaction():
        append(writing, [decision])
    return decision


def occurrences(store: StorePath | Store, decision: Decision) -> int:
    """How often the words of a decision meet in the store, counted as it was built, or stand in a row there."""
    from colloc.answers.judging.figures import occurrences as count
    from colloc.answers.judging.matters import matter_of

    with reading(store) as opened:
        return count(opened, matter_of(decision))


def decisions(
    store: StorePath | Store, *, by: str | None = None, history: bool = False, disagreements: bool = False
) -> Columns:
    """The decisions that count, the whole history, or only those on which judges disagree."""
    from colloc.answers.judging import listing

    with reading(store) as opened:
        if disagreements:
            return listing.disagreements(opened)
        return listing.listed(opened, judge=by, history=history)


def judge_agreement(store: StorePath | Store) -> Columns:
    """Cohen's kappa of each two judges, over what both decided."""
    from colloc.answers.judging import listing

    with reading(store) as opened:
        return listing.agreement(opened)


def take_decisions(store: StorePath | Store, records: Iterable[tuple[str, Mapping[str, Any]]]) -> int:
    """Add decisions of another store, such as ``decisions(..., history=True).to_dicts()`` gives.

    Parameters
    ----------
    records : iterable of (place, record)
        ``place`` is named in errors.

    Returns
    -------
    int
        How many were new here.
    """
    from colloc.store.decisions import append, from_dict
    from colloc.store.opening import open_for_writing

    read = [from_dict(dict(record), place) for place, record in records]
    with open_for_writing(store_path(store), "judge") as writing, writing.transaction():
        return append(writing, read)


def candidates(
    store: StorePath | Store,
    *,
    words: Sequence[str] | str = (),
    given: Sequence[Sequence[str]] = (),
    kind: Kind | None = None,
    expressions: bool = False,
    by: str = "",
    again: bool = True,
    measure: str | None = None,
    show: Sequence[str] | None = None,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    where: Sequence[str] | str = (),
    min_count: int | None = None,
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> tuple[list[Candidate], tuple[str, ...]]:
    """What there is to judge, and the measures of pairs: a ranking, the company of ``words``, or what is ``given``.

    With ``expressions`` the ranking is that of expressions.

    Parameters
    ----------
    by : str
        Whose earlier decisions stand beside the candidates.
    again : bool
        Also what that judge has decided already.
    """
    from colloc.answers.judging.candidates import Choice
    from colloc.answers.judging.candidates import candidates as find

    options = pair_options(layer, window, left, right, False, inside, margins, directed, True, where, None)
    choice = Choice(
        words=as_list(words),
        given=given,
        kind=kind,
        expressions=expressions,
        measure=measure,
        show=show,
        min_count=min_count,
        limit=limit,
    )
    with reading(store) as opened:
        return find(opened, choice, options, judge=by, again=again, jobs=jobs, memory=memory, progress=progress)


def sheet(store: StorePath | Store, *, by: str = "", lines: int = 3, **choice: Any) -> Columns:
    """A sheet of candidates to fill in; the other parameters are those of `candidates`."""
    from colloc.answers.judging import sheets

    with reading(store) as opened:
        rows, measures = candidates(opened, by=by.strip(), **choice)
        return sheets.sheet(opened, rows, measures, by.strip(), lines)


def take_sheet(store: StorePath | Store, rows: Iterable[SheetRow], *, by: str = "", override: bool = False) -> Filled:
    """Record the decisions of a filled-in sheet: all of them, or none where a row cannot be taken.

    Parameters
    ----------
    override : bool
        Where a row contradicts a decision that it does not know of, the row wins.

    Raises
    ------
    DataError
        For rows that cannot be taken, and for conflicts; the message names each row.
    """
    from colloc.answers.judging.sheets import read_sheet
    from colloc.store.decisions import append
    from colloc.store.opening import open_for_writing

    listed = list(rows)
    if listed and not {"words", "verdict"} <= listed[0].cells.keys():
        raise DataError(f"{listed[0].place}: no sheet of candidates: the columns words and verdict are missing")
    with open_for_writing(store_path(store), "judge") as writing:
        filled = read_sheet(writing, listed, by.strip(), _now())
        problems = filled.problems + ([] if override else filled.conflicts)
        if problems:
            shown = "; ".join(problems[:MOST_PROBLEMS])
            more = f"; and {len(problems) - MOST_PROBLEMS} more" if len(problems) > MOST_PROBLEMS else ""
            raise DataError(f"{shown}{more}; nothing was recorded{_cure(filled)}")
        with writing.transaction():
            append(writing, filled.decisions)
    return filled


def _cure(filled: Filled) -> str:
    if not filled.conflicts:
        return ""
    if not filled.problems:
        return ": --override lets rows win"
    return ": --override lets rows win over decisions; what else is wrong must be put right"


def check_judge(by: str | None) -> str:
    """The name of the judge.

    Raises
    ------
    UsageError
        Where there is none.
    """
    if by is None or not by.strip():
        raise UsageError("say who decides: --by NAME")
    return by.strip()
