"""What there is to judge: from a ranking, from the company of some headwords, or from a list of pairs."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

from colloc.answers.around import around
from colloc.answers.columns import Columns
from colloc.answers.expressions.measures import MEASURES as EXPRESSION_MEASURES
from colloc.answers.expressions.measures import SHOWN as SHOWN_OF_EXPRESSIONS
from colloc.answers.judging.figures import Figures, figures, figures_of_expressions
from colloc.answers.judging.matters import Matter, make_matter
from colloc.answers.pairs import pairs
from colloc.answers.questions import PairOptions, measure_names, resolve_spec
from colloc.answers.sureness.wishes import Wishes
from colloc.errors import UsageError
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT
from colloc.store.connection import Store
from colloc.store.decisions import Decision, Key, Kind, newest


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
    resources: dict[str, Any] = {"jobs": jobs, "memory": memory, "progress": progress}
    ranked: dict[Key, tuple[Matter, Figures]] = {}
    if choice.expressions and not choice.given:
        ranked = _expressions(store, choice, options, **resources)
        found = [matter for matter, _ in ranked.values()]
    else:
        found = list(_matters(store, choice, options, **resources))
    decided = {key: value for (key, who), value in newest(store).items() if who == judge and judge}
    decided = {key: value for key, value in decided.items() if value[1].verdict != "withdrawn"}
    unique = {matter.key: matter for matter in reversed(found)}
    chosen = [matter for matter in dict.fromkeys(unique[matter.key] for matter in found)]
    if not again:
        chosen = [matter for matter in chosen if matter.key not in decided]
    if ranked:
        numbers = [ranked[matter.key][1] for matter in chosen]
    else:
        numbers = figures(store, chosen, measures, options, **resources)
    rows = []
    for matter, figure in zip(chosen, numbers, strict=True):
        number, decision = decided.get(matter.key, (0, None))
        rows.append(Candidate(matter, figure, number, decision))
    return rows, measures


def _matters(store: Store, choice: Choice, options: PairOptions, **resources: Any) -> Iterable[Matter]:
    if choice.given:
        yield from (make_matter(store, words, choice.kind, options.layer) for words in choice.given)
        return
    asked: dict[str, Any] = {
        "measure": choice.measure,
        "options": options,
        "min_count": choice.min_count,
        "limit": choice.limit,
        "wishes": Wishes(min_docs=1),
        **resources,
    }
    answer: Columns = around(store, choice.words, **asked) if choice.words else pairs(store, **asked)
    kind: Kind = "directed" if options.directed else "pair"
    for first, second in zip(answer["first"].tolist(), answer["second"].tolist(), strict=True):
        yield Matter(answer.settings["layer"], kind, (first, second))


def _expressions(
    store: Store, choice: Choice, options: PairOptions, **resources: Any
) -> dict[Key, tuple[Matter, Figures]]:
    """The ranking of expressions, in its order, with what it says of each."""
    from colloc.answers.expressions.ranking import expressions
    from colloc.answers.expressions.settings import ExpressionOptions

    if choice.words or choice.measure:
        raise UsageError("expressions have a ranking of their own: leave out words and measure")
    least = DEFAULT_MIN_COUNT if choice.min_count is None else choice.min_count
    wanted = ExpressionOptions(layer=options.layer, where=options.where, inside=options.inside, min_count=least)
    answer = expressions(store, options=wanted, show=tuple(EXPRESSION_MEASURES), limit=choice.limit, **resources)
    layer = answer.settings["layer"]
    matters = [make_matter(store, text.split(" "), "expression", layer) for text in answer["expression"].tolist()]
    numbers = figures_of_expressions(store, matters, answer, answer.settings["where"])
    return {matter.key: (matter, figure) for matter, figure in zip(matters, numbers, strict=True)}


def shown_scores(rows: Sequence[Candidate], measures: Sequence[str]) -> list[str]:
    """Names of the score columns that some row fills, of those that judges are shown."""
    names = list(measures) if any(row.matter.kind != "expression" for row in rows) else []
    there = {name for row in rows if row.matter.kind == "expression" for name in row.figures.scores}
    return names + [name for name in SHOWN_OF_EXPRESSIONS if name in there]
