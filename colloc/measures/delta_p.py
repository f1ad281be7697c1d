"""Delta-P: how much more likely one word is with the other than without it, one direction at a time."""

from __future__ import annotations

from colloc.measures.contingency import FloatArray, Table, table_function


@table_function
def delta_p_second_given_first(table: Table) -> FloatArray:
    """p(y|x) - p(y|not x), from -1 to 1 (Gries 2013, section 3); nan where the first word is never or always there."""
    return table.joint / table.first_total - table.only_second / (table.total - table.first_total)


@table_function
def delta_p_first_given_second(table: Table) -> FloatArray:
    """p(x|y) - p(x|not y), from -1 to 1 (Gries 2013, section 3); nan where the second word is never or always there."""
    return table.joint / table.second_total - table.only_first / (table.total - table.second_total)
