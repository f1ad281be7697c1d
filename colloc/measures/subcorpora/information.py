"""What a word tells about the slice that it stands in: mutual information of slice and presence of the word."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from colloc.measures.contingency import FloatArray


@dataclass(frozen=True, slots=True)
class PresenceInformation:
    """Arrays of shape (n_words,).

    Attributes
    ----------
    bits : float64
        Mutual information a token, of "which slice" and "this word or another".
    g2 : float64
        2 ln 2 times the number of tokens times ``bits``.
    log_p : float64
        ln of the chi-square p-value of ``g2`` with k - 1 degrees of freedom.
    """

    bits: FloatArray
    g2: FloatArray
    log_p: FloatArray


def presence_information(counts: ArrayLike, totals: ArrayLike) -> PresenceInformation:
    """Mutual information of each word's presence and the slice (Cover & Thomas 2006, section 2.3), bit.

    Parameters
    ----------
    counts : array, shape (n_words, k)
        Tokens of the word in each slice.
    totals : array, shape (k,)
        All tokens of each slice; above 0.
    """
    from scipy.special import gammaincc, xlogy

    seen = np.asarray(counts, dtype=np.float64)
    size = np.asarray(totals, dtype=np.float64)
    whole = size.sum()
    share = seen.sum(axis=1, keepdims=True) / whole
    others = size - seen
    with np.errstate(divide="ignore", invalid="ignore"):
        nats = xlogy(seen, seen / (size * share)) + np.where(
            others > 0, xlogy(others, others / (size * (1.0 - share))), 0.0
        )
        g2 = np.maximum(2.0 * nats.sum(axis=1), 0.0)
        log_p = np.log(np.asarray(gammaincc((len(size) - 1) / 2.0, g2 / 2.0), dtype=np.float64))
    return PresenceInformation(g2 / (2.0 * whole * np.log(2.0)), g2, log_p)
