"""Scores that set the excess O - E against a standard deviation."""

from __future__ import annotations

import numpy as np

from colloc.measures.contingency import FloatArray, Table, table_function


@table_function
def t(table: Table) -> FloatArray:
    """t-score (O - E) / sqrt(O) (Church et al. 1991; Manning & Schuetze 1999, section 5.3.1).

    -inf where words expected to meet never do; nan where a word never occurs.
    """
    return table.excess / np.sqrt(table.joint)


@table_function
def z(table: Table) -> FloatArray:
    """z-score (O - E) / sqrt(E) (Berry-Rogghe 1973, without the factor for E / N); nan where a word never occurs."""
    return table.excess / np.sqrt(table.expected)
