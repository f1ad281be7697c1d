"""False discoveries: q-values by Benjamini & Hochberg (1995)."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray


def log_q_values(log_p: ArrayLike, hypotheses: int | None = None) -> FloatArray:
    """Natural logs of q-values from natural logs of p-values, right for p-values too small for a float.

    q(i) is the smallest of p(j) m / j over all j >= i in the order of p: calling discoveries all those with q at most
    0.05 keeps the expected share of false ones at most 0.05 (Benjamini & Hochberg 1995, for independent or
    positively dependent tests).

    Parameters
    ----------
    log_p : array, shape (n,)
        nan stands for "not tested" and stays nan.
    hypotheses : int, optional
        m, the number of hypotheses there were. It exceeds the number of p-values where only some were worth
        computing: all pairs of words that pass the word threshold are hypotheses, seen together or not. The p-values
        left out must not be smaller than the largest one given, or must count as 1. The number of p-values where not
        given.

    Returns
    -------
    float64 array, shape (n,)

    Raises
    ------
    UsageError
        ``hypotheses`` is smaller than the number of p-values, or a p-value is above 1.
    """
    values = np.asarray(log_p, dtype=np.float64)
    tested = np.flatnonzero(~np.isnan(values))
    m = tested.size if hypotheses is None else hypotheses
    if m < tested.size:
        raise UsageError(f"hypotheses must be at least the number of p-values, {tested.size}, not {m}")
    ascending = tested[np.argsort(values[tested], kind="stable")]
    ordered = values[ascending]
    if ordered.size and ordered[-1] > 0:
        raise UsageError(f"p-values must be at most 1, not {np.exp(ordered[-1])}")
    scaled = ordered + np.log(m) - np.log(np.arange(1, ordered.size + 1)) if ordered.size else ordered
    result = np.full(values.shape, np.nan)
    result[ascending] = np.minimum(np.minimum.accumulate(scaled[::-1])[::-1], 0.0)
    return result


def q_values(p: ArrayLike, hypotheses: int | None = None) -> FloatArray:
    """:func:`log_q_values` for plain p-values: q-values between 0 and 1."""
    with np.errstate(divide="ignore"):
        return np.exp(log_q_values(np.log(np.asarray(p, dtype=np.float64)), hypotheses))
