"""All compiled loops made ready, once in a process."""

from __future__ import annotations

import sys
import warnings
from contextlib import AbstractContextManager, nullcontext

from colloc.hiding import hidden
from colloc.kernels import characters, merging, numbers, pairs, sentences, slices, words
from colloc.kernels.kernel import KERNELS

MODULES = (characters, merging, numbers, pairs, sentences, slices, words)


def _without_matrices() -> AbstractContextManager[None]:
    """numba loads scipy's linear algebra to offer products of matrices, which no loop here uses: a third of the time.

    Only where the process is the command line's own: elsewhere the user may compile what needs them.
    """
    ours = "numba" not in sys.modules and "colloc.cli.app" in sys.modules
    return hidden("scipy") if ours else nullcontext()


def load() -> bool:
    """Compile or read from the cache every loop; False, with a warning, where numba cannot keep a cache."""
    try:
        with _without_matrices():
            for one in KERNELS:
                one.compile()
    except RuntimeError as error:
        warnings.warn(
            f"compiled loops are off, since numba has no place for what it compiles ({error}): "
            "set NUMBA_CACHE_DIR to a folder that can be written",
            stacklevel=2,
        )
        return False
    return True
