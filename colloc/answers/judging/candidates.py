"""What there is to judge: from a ranking, from the company of some headwords, or from a list of pairs."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

from colloc.answers.around import around
from colloc.answers.columns import Columns
from colloc.answers.judging.figures import EXPRESSION_SCORE, Figures, figures
from colloc.answers.judging.matters import Matter, make_matter
from colloc.answers.pairs import pairs
from colloc.answers.questions import PairOptions, measure_names, resolve_spec
from colloc.errors import UsageError
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT
from colloc.store.connection import Store
from colloc.store.decisions import Decision, Kind, newest


@dataclass(frozen=True, slots=True, kw_only=True)
class Choice:
    """Which candidates.

    Parameters
    ----------
    words : sequence of str
        Headwords: the company of each, ``limit`` rows a word. Without them, and without ``given``, the ranking.
    given : sequence of sequences of str
        Pairs and expressions named one by one; ``limit`` and ``min_count`` do not matter.
    kind : {"pair", "directed", "expression"}, optional
        Of those given.
    expressions : bool
        The ranking of expressions instead of that of pairs.
    measure, show : as for pairs
    """

    words: Sequence[str] = ()
    given: Sequence[Sequence[str]] = ()
    kind: Kind | None = None
    expressions: bool = False
    measure: str | None = None
    show: Sequence[str] | None = None
    min_count: int | None = None
    limit: int = 50


@dataclass(frozen=True, slots=True)
class Candidate:
    """One matter, its numbers, and what the judge decided before (with its number in the history)."""

    matter: Matter
    figures: Figures
    number: int
    decision: Decision | None


def candidates(
    store: Store,
    choice: Choice,
    options: PairOptions | None = None,
    *,
    judge: str = "",
    again: bool = True,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> tuple[list[Candidate], tuple[str, ...]]:
    """Candidates in order, and the measures shown for pairs.

    Parameters
    ----------
    again : bool
        Also what this judge has decided already.

    Raises
    ------
    NotSeenError
        For a word that the store does not have.
    """
    options = options or PairOptions()
    _, margins = resolve_spec(store, options)
    _, measures = measure_names(choice.measure, choice.show, margins)
    found = list(_matters(store, choice, options, jobs=jobs, memory=memory, progress=progress))
    decided = {key: value for (key, who), value in newest(store).items() if who == judge and judge}
    decided = {key: value for key, value in decided.items() if value[1].verdict != "withdrawn"}
    unique = {matter.key: matter for matter in reversed(found)}
    chosen = [matter for matter in dict.fromkeys(unique[matter.key] for matter in found)]
    if not again:
        chosen = [matter for matter in chosen if matter.key not in decided]
    numbers = figures(store, chosen, measures, options, jobs=jobs, memory=memory, progress=progress)
    rows = []
    for matter, figure in zip(chosen, numbers, strict=True):
        number, decision = decided.get(matter.key, (0, None))
        rows.append(Candidate(matter, figure, number, decision))
    return rows, measures


def _matters(store: Store, choice: Choice, options: PairOptions, **resources: Any) -> Iterable[Matter]:
    if choice.given:
        yield from (make_matter(store, words, choice.kind, options.layer) for words in choice.given)
        return
    if choice.expressions:
        yield from _expressions(store, choice, options, **resources)
        return
    asked: dict[str, Any] = {
        "measure": choice.measure,
        "options": options,
        "min_count": choice.min_count,
        "limit": choice.limit,
        **resources,
    }
    answer: Columns = around(store, choice.words, **asked) if choice.words else pairs(store, **asked)
    kind: Kind = "directed" if options.directed else "pair"
    for first, second in zip(answer["first"].tolist(), answer["second"].tolist(), strict=True):
        yield Matter(answer.settings["layer"], kind, (first, second))


def _expressions(store: Store, choice: Choice, options: PairOptions, **resources: Any) -> Iterable[Matter]:
    from colloc.answers.expressions.ranking import expressions
    from colloc.answers.expressions.settings import ExpressionOptions

    if choice.words or choice.measure:
        raise UsageError("expressions have a ranking of their own: leave out words and measure")
    least = DEFAULT_MIN_COUNT if choice.min_count is None else choice.min_count
    wanted = ExpressionOptions(layer=options.layer, where=options.where, inside=options.inside, min_count=least)
    answer = expressions(store, options=wanted, show=(), limit=choice.limit, **resources)
    layer = answer.settings["layer"]
    for text in answer["expression"].tolist():
        yield make_matter(store, text.split(" "), "expression", layer)


def shown_scores(rows: Sequence[Candidate], measures: Sequence[str]) -> list[str]:
    """Names of the score columns that some row fills."""
    names = list(measures) if any(row.matter.kind != "expression" for row in rows) else []
    return names + ([EXPRESSION_SCORE] if any(row.matter.kind == "expression" for row in rows) else [])
