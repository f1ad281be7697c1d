"""A library kept from loading another one that it can do without."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from contextlib import contextmanager


@contextmanager
def hidden(name: str) -> Iterator[None]:
    """Inside, importing ``name`` fails as if it were not installed; where it is loaded already, nothing happens."""
    if name in sys.modules:
        yield
        return
    sys.modules[name] = None  # type: ignore[assignment]  # the import system's own sign for "cannot be imported"
    try:
        yield
    finally:
        del sys.modules[name]
