"""A loop in plain Python that numba compiles when it is first needed."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Generic, ParamSpec, TypeVar

P = ParamSpec("P")
R = TypeVar("R")

KERNELS: list[Kernel[Any, Any]] = []
"""All loops of the modules that have been imported."""


class Kernel(Generic[P, R]):
    """One loop: called, it runs compiled code; ``python`` is the same as plain Python, for tests.

    The code is kept in numba's cache, so that it is compiled once for a machine
    and read from there by later processes. It runs without the interpreter's lock.
    """

    def __init__(self, python: Callable[P, R], signature: str) -> None:
        self.python = python
        self.signature = signature
        self._compiled: Callable[P, R] | None = None
        KERNELS.append(self)

    def compile(self) -> Callable[P, R]:
        """The compiled loop; a RuntimeError of numba where its cache has no place to be."""
        if self._compiled is None:
            import numba

            compiled: Callable[P, R] = numba.njit(self.signature, cache=True, nogil=True)(self.python)
            self._compiled = compiled
        return self._compiled

    def __call__(self, *args: P.args, **kwargs: P.kwargs) -> R:
        """Run the compiled loop; arrays must have exactly the types of the signature."""
        run = self._compiled
        return run(*args, **kwargs) if run is not None else self.compile()(*args, **kwargs)


def kernel(signature: str) -> Callable[[Callable[P, R]], Kernel[P, R]]:
    """Make a loop of a function: ``signature`` is numba's, as ``void(uint32[::1], int64)``."""

    def mark(python: Callable[P, R]) -> Kernel[P, R]:
        return Kernel(python, signature)

    return mark
