"""What the catalogue says of a measure."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

from numpy.typing import ArrayLike

from colloc.measures.contingency import FloatArray, Rule, TableFunction


@dataclass(frozen=True, slots=True, kw_only=True)
class Measure:
    """What a measure of a pair is, and how to compute it.

    Attributes
    ----------
    formula : str
        In O (joint), R (first_total), C (second_total), N (total), E = R C / N, and the cells a = O, b = R - O,
        c = C - O, d = N - R - C + O.
    range : str
        Smallest and largest value, and what they mean.
    unit : str
        ``bits``, ``nats``, ``probability`` ... or ``none``.
    symmetric : bool
        Whether exchanging the two words leaves the value.
    needs_cells : bool
        Whether the four numbers must be one real table (all cells in the same unit, none negative). Only the PMI
        family does without: it may be given margins counted otherwise than the joint counts.
    strongest : "highest" or "lowest"
        Which end of the range is the strongest association: the end that a ranking begins with.
    tells : "strength", "chance", "condition" or "error"
        How strong the pair is; how probable such counts are by chance (p-values); a conditional probability; or how
        uncertain another measure is, which is nothing to rank by.
    over_rates, under_rates, misleads : str
        Which pairs rank too high, which too low, and when not to trust it.
    source : str
        Author, year, equation or section, DOI or anthology number.
    function : TableFunction
        The formula itself.
    """

    name: str
    title: str
    formula: str
    range: str
    unit: str
    symmetric: bool
    needs_cells: bool
    over_rates: str
    under_rates: str
    misleads: str
    source: str
    function: TableFunction = field(repr=False)
    strongest: Literal["highest", "lowest"] = "highest"
    tells: Literal["strength", "chance", "condition", "error"] = "strength"

    @property
    def rule(self) -> Rule:
        """The formula over a :class:`~colloc.measures.contingency.Table`."""
        return self.function.rule

    def compute(
        self, joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike
    ) -> FloatArray:
        """Values for counts that broadcast together, float64 of their common shape."""
        return self.function(joint, first_total, second_total, total)
