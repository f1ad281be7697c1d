"""Shares of a word's occurrences that are joint ones, and how much they sink without the other word (Delta-P)."""

from __future__ import annotations

import numpy as np

from colloc.measures.contingency import FloatArray, Table, table_function


@table_function
def dice(table: Table) -> FloatArray:
    """Dice coefficient 2 O / (R + C) (Dice 1945): 0 never together, 1 never apart; nan where neither word occurs."""
    return 2.0 * table.joint / (table.first_total + table.second_total)


@table_function
def jaccard(table: Table) -> FloatArray:
    """Jaccard index O / (R + C - O) (Jaccard 1912): 0 never together, 1 never apart; nan where neither word occurs."""
    return table.joint / (table.first_total + table.only_second)


@table_function
def min_sensitivity(table: Table) -> FloatArray:
    """min(p(y|x), p(x|y)) = O / max(R, C) (Pedersen & Bruce 1996); nan where neither word occurs."""
    return table.joint / np.maximum(table.first_total, table.second_total)


@table_function
def p_second_given_first(table: Table) -> FloatArray:
    """Conditional probability p(y|x) = O / R; nan where the first word never occurs."""
    return table.joint / table.first_total


@table_function
def p_first_given_second(table: Table) -> FloatArray:
    """Conditional probability p(x|y) = O / C; nan where the second word never occurs."""
    return table.joint / table.second_total


@table_function
def delta_p_second_given_first(table: Table) -> FloatArray:
    """p(y|x) - p(y|not x), from -1 to 1 (Gries 2013); nan where the first word is never or always there."""
    return table.joint / table.first_total - table.only_second / (table.total - table.first_total)


@table_function
def delta_p_first_given_second(table: Table) -> FloatArray:
    """p(x|y) - p(x|not y), from -1 to 1 (Gries 2013); nan where the second word is never or always there."""
    return table.joint / table.second_total - table.only_first / (table.total - table.second_total)
