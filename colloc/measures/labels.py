"""How much the presence of something in documents tells about the label of the documents.

The table is two by k: documents that have it and documents that have it not, by label.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray


@dataclass(frozen=True, slots=True)
class LabelTables:
    """What the tables of n features over k labels say.

    Attributes
    ----------
    mutual_information : float64 array, shape (n,)
        Of presence and label, in bits (Cover & Thomas 2006, equation 2.28); never negative.
    contributions : float64 array, shape (n, k)
        p(present, label) log2(p(present, label) / (p(present) p(label))), in bits: above 0 where the label has the
        feature more often than all documents. 0 log 0 = 0.
    chi2 : float64 array, shape (n,)
        Pearson's X2 over both rows, k - 1 degrees of freedom, without continuity correction.
    chi2_present : float64 array, shape (n,)
        The part of X2 that comes from the documents that have the feature; no test statistic by itself.
    log_p : float64 array, shape (n,)
        Natural log of the p-value of ``chi2``.
    """

    mutual_information: FloatArray
    contributions: FloatArray
    chi2: FloatArray
    chi2_present: FloatArray
    log_p: FloatArray


def label_tables(present: ArrayLike, documents: ArrayLike) -> LabelTables:
    """Mutual information, contributions and chi-square of features with labels.

    Parameters
    ----------
    present : array, shape (n, k)
        Documents of each label that have the feature.
    documents : array, shape (k,)
        Documents of each label; each above 0, at least two labels.

    Raises
    ------
    UsageError
        Where shapes do not fit, a label has no document, or more documents have a feature than there are.
    """
    has = np.asarray(present, dtype=np.float64)
    sizes = np.asarray(documents, dtype=np.float64)
    if sizes.ndim != 1 or len(sizes) < 2 or has.ndim != 2 or has.shape[1] != len(sizes):
        raise UsageError(f"documents {sizes.shape} and present {has.shape} must have shapes (k,) and (n, k), k above 1")
    if (sizes <= 0).any() or (has < 0).any() or (has > sizes).any():
        raise UsageError("each label needs documents, and no more of them can have a feature than there are")
    total = sizes.sum()
    rows = [has, sizes - has]
    sums = [row.sum(axis=1, keepdims=True) for row in rows]
    parts, squares = [], []
    with np.errstate(divide="ignore", invalid="ignore"):
        for row, row_sum in zip(rows, sums, strict=True):
            expected = row_sum * sizes / total
            parts.append(np.where(row > 0, row / total * np.log2(row / expected), 0.0))
            squares.append(np.where(expected > 0, (row - expected) ** 2 / expected, 0.0).sum(axis=1))
    information = np.maximum((parts[0] + parts[1]).sum(axis=1), 0.0)
    chi2 = squares[0] + squares[1]
    return LabelTables(information, parts[0], chi2, squares[0], _log_p(chi2, len(sizes) - 1))


def _log_p(statistic: FloatArray, degrees: int) -> FloatArray:
    if degrees == 1:
        from colloc.measures.tails import chi_square_log_p

        return chi_square_log_p(statistic)
    from scipy.stats import chi2

    return np.asarray(chi2.logsf(statistic, degrees), dtype=np.float64)
