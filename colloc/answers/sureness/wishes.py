"""What a question asks for beside measures: word frequencies, columns of sureness, and what rows must reach."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

from colloc.answers.sureness.floors import SHUFFLES, Shuffle
from colloc.errors import UsageError
from colloc.store import documents, slices
from colloc.store.connection import Store

USUAL_DOCUMENTS = 3
"""Documents that must hold a row of a list of the strongest where nobody said how many."""
ENOUGH_DOCUMENTS = 20
"""Documents from which on that many are asked for."""
WORD_COLUMNS = ("first_count", "second_count")
"""Frequencies of the two words in the documents asked about, in tokens: margins count pairs."""
DOCUMENT_COLUMNS = ("documents", "dp_norm")
INTERVAL_COLUMNS = ("pmi_low", "pmi_high", "sound")
FORMULA_COLUMNS = ("formula_low", "formula_high")
Q_COLUMNS = ("q_value",)
FLOOR_COLUMNS = ("corpus_floor", "above_corpus", "order_floor", "above_order")
SURE_COLUMNS = (*DOCUMENT_COLUMNS, *INTERVAL_COLUMNS, *FORMULA_COLUMNS, *Q_COLUMNS, *FLOOR_COLUMNS)
"""All columns of sureness, in the order in which they are shown."""
SHOWN_COLUMNS = (*WORD_COLUMNS, *SURE_COLUMNS)
"""All that can be shown beside measures."""
CELL_COLUMNS = (*FORMULA_COLUMNS, *Q_COLUMNS)
"""Those that need the cells of a table, which margins of tokens do not have."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Wishes:
    """Sureness asked for.

    Parameters
    ----------
    columns : sequence of str
        Names of `SHOWN_COLUMNS`.
    everything : bool
        All columns of sureness that the margins can bear.
    min_docs : int or None
        Least number of documents that hold the pair; None: as many as `settled` says.
    max_q : float
        Largest q-value.
    above_chance : "order" or "corpus"
        The floor that the measure must exceed.
    interval_above : float
        What the lower end of the document-resampled interval of PMI must exceed, in bits.
    """

    columns: Sequence[str] = ()
    everything: bool = False
    min_docs: int | None = None
    max_q: float | None = None
    above_chance: Shuffle | None = None
    interval_above: float | None = None

    def __post_init__(self) -> None:
        unknown = [name for name in self.columns if name not in SHOWN_COLUMNS]
        if unknown:
            raise UsageError(f"unknown column {unknown[0]!r}: choose from {', '.join(SHOWN_COLUMNS)}")
        if self.max_q is not None and not 0 < self.max_q <= 1:
            raise UsageError(f"max_q must be above 0 and at most 1, not {self.max_q}")
        if self.above_chance is not None and self.above_chance not in SHUFFLES:
            raise UsageError(f"above_chance must be one of {', '.join(SHUFFLES)}, not {self.above_chance!r}")
        if self.interval_above is not None and math.isnan(self.interval_above):
            raise UsageError("interval_above must be a number of bits")

    @property
    def late(self) -> bool:
        """Whether rows must reach something that only a pass over the text can tell."""
        return self.least_documents > 1 or self.interval_above is not None

    @property
    def least_documents(self) -> int:
        """What ``min_docs`` amounts to."""
        return 1 if self.min_docs is None else self.min_docs

    def tests(self, margins: str) -> bool:
        """Whether q-values are needed."""
        return "q_value" in self.shown(margins)

    def shown(self, margins: str, kind: str = "window") -> tuple[str, ...]:
        """Columns to show, in their fixed order: those asked for, and those that rows must reach.

        Raises
        ------
        UsageError
            Where one was asked for that these margins, or a tally of this kind, cannot bear.
        """
        if self.everything:
            wanted = {name for name in SURE_COLUMNS if margins != "tokens" or name not in CELL_COLUMNS}
        else:
            wanted = set()
        wanted |= set(self.columns)
        if self.least_documents > 1:
            wanted.add("documents")
        if self.max_q is not None:
            wanted |= set(Q_COLUMNS)
        if self.above_chance is not None:
            wanted |= {f"{self.above_chance}_floor", f"above_{self.above_chance}"}
        if self.interval_above is not None:
            wanted |= set(INTERVAL_COLUMNS)
        if kind == "relation" and self.everything:
            wanted -= set(FLOOR_COLUMNS)
        if kind == "relation" and (wanted & set(FLOOR_COLUMNS) or self.above_chance is not None):
            raise UsageError("chance floors come from shuffled text, which has no relations: ask without them")
        if margins == "tokens" and wanted & set(CELL_COLUMNS):
            name = next(name for name in CELL_COLUMNS if name in wanted)
            raise UsageError(
                f"{name} needs the cells of a table, which margins tokens does not have: use margins pairs"
            )
        return tuple(name for name in SHOWN_COLUMNS if name in wanted)


def settled(wishes: Wishes, store: Store, where: str, usual: bool) -> Wishes:
    """The wishes with ``min_docs`` as it is when nobody said it.

    A list of the strongest from `ENOUGH_DOCUMENTS` documents or more shows what `USUAL_DOCUMENTS` of them hold:
    measures of strength put first what one document repeats. Elsewhere everything is shown.

    Parameters
    ----------
    where : str
        The slice asked about, whose documents count.
    usual : bool
        Whether the answer is a list of the strongest: not of all, of what keeps apart, or of rarer pairs than usual.
    """
    if wishes.min_docs is not None or not usual:
        return wishes
    n_documents = len(slices.select(store, where)) if where else documents.document_count(store)
    return replace(wishes, min_docs=USUAL_DOCUMENTS if n_documents >= ENOUGH_DOCUMENTS else None)


def divided(show: Sequence[str] | None, wishes: Wishes | None) -> tuple[Sequence[str] | None, Wishes]:
    """Names to show as names of measures, and as wishes that hold the other columns among them."""
    wishes = wishes or Wishes()
    if show is None:
        return None, wishes
    others = [name for name in show if name in SHOWN_COLUMNS]
    measures = [name for name in show if name not in SHOWN_COLUMNS]
    # other columns alone are shown beside the usual measures
    return measures if measures or not others else None, replace(wishes, columns=(*wishes.columns, *others))
