"""The sparse matrix of a table: words as rows, their company as columns, an association or a count in each cell."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any, get_args

import numpy as np
from numpy.typing import NDArray

from colloc.answers.questions import PairOptions, Question, ask, resolve_spec
from colloc.answers.spaces.choosing import EVERY_WORD, Choice, Chosen, Words, choose
from colloc.answers.spaces.crossing import crossed_table
from colloc.answers.spaces.rows import MatrixTable, RowCells, cells_by_row
from colloc.answers.spaces.values import Value, ValueRule, value_rule
from colloc.answers.spaces.weighting import WeightedTally, Weighting, nested_specs
from colloc.answers.tables import TableMaker
from colloc.counts.tallying import obtain_tally
from colloc.errors import UsageError
from colloc.records import FloatArray
from colloc.settings import DEFAULT_MEMORY
from colloc.store.connection import Store
from colloc.store.tallies import Tally

if TYPE_CHECKING:
    from scipy.sparse import csr_array


@dataclass(frozen=True, slots=True, kw_only=True)
class MatrixOptions:
    """What the cells hold and which are kept.

    Parameters
    ----------
    value : {"ppmi", "npmi", "g2", "count"}
        Positive PMI in bits, NPMI, signed G2, or the joint count itself.
    shift : float
        The k of "k negative samples" (Levy & Goldberg 2014): log2 k is taken off PMI before the cut at 0.
    smoothing : float
        Power between 0 and 1 that the totals of all contexts are raised to (Levy, Goldberg & Dagan 2015, 3.2).
    weighting : {"flat", "harmonic", "linear"}
        What a pair at distance d of a window of reach w counts: 1, 1/d, or (w + 1 - d)/w.
    rows, contexts : Choice
        Which words; margins stay those of all text.
    context_layer : str, optional
        What the contexts are words of; that of the rows when not given.
    min_count : float
        Cells with a smaller joint count are left out.
    min_value : float, optional
        Cells with a smaller value are left out.
    """

    value: Value = "ppmi"
    shift: float = 1.0
    smoothing: float = 1.0
    weighting: Weighting = "flat"
    rows: Choice = EVERY_WORD
    contexts: Choice = EVERY_WORD
    context_layer: str | None = None
    min_count: float = 1
    min_value: float | None = None

    def __post_init__(self) -> None:
        if self.value not in get_args(Value):
            raise UsageError(f"value must be one of {', '.join(get_args(Value))}, not {self.value!r}")
        if self.value != "ppmi" and (self.shift != 1 or self.smoothing != 1):
            raise UsageError(f"shift and smoothing belong to ppmi, not to {self.value}: leave them out")
        if self.value == "g2" and self.weighting != "flat":
            raise UsageError("g2 needs counts that are not weighted: use weighting flat, or value ppmi")
        if not self.shift > 0:
            raise UsageError(f"shift must be above 0, not {self.shift}")
        if not 0 <= self.smoothing <= 1:
            raise UsageError(f"smoothing must be between 0 and 1, not {self.smoothing}")


@dataclass(frozen=True, slots=True)
class Matrix:
    """A sparse matrix and the words it is about.

    Attributes
    ----------
    values : scipy.sparse.csr_array of float64, shape (len(rows), len(columns))
        Column numbers ascend within a row; zeros are not stored.
    rows, columns : list of str
        Words of the rows and of the contexts.
    settings : dict
        Everything that decided the numbers.
    """

    values: csr_array[np.float64]
    rows: list[str]
    columns: list[str]
    settings: dict[str, Any]


def matrix(
    store: Store,
    *,
    options: PairOptions | None = None,
    chosen: MatrixOptions | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Matrix:
    """The matrix of a table, streamed from the store: besides the result only a few pages are held.

    Without a choice of rows or contexts both are the words with at least one cell, so that the matrix is square.

    Raises
    ------
    UsageError
        For options that contradict each other or the convention.
    """
    wanted, asked = chosen or MatrixOptions(), options or PairOptions()
    table = _table(store, asked, wanted, jobs, memory, progress)
    settled = (wanted.rows.settled(table.rows.tokens), wanted.contexts.settled(table.columns.tokens))
    wanted = replace(wanted, rows=settled[0], contexts=settled[1])
    value = value_rule(wanted.value, wanted.shift, wanted.smoothing, table.maker)
    rows, columns = choose(table.rows, wanted.rows, "rows"), choose(table.columns, wanted.contexts, "contexts")
    gathered = _Gathered(table)
    for cells in table.cells:
        gathered.add(*_kept(cells, value, rows, columns, wanted))
    square = table.rows.layer == table.columns.layer and wanted.rows == wanted.contexts == EVERY_WORD
    return gathered.finished(rows, columns, square, matrix_settings(table, wanted))


def _table(
    store: Store, options: PairOptions, wanted: MatrixOptions, jobs: int | None, memory: int, progress: Any
) -> MatrixTable:
    """The table asked for, of one layer or two, weighted or not."""
    if wanted.context_layer not in (None, resolve_spec(store, options)[0].layer):
        return crossed_table(store, options, str(wanted.context_layer), wanted.weighting, progress=progress)
    names = () if wanted.value == "count" else (wanted.value,)
    question = ask(store, options, names, jobs=jobs, memory=memory, progress=progress)
    source, maker = _weighted(question, wanted.weighting, jobs, memory, progress)
    cells = cells_by_row(source, maker.ordered, question.spec.kind == "unit")
    words = Words(store, question.layer, question.words.tokens)
    return MatrixTable(cells, 2 * source.n_pairs, maker, words, words, question.settings())


def _weighted(
    question: Question, weighting: Weighting, jobs: int | None, memory: int, progress: Any
) -> tuple[Tally | WeightedTally, TableMaker]:
    """The table asked for, or its weighted form, and what makes contingency tables of it."""
    if weighting == "flat":
        return question.reader.tally, question.reader
    parts = [
        (obtain_tally(question.store, spec, jobs=jobs, memory=memory, progress=progress), weight)
        for spec, weight in nested_specs(question.spec, weighting)
    ]
    tally = WeightedTally(parts)
    return tally, TableMaker(tally, question.convention, question.words)


def matrix_settings(table: MatrixTable, wanted: MatrixOptions) -> dict[str, Any]:
    """Everything that decides the numbers of a matrix."""
    return {
        **table.settings,
        "measure": wanted.value,
        "shift": wanted.shift,
        "smoothing": wanted.smoothing,
        "weighting": wanted.weighting,
        "rows": wanted.rows.described(),
        "contexts": wanted.contexts.described(),
        "min_count": wanted.min_count,
        "min_value": wanted.min_value,
    }


def _kept(
    cells: RowCells, value: ValueRule, rows: Chosen, columns: Chosen, wanted: MatrixOptions
) -> tuple[NDArray[np.uint32], NDArray[np.uint32], FloatArray]:
    """Rows, columns and values of the cells that pass all thresholds."""
    keep: NDArray[np.bool] | None = None
    if wanted.min_count > 1:
        keep = cells.joint >= wanted.min_count
    for terms, side in ((cells.rows, rows), (cells.columns, columns)):
        if side.mask is not None:
            keep = side.mask[terms] if keep is None else keep & side.mask[terms]
    if keep is not None:
        cells = cells.take(keep)
    values = value(cells)
    above = values != 0 if wanted.min_value is None else (values != 0) & (values >= wanted.min_value)
    if above.all():
        return cells.rows, cells.columns, values
    stored = np.flatnonzero(above)  # places are taken quicker than a mask is applied, three times over
    return cells.rows.take(stored), cells.columns.take(stored), values.take(stored)


class _Gathered:
    """Cells in the order of a matrix, written straight into the arrays of the result."""

    def __init__(self, table: MatrixTable) -> None:
        # The room is address space only: a page of memory is taken when it is first written to.
        self._columns = np.empty(table.n_cells, np.int32)
        self._values = np.empty(table.n_cells)
        self._of_rows, self._of_columns = table.rows, table.columns
        self._counts = np.zeros(len(table.rows.tokens), np.int64)
        self._has_column = np.zeros(len(table.columns.tokens), bool)
        self._filled = 0

    def add(self, rows: NDArray[np.uint32], columns: NDArray[np.uint32], values: FloatArray) -> None:
        if not len(rows):
            return
        stop = self._filled + len(rows)
        self._columns[self._filled : stop] = columns
        self._has_column[columns] = True
        self._values[self._filled : stop] = values
        self._filled = stop
        base = int(rows[0])
        counts = np.bincount(rows - np.uint32(base))
        self._counts[base : base + len(counts)] += counts

    def finished(self, rows: Chosen, columns: Chosen, square: bool, settings: dict[str, Any]) -> Matrix:
        from scipy.sparse import csr_array

        for room in (self._columns, self._values):
            room.resize(self._filled, refcheck=False)
        has_row = self._counts > 0
        has_column = self._has_column
        if square:
            has_row = has_column = has_row | has_column
        row_terms = rows.terms if rows.terms is not None else np.flatnonzero(has_row)
        column_terms = columns.terms if columns.terms is not None else np.flatnonzero(has_column)
        index = np.int64 if self._filled > np.iinfo(np.int32).max else np.int32
        within = np.sort(row_terms[row_terms >= 0])
        pointers = np.concatenate([[0], np.cumsum(self._counts[within])]).astype(index)
        numbers = np.zeros(len(self._has_column), np.int32)
        numbers[column_terms[column_terms >= 0]] = np.flatnonzero(column_terms >= 0)
        for start in range(0, self._filled, _STRETCH):
            stretch = self._columns[start : start + _STRETCH]
            numbers.take(stretch, out=stretch, mode="clip")  # all are in range; clipping needs no copy
        arrays: Any = (self._values, self._columns.astype(index, copy=False), pointers)
        made: csr_array[np.float64] = csr_array(arrays, shape=(len(within), len(column_terms)))
        if columns.terms is not None:
            made.sort_indices()
        if rows.terms is not None:
            made = _in_order(made, within, row_terms)
        names = rows.texts(self._of_rows, row_terms)
        return Matrix(made, names, names if square else columns.texts(self._of_columns, column_terms), settings)


_STRETCH = 1 << 20


def _in_order(made: csr_array[np.float64], within: np.ndarray, terms: np.ndarray) -> csr_array[np.float64]:
    """Rows brought into the order of a list; words that the store does not know have empty rows."""
    from scipy.sparse import csr_array

    places = np.searchsorted(within, terms)
    lengths = np.where(terms >= 0, np.append(np.diff(made.indptr), 0)[places], 0)
    pointers = np.concatenate([[0], np.cumsum(lengths)])
    begins = np.append(made.indptr[:-1], 0)[places]
    source = np.repeat(begins - pointers[:-1], lengths) + np.arange(pointers[-1])
    return csr_array((made.data[source], made.indices[source], pointers), shape=(len(terms), made.shape[1]))
