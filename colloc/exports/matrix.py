"""The sparse matrix of a tally's positive PMI, in files that other programs read.

``STEM.npz``
    scipy's sparse format, CSR, float64 (``scipy.sparse.load_npz``).
``STEM.mtx``
    Matrix Market, coordinate, real, general (Boisvert, Pozo & Remington 1996, NISTIR 5935).
``STEM.labels.json``
    ``rows`` and ``columns``: the words, in the order of the matrix.
``STEM.settings.json``
    Everything that decided the numbers.
"""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from colloc.answers.questions import PairOptions, Question, ask
from colloc.answers.tables import PairTable
from colloc.exports.replacing import replacing
from colloc.measures.pmi import shifted_ppmi, smoothed_totals
from colloc.records import FloatArray, Int64Array
from colloc.settings import DEFAULT_MEMORY
from colloc.store import vocabulary
from colloc.store.opening import Store

if TYPE_CHECKING:
    from scipy.sparse import csr_array


@dataclass(frozen=True, slots=True)
class Matrix:
    """Rows are words, columns their company; both have the same labels, those with at least one cell.

    Attributes
    ----------
    values : scipy.sparse.csr_array, shape (n, n)
        max(PMI - log2 shift, 0) in bits; zeros are not stored.
    labels : list of str, length n
    settings : dict
    """

    values: csr_array
    labels: list[str]
    settings: dict[str, Any]


def ppmi_matrix(
    store: Store,
    *,
    options: PairOptions | None = None,
    shift: float = 1.0,
    smoothing: float = 1.0,
    min_count: int = 1,
    min_word_count: int = 1,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Matrix:
    """The (shifted, smoothed) positive PMI of every pair (Levy, Goldberg & Dagan 2015, section 3.2).

    Parameters
    ----------
    shift : float
        The k of "k negative samples": log2 k is taken off before the cut at 0; 1 leaves PPMI.
    smoothing : float
        Power between 0 and 1 that the totals of the columns are raised to; 1 leaves them.
    min_count, min_word_count : int
        Cells below are left out; margins stay those of all text.

    Raises
    ------
    UsageError
        For a shift or smoothing out of range, or options that contradict each other.
    """
    from scipy.sparse import coo_array

    question = ask(store, options or PairOptions(), ("ppmi",), jobs=jobs, memory=memory, progress=progress)
    full = np.asarray(question.reader.second_totals(), dtype=np.float64)
    smoothed = smoothed_totals(full, smoothing)
    rows: list[Int64Array] = []
    columns: list[Int64Array] = []
    values: list[FloatArray] = []
    for table in _cells(question, min_count, min_word_count):
        # Halved totals on the diagonal are smoothed in the same proportion.
        second_total = table.second_total * (smoothed[table.second] / full[table.second])
        value = shifted_ppmi(table.joint, table.first_total, second_total, table.total, shift)
        kept = value > 0
        rows.append(table.first[kept].astype(np.int64))
        columns.append(table.second[kept].astype(np.int64))
        values.append(value[kept])
    row, column = np.concatenate([np.zeros(0, np.int64), *rows]), np.concatenate([np.zeros(0, np.int64), *columns])
    terms = np.union1d(row, column)
    places = (np.searchsorted(terms, row), np.searchsorted(terms, column))
    matrix = coo_array((np.concatenate([np.zeros(0), *values]), places), shape=(len(terms), len(terms))).tocsr()
    settings = question.settings(
        measure="ppmi", shift=shift, smoothing=smoothing, min_count=min_count, min_word_count=min_word_count
    )
    return Matrix(matrix, vocabulary.term_texts(store, question.layer, terms), settings)


def _cells(question: Question, min_count: int, min_word_count: int) -> Iterator[PairTable]:
    """Every cell that passes the thresholds: an unordered pair gives two, one on the diagonal gives one."""
    tokens = question.words.tokens
    for table in question.reader.blocks():
        kept = (table.joint >= max(min_count, 1)) & (tokens[table.first] >= min_word_count)
        chosen = table.take(kept & (tokens[table.second] >= min_word_count))
        yield chosen
        if not question.reader.ordered:
            other = chosen.take(chosen.first != chosen.second)
            yield PairTable(other.second, other.first, other.joint, other.second_total, other.first_total, other.total)


def write_matrix(matrix: Matrix, stem: Path) -> list[Path]:
    """Write the four files and return their paths.

    Raises
    ------
    CannotCreateError
        Where one of them cannot be written.
    """
    from scipy.io import mmwrite
    from scipy.sparse import save_npz

    paths = [stem.with_name(f"{stem.name}.{ending}") for ending in ("npz", "mtx", "labels.json", "settings.json")]
    with replacing(paths[0]) as stream:
        save_npz(stream, matrix.values)
    with replacing(paths[1]) as stream:
        mmwrite(stream, matrix.values, field="real", symmetry="general", precision=17)
    labels = {"rows": matrix.labels, "columns": matrix.labels}
    for path, record in ((paths[2], labels), (paths[3], {"command": "matrix", "settings": matrix.settings})):
        with replacing(path) as stream:
            stream.write((json.dumps(record, ensure_ascii=False, indent=2) + "\n").encode())
    return paths
