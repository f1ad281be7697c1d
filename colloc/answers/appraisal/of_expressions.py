"""Expressions with a label: what was accepted or rejected, or everything that is listed beside a list of entries."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray

from colloc.answers.appraisal.labelled import Labelled, Scores, check_both, decided
from colloc.answers.columns import Columns
from colloc.answers.concordance.matching import divided
from colloc.answers.expressions.given import LONGEST_GIVEN, given_expressions
from colloc.answers.expressions.measures import RANKS
from colloc.answers.expressions.ranking import expressions
from colloc.answers.expressions.settings import ExpressionOptions, resolve
from colloc.answers.judging.matters import OPEN
from colloc.errors import NotSeenError, UsageError
from colloc.records import FloatArray, Int64Array
from colloc.store import vocabulary
from colloc.store.connection import Store

CAN_RANK = (*RANKS, "split_low")
"""All by which expressions can be ranked; the lower end of the interval is the split that one can be sure of."""


@dataclass(frozen=True)
class LabelledExpressions(Labelled):
    """Expressions of adjacent words; see `Labelled`.

    Attributes
    ----------
    store : Store
    options : ExpressionOptions
        What is listed.
    texts : list of str
    numbers : Columns
        The measures of each.
    resources : dict
        Processes, memory and progress of further questions.
    """

    what: ClassVar[str] = "expressions"
    store: Store
    options: ExpressionOptions
    texts: list[str]
    numbers: Columns
    wanted: NDArray[np.bool_]
    listed: int
    passed_over: int
    from_list: bool
    resources: dict[str, Any]

    @property
    def groups(self) -> Int64Array:  # type: ignore[override]
        """The first word of each expression."""
        return np.unique([text.split(" ", 1)[0] for text in self.texts], return_inverse=True)[1].astype(np.int64)

    def measures(self, names: Sequence[str] | None) -> list[str]:
        """All of `CAN_RANK` when not given."""
        for name in names or ():
            if name not in CAN_RANK:
                raise UsageError(f"expressions are not ranked by {name!r}: choose from {', '.join(CAN_RANK)}")
        return list(CAN_RANK if names is None else dict.fromkeys(names))

    def scores(self, measures: Sequence[str]) -> Scores:
        """The measures themselves: of each the highest is the strongest."""
        return _values(self.numbers, measures)

    def settings(self, **more: Any) -> dict[str, Any]:
        """Those of the list of expressions."""
        left_out = ("rank", "slots", "pattern", "given", *(() if self.from_list else ("min_words", "max_words")))
        return {name: value for name, value in self.numbers.settings.items() if name not in left_out} | more

    def ranked(
        self, measures: Sequence[str], odds: Callable[[Scores], FloatArray], min_count: int, limit: int
    ) -> Columns:
        """expression, count, combined and wanted, of all that is listed."""
        found = self.numbers if self.from_list else _listed(self.store, self.options, self.resources)
        texts = self.texts if self.from_list else found["expression"].tolist()
        values, counts = odds(_values(found, measures)), found["count"]
        order = sorted(range(len(texts)), key=lambda place: (-values[place], -counts[place], texts[place]))[:limit]
        accepted = {text for text, wanted in zip(self.texts, self.wanted.tolist(), strict=True) if wanted}
        best = [texts[place] for place in order]
        columns = {
            "expression": best,
            "count": counts[order],
            "combined": values[order],
            "wanted": np.array([text in accepted for text in best], np.int64),
        }
        return Columns(columns, {**found.settings, "limit": limit})


def _values(numbers: Columns, measures: Sequence[str]) -> Scores:
    return {name: numbers[name].astype(np.float64) for name in measures}


def _listed(store: Store, options: ExpressionOptions, resources: dict[str, Any]) -> Columns:
    return expressions(store, options=options, show=CAN_RANK, limit=0, **resources)


def from_list(
    store: Store, listed: Iterable[Sequence[str]], options: ExpressionOptions, **resources: Any
) -> LabelledExpressions:
    """Everything that `colloc.answers.expressions.ranking.expressions` lists; what stands in the list is wanted.

    Entries of the list are divided into words as the store's text is, and brought to the form of the layer.
    """
    layer = resolve(store, options).layer
    gold = _as_texts(store, layer, listed)
    if not gold:
        raise UsageError("the list holds no expression of two words and more")
    numbers = _listed(store, options, resources)
    if not len(numbers):
        raise NotSeenError(f"{store.path}: no expression is listed; lower --min-count or keep more of them")
    texts = numbers["expression"].tolist()
    wanted = np.array([text in gold for text in texts], np.bool_)
    passed_over = len(gold) - int(wanted.sum())
    return LabelledExpressions(store, options, texts, numbers, wanted, len(gold), passed_over, True, resources)


def _as_texts(store: Store, layer: str, listed: Iterable[Sequence[str]]) -> set[str]:
    entries = [tuple(words) for words in listed]
    pieces = sorted({word for words in entries for word in words})
    parts = dict(zip(pieces, divided(store, layer, pieces), strict=True))
    found = set()
    for words in entries:
        whole = [vocabulary.brought_to(store, layer, part) for word in words for part in parts[word]]
        if len(whole) > 1:
            found.add(" ".join(whole))
    return found


def from_decisions(
    store: Store, options: ExpressionOptions, judge: str | None, **resources: Any
) -> LabelledExpressions:
    """The expressions that were accepted (wanted) or rejected.

    Those with open places, of words that the store does not have, that never occur, or are longer than can be looked
    up, are passed over.
    """
    layer = resolve(store, options).layer
    matters, wanted, listed = decided(store, "expression", layer, judge)
    sequences = [vocabulary.term_numbers(store, layer, list(one.words)).tolist() for one in matters]
    usable = [
        place
        for place, (one, terms) in enumerate(zip(matters, sequences, strict=True))
        if OPEN not in one.words and min(terms) >= 0 and len(terms) <= LONGEST_GIVEN
    ]
    check_both(store, wanted[usable], "expression", layer)
    numbers = given_expressions(store, [sequences[place] for place in usable], options, **resources)
    there = np.flatnonzero(numbers["count"] > 0)
    texts = [" ".join(matters[usable[place]].words) for place in there.tolist()]
    wanted = wanted[usable][there]
    check_both(store, wanted, "expression", layer)
    return LabelledExpressions(
        store, options, texts, numbers.take(there), wanted, listed, listed - len(texts), False, resources
    )
