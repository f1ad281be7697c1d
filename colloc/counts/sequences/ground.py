"""What counting of sequences goes by: the laid-out columns of one selection, and who does the work."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from colloc.counts.runs import RunFile
from colloc.counts.sequences.sharing import Facts
from colloc.counts.sequences.sharing_out import Shop, taken
from colloc.records import FloatArray, Int64Array


@dataclass(frozen=True, slots=True)
class Ground:
    """Columns of a selection, as tasks take them.

    Attributes
    ----------
    shop : Shop
    terms, room, marks : Column facts
        See `colloc.counts.sequences.sharing.lay_out`.
    documents, sizes : Column facts
        Place where each document begins, and its tokens.
    least_share : float
        Share of all tokens that the smallest document has.
    """

    shop: Shop
    terms: Facts
    room: Facts
    marks: Facts
    documents: Facts
    sizes: Facts
    least_share: float

    @property
    def folder(self) -> str:
        """Where tasks leave their files."""
        return str(self.shop.folder)

    def over_documents(
        self, runs: Sequence[RunFile], n: int, name: str
    ) -> tuple[Int64Array, Int64Array, FloatArray, FloatArray]:
        """How ``n`` numbered things lie in the documents, from runs of number << 32 | document, which are gone then.

        Returns
        -------
        documents, largest, dp, dp_norm
            As in `colloc.counts.sequences.levels.Spread`.
        """
        parts = self.shop.merge(
            "spread_sequences", self.shop.number_cuts(runs, n), {"sizes": self.sizes}, runs, f"{name}-spread"
        )
        none = np.empty(0, np.int64)
        documents, largest = (
            np.concatenate([none, *(taken(part[what]) for part in parts)]) for what in ("documents", "largest")
        )
        dp = np.concatenate([np.empty(0), *(taken(part["distance"]) for part in parts)]) / 2
        dp_norm = dp / (1 - self.least_share) if self.least_share < 1 else np.full(n, np.nan)
        return documents, largest, dp, dp_norm


def written_with_capitals(capitals: Int64Array, marked: Int64Array) -> FloatArray:
    """Share of the words that are written with a capital, of those that can tell; NaN where none can."""
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(marked > 0, capitals / marked, np.nan)
