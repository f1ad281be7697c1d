"""Association of given pairs: as many as there are, in their order."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import cached_property
from itertools import repeat
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from colloc.answers.columns import Columns
from colloc.answers.questions import Question
from colloc.answers.tables import TOKEN_MARGIN_MEASURES
from colloc.errors import DataError
from colloc.measures.catalogue import MEASURES, compute_all
from colloc.measures.contingency import expected
from colloc.records import Int64Array
from colloc.settings import Margins
from colloc.store import vocabulary

_MANY = 4096
"""So many words at once are looked up in a table of the whole layer, read once."""


EXACT_TESTS = ("fisher_p", "fisher_log10_p")
"""Take some ten times as long as all other measures together: only when asked for by name."""


def scoring_measures(names: Sequence[str] | None, margins: Margins) -> tuple[str, ...]:
    """The measures asked for; when none are, all that the margins can bear but the exact tests."""
    if names is not None:
        return tuple(names)
    return TOKEN_MARGIN_MEASURES if margins == "tokens" else tuple(name for name in MEASURES if name not in EXACT_TESTS)


class Scorer:
    """Scores pairs part by part against one table.

    Parameters
    ----------
    question : Question
    names : sequence of str
        Measures of the catalogue.
    """

    def __init__(self, question: Question, names: Sequence[str]) -> None:
        self._question = question
        self._names = tuple(names)
        self.settings = question.settings(show=list(names))

    def score(self, table: Mapping[str, ArrayLike]) -> Columns:
        """The table with counts and measures appended; the columns ``first`` and ``second`` are needed.

        Returns
        -------
        Columns
            The table's own columns, then unknown (``first``, ``second`` or ``both`` where the layer has no such
            word, else empty), joint, first_total, second_total, total, expected and the measures. Where a word is
            unknown its total and the joint count are 0 and the measures are not numbers, while a known word beside
            it keeps its own total; where both words are known and never meet, the measures have their limits.

        Raises
        ------
        DataError
            Where one of the two columns is missing.
        """
        columns = Columns(table)
        missing = [name for name in ("first", "second") if name not in columns]
        if missing:
            raise DataError(f"no column {' and no column '.join(missing)}; there are {', '.join(columns.names)}")
        first = self._numbers(columns["first"].tolist())
        second = self._numbers(columns["second"].tolist())
        known = (first >= 0) & (second >= 0)
        rows = np.flatnonzero(known)
        reader = self._question.reader
        found = reader.given(first[rows].astype(np.uint32), second[rows].astype(np.uint32))
        counts = {
            name: _spread(getattr(found, name), rows, len(first)) for name in ("joint", "first_total", "second_total")
        }
        for name, terms, totals in (
            ("first_total", first, reader.first_totals()),
            ("second_total", second, reader.second_totals()),
        ):
            lone = np.flatnonzero(~known & (terms >= 0))
            if len(lone):
                counts[name][lone] = totals[terms[lone]]
        total = np.full(len(first), reader.total)
        halved = np.flatnonzero(found.total != reader.total)
        if len(halved):
            total = total.astype(np.float64)
            total[rows[halved]] = found.total[halved]
        values = {"expected": expected(*found.arguments), **compute_all(self._names, *found.arguments)}
        measures = {name: _spread(value, rows, len(first), np.nan) for name, value in values.items()}
        return columns.adding({"unknown": _unknown(first, second), **counts, "total": total, **measures})

    def _numbers(self, words: list[Any]) -> Int64Array:
        texts = words if {*map(type, words)} <= {str} else [w if isinstance(w, str) else "" for w in words]
        # A word written as the layer writes it is found at once; the others are brought to its form one by one.
        known = self._every_term if len(texts) >= _MANY else {}
        numbers = np.fromiter(map(known.get, texts, repeat(-1)), np.int64, len(texts))
        others = np.flatnonzero(numbers < 0).tolist()
        distinct = list(dict.fromkeys(texts[place] for place in others))
        store, layer = self._question.store, self._question.layer
        found = dict(zip(distinct, vocabulary.term_numbers(store, layer, distinct).tolist(), strict=True))
        numbers[others] = [found[texts[place]] for place in others]
        return numbers

    @cached_property
    def _every_term(self) -> dict[str, int]:
        texts = vocabulary.term_texts(self._question.store, self._question.layer)
        return {text: number for number, text in enumerate(texts)}


def _spread(values: np.ndarray, rows: Int64Array, length: int, empty: float = 0) -> np.ndarray:
    """``values`` at ``rows`` of an array of ``length``, ``empty`` elsewhere."""
    if len(rows) == length:
        return values
    whole = np.full(length, empty, dtype=values.dtype)
    whole[rows] = values
    return whole


def _unknown(first: Int64Array, second: Int64Array) -> np.ndarray:
    words = np.array(["", "first", "second", "both"], dtype=object)
    marks: np.ndarray = words[(first < 0) + 2 * (second < 0)]
    return marks
