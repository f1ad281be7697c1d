"""Finds and explains word associations in text; counts are kept in one SQLite file.

>>> import colloc
>>> colloc.build("notes.colloc", ["notes/"])                       # doctest: +SKIP
>>> colloc.pairs("notes.colloc", measure="g2", limit=20)           # doctest: +SKIP
>>> with colloc.open_store("notes.colloc") as store:               # doctest: +SKIP
...     company = colloc.around(store, "fog", window=2).to_pandas()

Every verb is a command of the same name, with the same options; answers are
``Columns``: named numpy columns with the settings that made them.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

_HOMES = {
    "Columns": "colloc.answers.columns",
    "ReadSettings": "colloc.settings",
    "SegmentSettings": "colloc.settings",
    "TallySpec": "colloc.settings",
    "add": "colloc.verbs",
    "around": "colloc.verbs",
    "build": "colloc.verbs",
    "check": "colloc.verbs",
    "documents": "colloc.verbs",
    "documents_by": "colloc.verbs",
    "errors": "colloc",
    "info": "colloc.verbs",
    "matrix": "colloc.verbs",
    "measure": "colloc.verbs",
    "merge": "colloc.verbs",
    "open_store": "colloc.verbs",
    "pairs": "colloc.verbs",
    "remove": "colloc.verbs",
    "tallies": "colloc.verbs",
    "tally": "colloc.verbs",
    "words": "colloc.verbs",
}
"""Where each public name lives; nothing is loaded before it is asked for."""

__all__ = sorted(_HOMES)


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'colloc' has no attribute {name!r}")
    home = _HOMES[name]
    value = import_module(f"colloc.{name}") if home == "colloc" else getattr(import_module(home), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted([*globals(), *__all__])
