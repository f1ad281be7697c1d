"""The numbers an expression has: what each is called, how it is computed, and what it is good for."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class ExpressionMeasure:
    """One number of an expression.

    Attributes
    ----------
    name : str
        As in the columns of `expressions`.
    title, formula, unit : str
        For people, and for the formats that describe their properties.
    ranks : bool
        Whether a list can be sorted by it, highest first.
    bond : bool
        Whether it says how well the words hold together; the others say how they are spread and written.
    """

    name: str
    title: str
    formula: str
    unit: str
    ranks: bool = True
    bond: bool = True


_EACH = (
    ExpressionMeasure(
        "strength",
        "strength",
        "weakest split * log2(1 + occurrences outside the document with most of them) * completeness, the largest of "
        "the expression and the fragments folded into it",
        "bits",
    ),
    ExpressionMeasure(
        "weakest_split", "weakest split", "smallest log2(n N / (n_left n_right)) over the cuts in two", "bits"
    ),
    ExpressionMeasure(
        "split_low",
        "weakest split, lower end",
        "lower end of the 95 % interval of the weakest split: delete-a-group jackknife over documents",
        "bits",
        ranks=False,
        bond=False,
    ),
    ExpressionMeasure(
        "split_high", "weakest split, upper end", "upper end of that interval", "bits", ranks=False, bond=False
    ),
    ExpressionMeasure("specific_correlation", "specific correlation", "log2(p(x1 ... xn) / (p(x1) ... p(xn)))", "bits"),
    ExpressionMeasure(
        "specific_interaction",
        "specific interaction",
        "sum of (-1)^|T| log2 p(T) over all choices T of the words, at their distances",
        "bits",
    ),
    ExpressionMeasure(
        "best_split_g2", "G2 of the best split", "largest log-likelihood ratio G2 over the cuts in two", "none"
    ),
    ExpressionMeasure("c_value", "C-value", "log2(words) (n - t / c), t occurrences inside c longer ones", "count"),
    ExpressionMeasure(
        "c_value_length", "C-value by length", "(words - 1) (n - t / c), t occurrences inside c longer ones", "count"
    ),
    ExpressionMeasure("count", "count", "occurrences", "count"),
    ExpressionMeasure("documents", "documents", "documents that hold it", "count", bond=False),
    ExpressionMeasure(
        "dp_norm",
        "DPnorm",
        "half the sum over documents of |share of occurrences - share of tokens|, divided by its maximum; 0 even",
        "none",
        ranks=False,
        bond=False,
    ),
    ExpressionMeasure(
        "completeness",
        "completeness",
        "rate of ending sentences (or half of that of beginning them) beside that of words in general, at most 1",
        "none",
        ranks=False,
        bond=False,
    ),
    ExpressionMeasure(
        "any_order",
        "count in any order",
        "times the same words stand side by side in any order",
        "count",
        ranks=False,
        bond=False,
    ),
)

MEASURES: Mapping[str, ExpressionMeasure] = {one.name: one for one in _EACH}
RANKS = tuple(one.name for one in _EACH if one.ranks)
"""What a list of expressions can be sorted by."""
SCORES = tuple(name for name in MEASURES if name not in ("count", "documents"))
"""All but the counts that every entry has: pairs have those too."""
SHOWN = ("strength", "weakest_split", "specific_correlation", "c_value")
"""What people who judge see of an expression, beside its counts."""
