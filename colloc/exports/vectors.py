"""Vectors in files that other programs read, and read back.

``NAME.npy``
    numpy's array format, float32, a row a word (``numpy.load``).
``NAME.txt``
    Plain text, UTF-8: a word and its numbers a line, separated by spaces; no heading line. A space inside a word
    is written as an underscore.
``FILE.labels.json``
    Beside each file, by its whole name (``NAME.npy.labels.json``). ``rows``: the words, in the order of the rows.
``FILE.settings.json``
    Everything that decided the numbers.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import BinaryIO

import numpy as np

from colloc.answers.spaces.vectors import Vectors
from colloc.errors import DataError, NoInputError
from colloc.exports.matrices import companions, write_beside
from colloc.exports.replacing import replacing


def write_vectors(vectors: Vectors, output: Path) -> list[Path]:
    """Write vectors with their labels and settings, and return the paths.

    Parameters
    ----------
    output : Path
        With the ending ``.npy`` or ``.txt`` that file; without, both.

    Raises
    ------
    CannotCreateError
        Where one of the files cannot be written.
    """
    chosen = [output.suffix] if output.suffix in WRITERS else list(WRITERS)
    stem = output.with_name(output.name.removesuffix(output.suffix)) if output.suffix in WRITERS else output
    paths = [stem.with_name(stem.name + ending) for ending in chosen]
    for ending, path in zip(chosen, paths, strict=True):
        with replacing(path) as stream:
            WRITERS[ending](vectors, stream)
    return [*paths, *write_beside(paths, "vectors", {"rows": vectors.words}, vectors.settings)]


def read_vectors(path: Path) -> Vectors:
    """Vectors that `write_vectors` wrote as ``.npy``, with the labels and settings beside them.

    Singular values are not in the files and come back empty.

    Raises
    ------
    NoInputError
        Where one of the files is missing.
    DataError
        Where one is not what it should be, or labels and rows differ in number.
    """
    file = path if path.suffix == ".npy" else path.with_name(f"{path.name}.npy")
    try:
        values = np.load(file, allow_pickle=False)
        labels, settings = (json.loads(beside.read_text(encoding="utf-8")) for beside in companions(file))
        words, chosen = labels["rows"], settings["settings"]
    except FileNotFoundError as error:
        raise NoInputError(f"{error.filename}: no such file; `colloc vectors` writes it beside the vectors") from error
    except (ValueError, KeyError, TypeError, EOFError) as error:
        raise DataError(f"{path}: not vectors with labels and settings beside them: {error}") from error
    if values.ndim != 2 or values.dtype.kind != "f" or len(values) != len(words):
        raise DataError(f"{path}: {values.shape} numbers for {len(words)} labels; write both anew")
    return Vectors(values.astype(np.float64), [str(word) for word in words], np.zeros(0), dict(chosen))


def _npy(vectors: Vectors, stream: BinaryIO) -> None:
    np.save(stream, vectors.values.astype(np.float32), allow_pickle=False)


def _text(vectors: Vectors, stream: BinaryIO) -> None:
    for word, row in zip(vectors.words, vectors.values.astype(np.float32), strict=True):
        numbers = " ".join(map(repr, row.astype(np.float64).round(7).tolist()))
        stream.write(f"{'_'.join(word.split())} {numbers}\n".encode())


WRITERS: Mapping[str, Callable[[Vectors, BinaryIO], None]] = {".npy": _npy, ".txt": _text}
"""Writers by the ending of the file."""
