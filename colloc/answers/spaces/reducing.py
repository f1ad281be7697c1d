"""The leading singular vectors of a sparse matrix.

A randomised block method (Halko, Martinsson & Tropp 2011, doi:10.1137/090771806) with power iterations that are
shifted by a value learnt as they go (Feng, Yu, Xie & Tang 2024, doi:10.1145/3660629). The spectrum of a PPMI matrix
falls so slowly that plain power iterations need many passes; the shift saves about half of them. What was measured
against it is in docs/performance.md.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from colloc.errors import UsageError
from colloc.records import FloatArray

if TYPE_CHECKING:
    from scipy.sparse import csr_array

ITERATIONS = 6
"""Passes over the matrix and its transpose."""
SPARE = 30
"""Dimensions computed beside those asked for: the last ones converge slowest."""
_SMALL = 600
"""Sides up to this are solved exactly, by a dense decomposition."""

Float32Array = NDArray[np.float32]


def leading_vectors(
    matrix: csr_array[Any], dimensions: int, *, seed: int = 0, iterations: int = ITERATIONS
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """The largest singular values of a matrix with their vectors: matrix ~ left @ diag(values) @ right.

    Parameters
    ----------
    matrix : csr_array, shape (m, n)
    dimensions : int
        How many; at most min(m, n).
    seed : int
        Equal seeds give equal results on the same machine and libraries.

    Returns
    -------
    left : float64 array, shape (m, dimensions)
    values : float64 array, shape (dimensions,), descending
    right : float64 array, shape (dimensions, n)
        The sign of each pair is such that the largest entry of the right vector, by size, is positive.

    Raises
    ------
    UsageError
        More dimensions than the matrix has rows or columns.
    """
    smallest = min(matrix.shape)
    if not 1 <= dimensions <= smallest:
        raise UsageError(
            f"dimensions must be between 1 and {smallest}, the smaller side of the matrix, not {dimensions}"
        )
    if smallest <= max(_SMALL, dimensions + SPARE):
        left, values, right = np.linalg.svd(matrix.toarray(), full_matrices=False)
        left, values, right = left[:, :dimensions], values[:dimensions], right[:dimensions]
    else:
        left, values, right = _randomised(matrix, dimensions, seed, iterations)
    signs = np.sign(right[np.arange(dimensions), np.abs(right).argmax(axis=1)])
    return left * signs, values, right * signs[:, np.newaxis]


def _randomised(
    matrix: csr_array[Any], dimensions: int, seed: int, iterations: int
) -> tuple[FloatArray, FloatArray, FloatArray]:
    # Single precision halves the time of the products, and its error of 1e-7 is far below that of the method.
    single = matrix.astype(np.float32)
    transpose = single.T.tocsr()
    start = np.random.default_rng(seed).standard_normal((matrix.shape[0], dimensions + SPARE), dtype=np.float32)
    basis, _, _ = _orthonormal(transpose @ start)
    shift = np.float32(0)
    for _ in range(iterations):
        basis, lengths, _ = _orthonormal(transpose @ (single @ basis) - shift * basis)
        # Half way up to the smallest value found: never above half of it, so that the order of the others is kept.
        shift = max(shift, np.float32(lengths[0] + shift) / np.float32(2))
    # In double precision from here on, on the space found.
    exact, _ = np.linalg.qr(basis.astype(np.float64))
    left, values, turn = _orthonormal(matrix @ exact)
    best = slice(None, -dimensions - 1, -1)
    return left[:, best], values[best], (exact @ turn[:, best]).T


def _orthonormal(block: NDArray[Any]) -> tuple[NDArray[Any], FloatArray, FloatArray]:
    """The thin singular value decomposition of a tall block by the eigenvectors of its Gram matrix, ascending.

    Much quicker than a QR decomposition of a block of this shape.
    """
    gram = (block.T @ block).astype(np.float64)
    squares, turn = np.linalg.eigh(gram)
    lengths = np.sqrt(np.maximum(squares, squares[-1] * 1e-14))
    return block @ (turn / lengths).astype(block.dtype), lengths, turn


def powers(singular: FloatArray, power: float) -> FloatArray:
    """Singular values to a power; those that are 0 but for rounding stay 0, also to the power 0."""
    there = singular > (singular[0] * 1e-12 if len(singular) else 0.0)
    return np.where(there, np.where(there, singular, 1.0) ** power, 0.0)
