"""A matrix of words in files that other programs read.

``NAME.npz``
    scipy's sparse format, CSR, float64 (``scipy.sparse.load_npz``).
``NAME.mtx``
    Matrix Market, coordinate, real, general (Boisvert, Pozo & Remington 1996, NISTIR 5935).
``NAME.arrow``
    Arrow IPC file, a cell a row: ``row`` and ``column`` (int32, from 0), ``value`` (float64).
``FILE.labels.json``
    Beside each file, by its whole name (``NAME.npz.labels.json``). ``rows`` and ``columns``: the words, in
    the order of the matrix.
``FILE.settings.json``
    Everything that decided the numbers.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from importlib.metadata import version
from pathlib import Path
from typing import Any, BinaryIO

import numpy as np

from colloc.answers.spaces.matrix import Matrix
from colloc.errors import MissingExtraError
from colloc.exports.replacing import replacing


def write_matrix(matrix: Matrix, output: Path) -> list[Path]:
    """Write a matrix with its labels and settings, and return the paths.

    Parameters
    ----------
    output : Path
        With one of the endings of ``WRITERS`` that file; without, both ``.npz`` and ``.mtx``.

    Raises
    ------
    CannotCreateError
        Where one of the files cannot be written.
    MissingExtraError
        For Arrow without pyarrow.
    """
    chosen = [output.suffix] if output.suffix in WRITERS else [".npz", ".mtx"]
    stem = output.with_name(output.name.removesuffix(output.suffix)) if output.suffix in WRITERS else output
    paths = [stem.with_name(stem.name + ending) for ending in chosen]
    for ending, path in zip(chosen, paths, strict=True):
        with replacing(path) as stream:
            WRITERS[ending](matrix, stream)
    return [*paths, *write_beside(paths, "matrix", {"rows": matrix.rows, "columns": matrix.columns}, matrix.settings)]


def companions(path: Path) -> tuple[Path, Path]:
    """Where the labels and the settings of a file stand: beside it, by its whole name."""
    return path.with_name(f"{path.name}.labels.json"), path.with_name(f"{path.name}.settings.json")


def write_beside(
    files: Sequence[Path], command: str, labels: Mapping[str, Sequence[str]], settings: Mapping[str, Any]
) -> list[Path]:
    """Write the labels and the settings of each file beside it, and return the paths."""
    facts = {"colloc": version("colloc"), "command": command, "settings": dict(settings)}
    texts = [(json.dumps(record, ensure_ascii=False, indent=2) + "\n").encode() for record in (labels, facts)]
    written = []
    for file in files:
        for path, text in zip(companions(file), texts, strict=True):
            with replacing(path) as stream:
                stream.write(text)
            written.append(path)
    return written


def _npz(matrix: Matrix, stream: BinaryIO) -> None:
    from scipy.sparse import save_npz

    # Association values hardly compress, and compressing takes many times as long as computing them.
    save_npz(stream, matrix.values, compressed=False)


def _matrix_market(matrix: Matrix, stream: BinaryIO) -> None:
    from scipy.io import mmwrite

    mmwrite(stream, matrix.values, field="real", symmetry="general", precision=17)


_CELLS_A_BATCH = 1 << 20


def _arrow(matrix: Matrix, stream: BinaryIO) -> None:
    try:
        import pyarrow as pa
    except ImportError as error:
        raise MissingExtraError("pyarrow is not installed: pip install 'colloc[tables]'") from error
    values = matrix.values
    schema = pa.schema(
        {"row": pa.int32(), "column": pa.int32(), "value": pa.float64()},
        metadata={"colloc": json.dumps(matrix.settings)},
    )
    with pa.ipc.new_file(stream, schema) as writer:
        for start in range(0, values.nnz, _CELLS_A_BATCH):
            stop = min(start + _CELLS_A_BATCH, values.nnz)
            rows = np.searchsorted(values.indptr, np.arange(start, stop), side="right") - 1
            arrays = [rows.astype(np.int32), values.indices[start:stop].astype(np.int32), values.data[start:stop]]
            writer.write(pa.record_batch([pa.array(array) for array in arrays], schema=schema))


WRITERS: Mapping[str, Callable[[Matrix, BinaryIO], None]] = {".npz": _npz, ".mtx": _matrix_market, ".arrow": _arrow}
"""Writers by the ending of the file."""
