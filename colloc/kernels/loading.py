"""All compiled loops made ready, once in a process."""

from __future__ import annotations

import sys
import warnings
from collections.abc import Iterator
from contextlib import contextmanager

from colloc.kernels import characters, merging, numbers, pairs, sentences, words
from colloc.kernels.kernel import KERNELS

MODULES = (characters, merging, numbers, pairs, sentences, words)


@contextmanager
def _scipy_hidden() -> Iterator[None]:
    """numba loads scipy's linear algebra to offer products of matrices, which no loop here uses: a third of the time.

    Only where the process is the command line's own: elsewhere the user may compile what needs them.
    """
    if "scipy" in sys.modules or "numba" in sys.modules or "colloc.cli.app" not in sys.modules:
        yield
        return
    sys.modules["scipy"] = None  # type: ignore[assignment]  # the import system's own sign for "cannot be imported"
    try:
        yield
    finally:
        del sys.modules["scipy"]


def load() -> bool:
    """Compile or read from the cache every loop; False, with a warning, where numba cannot keep a cache."""
    try:
        with _scipy_hidden():
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
