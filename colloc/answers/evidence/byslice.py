"""A pair over the values of a metadata key: genres, years, authors."""

from __future__ import annotations

import math
from collections.abc import Iterable

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.evidence.occurring import FIRST, SECOND, PairOccurrences
from colloc.measures.contingency import expected
from colloc.measures.intervals import pmi_interval
from colloc.measures.pmi import pmi
from colloc.records import MetaValue
from colloc.store import documents, slices

MOST_VALUES = 8
"""Rows of a key; numbers with more values are put into ranges, other keys with more are left out."""
_STEPS = (1, 2, 5)


def slice_tables(seen: PairOccurrences) -> dict[str, Columns]:
    """The pair's own table in each part of the documents, for every key with two values or more that are few enough."""
    wanted = set(seen.documents.tolist())
    rows = [row for row in documents.iterate_documents(seen.question.store) if row.number in wanted]
    keys = sorted({key for row in rows for key in row.metadata})
    found = {}
    for key in keys:
        labels = labels_of([row.metadata.get(key) for row in rows])
        if labels is not None:
            found[key] = _table(seen, labels)
    return found


def _table(seen: PairOccurrences, labels: list[str | None]) -> Columns:
    given = np.array(labels, dtype=object)
    values = [label for label in dict.fromkeys(sorted(filter(None, labels), key=_order))]
    masks = [given == value for value in values]
    tables = [seen.table(mask).arguments for mask in masks]
    columns = [np.concatenate([table[place] for table in tables]) for place in range(4)]
    tokens = np.array([seen.tokens[mask].sum() for mask in masks], np.float64)
    counted = np.array([seen.total[mask].sum() for mask in masks], np.float64)
    interval = pmi_interval(*columns)
    holding = (seen.words[:, FIRST] > 0) & (seen.words[:, FIRST if seen.same else SECOND] > 0)
    with np.errstate(divide="ignore", invalid="ignore"):
        rates = [columns[0] * 1e6 / of for of in (tokens, counted)]
    return Columns(
        {
            "value": values,
            "documents": np.array([int(mask.sum()) for mask in masks]),
            "holding": np.array([int(holding[mask].sum()) for mask in masks]),
            "joint": columns[0],
            "expected": expected(*columns),
            "per_million_words": rates[0],
            "per_million_counted": rates[1],
            "pmi": pmi(*columns),
            "pmi_low": interval.low,
            "pmi_high": interval.high,
        }
    )


def labels_of(values: list[MetaValue]) -> list[str | None] | None:
    """The row each value belongs to: itself, or a range such as ``1870..1874``; None where there are too many or one.

    Ranges are 1, 2 or 5 times a power of ten wide.
    """
    texts = [None if value is None else slices.as_text(value) for value in values]
    distinct = {text for text in texts if text is not None}
    if 2 <= len(distinct) <= MOST_VALUES:
        return texts
    numbers = [_whole(text) for text in texts]
    known = [number for number in numbers if number is not None]
    if len(distinct) < 2 or len(known) < len([text for text in texts if text is not None]):
        return None
    low, high = min(known), max(known)
    step = next(step for step in _widths() if high // step - low // step < MOST_VALUES)
    return [
        None if number is None else f"{number // step * step}..{number // step * step + step - 1}" for number in numbers
    ]


def _widths() -> Iterable[int]:
    power = 1
    while True:
        yield from (step * power for step in _STEPS)
        power *= 10


def _whole(text: str | None) -> int | None:
    if text is None:
        return None
    try:
        number = float(text)
    except ValueError:
        return None
    return int(number) if math.isfinite(number) and number.is_integer() else None


def _order(label: str) -> tuple[int, str]:
    number = _whole(label.split("..")[0])
    return (0 if number is None else number, label)
