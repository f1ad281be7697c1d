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

import importlib
import sys
import types
import typing

if typing.TYPE_CHECKING:
    from colloc import errors as errors
    from colloc.answers.columns import Columns as Columns
    from colloc.settings import ReadSettings as ReadSettings
    from colloc.settings import SegmentSettings as SegmentSettings
    from colloc.settings import TallySpec as TallySpec
    from colloc.verbs.annotated import conllu as conllu
    from colloc.verbs.annotated import sequences as sequences
    from colloc.verbs.appraising import appraise as appraise
    from colloc.verbs.asking import around as around
    from colloc.verbs.asking import floors as floors
    from colloc.verbs.asking import measure as measure
    from colloc.verbs.asking import pairs as pairs
    from colloc.verbs.asking import words as words
    from colloc.verbs.contrasting import contrast as contrast
    from colloc.verbs.drifting import drift as drift
    from colloc.verbs.evidence import explain as explain
    from colloc.verbs.evidence import lines as lines
    from colloc.verbs.evidence import picture as picture
    from colloc.verbs.exporting import entries as entries
    from colloc.verbs.exporting import export as export
    from colloc.verbs.expressions import expressions as expressions
    from colloc.verbs.features import features as features
    from colloc.verbs.joining import join as join
    from colloc.verbs.joining import make_joiner as make_joiner
    from colloc.verbs.judging import candidates as candidates
    from colloc.verbs.judging import decisions as decisions
    from colloc.verbs.judging import judge as judge
    from colloc.verbs.judging import judge_agreement as judge_agreement
    from colloc.verbs.judging import sheet as sheet
    from colloc.verbs.judging import take_decisions as take_decisions
    from colloc.verbs.judging import take_sheet as take_sheet
    from colloc.verbs.keeping import check as check
    from colloc.verbs.keeping import documents as documents
    from colloc.verbs.keeping import documents_by as documents_by
    from colloc.verbs.keeping import info as info
    from colloc.verbs.keeping import methods as methods
    from colloc.verbs.keeping import tallies as tallies
    from colloc.verbs.keeping import tally as tally
    from colloc.verbs.making import add as add
    from colloc.verbs.making import build as build
    from colloc.verbs.making import merge as merge
    from colloc.verbs.making import remove as remove
    from colloc.verbs.opening import open_store as open_store
    from colloc.verbs.scoring import score as score
    from colloc.verbs.scoring import scorer as scorer
    from colloc.verbs.spaces import agreement as agreement
    from colloc.verbs.spaces import matrix as matrix
    from colloc.verbs.spaces import similar as similar
    from colloc.verbs.spaces import vectors as vectors

_HOMES = {
    "Columns": "colloc.answers.columns",
    "ReadSettings": "colloc.settings",
    "SegmentSettings": "colloc.settings",
    "TallySpec": "colloc.settings",
    "add": "colloc.verbs.making",
    "agreement": "colloc.verbs.spaces",
    "appraise": "colloc.verbs.appraising",
    "around": "colloc.verbs.asking",
    "build": "colloc.verbs.making",
    "candidates": "colloc.verbs.judging",
    "check": "colloc.verbs.keeping",
    "conllu": "colloc.verbs.annotated",
    "contrast": "colloc.verbs.contrasting",
    "decisions": "colloc.verbs.judging",
    "documents": "colloc.verbs.keeping",
    "documents_by": "colloc.verbs.keeping",
    "drift": "colloc.verbs.drifting",
    "entries": "colloc.verbs.exporting",
    "errors": "colloc",
    "explain": "colloc.verbs.evidence",
    "export": "colloc.verbs.exporting",
    "expressions": "colloc.verbs.expressions",
    "features": "colloc.verbs.features",
    "floors": "colloc.verbs.asking",
    "info": "colloc.verbs.keeping",
    "join": "colloc.verbs.joining",
    "judge": "colloc.verbs.judging",
    "judge_agreement": "colloc.verbs.judging",
    "lines": "colloc.verbs.evidence",
    "make_joiner": "colloc.verbs.joining",
    "matrix": "colloc.verbs.spaces",
    "measure": "colloc.verbs.asking",
    "merge": "colloc.verbs.making",
    "methods": "colloc.verbs.keeping",
    "open_store": "colloc.verbs.opening",
    "pairs": "colloc.verbs.asking",
    "picture": "colloc.verbs.evidence",
    "remove": "colloc.verbs.making",
    "score": "colloc.verbs.scoring",
    "scorer": "colloc.verbs.scoring",
    "sequences": "colloc.verbs.annotated",
    "sheet": "colloc.verbs.judging",
    "similar": "colloc.verbs.spaces",
    "take_decisions": "colloc.verbs.judging",
    "take_sheet": "colloc.verbs.judging",
    "tallies": "colloc.verbs.keeping",
    "tally": "colloc.verbs.keeping",
    "vectors": "colloc.verbs.spaces",
    "words": "colloc.verbs.asking",
}
"""Where each public name lives; nothing is loaded before it is asked for."""

__all__ = sorted(_HOMES)


def __getattr__(name: str) -> typing.Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'colloc' has no attribute {name!r}")
    home = _HOMES[name]
    value = (
        importlib.import_module(f"colloc.{name}") if home == "colloc" else getattr(importlib.import_module(home), name)
    )
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted([*globals(), *__all__])


class _Front(types.ModuleType):
    """Keeps a verb from being replaced by a package of the same name when that is imported (``colloc.build``)."""

    def __setattr__(self, name: str, value: object) -> None:
        if isinstance(value, types.ModuleType) and _HOMES.get(name, "").startswith("colloc.verbs."):
            return
        super().__setattr__(name, value)


sys.modules[__name__].__class__ = _Front
