"""Sets of words that stand near each other in whatever order: the tasks that count them.

A set of k words, each as often as it is in it, meets at every choice of k places of which the last is at most so many
places behind the first. The offsets of the places from the first are a shape; each task counts one shape in one share
of the places. Sets are known by their terms in ascending order, looked up word by word in a chain of sorted columns:
first the lowest terms, then keys of the place in the column before << 32 | the next term.
"""

from __future__ import annotations

import dataclasses
from pathlib import Path

import numpy as np

from colloc.counts.keys import run_of_keys
from colloc.counts.runs import Column, write_column, write_run
from colloc.counts.sequences.places import NONE, padded, pair_keys
from colloc.counts.sequences.sharing import CAPITAL, NO_MARK, Facts, looked_up
from colloc.records import Int64Array, UInt8Array, UInt32Array, UInt64Array


def count_sets(
    terms: Facts, room: Facts, shape: list[int], chain: list[Facts], begin: int, stop: int, folder: str, name: str
) -> Facts:
    """Count what follows the sets of a chain of lower terms: the next lowest term.

    Returns
    -------
    dict
        ``run``: place in the last column of the chain << 32 | term. ``chances``: choices of places of this shape.
    """
    places, window = _windows(terms, room, shape, begin, stop)
    bag = _ascending(window)
    numbers, there = _walked(bag, chain)
    run = run_of_keys(pair_keys(numbers, bag[len(chain)][there]))
    return {"run": dataclasses.asdict(write_run(Path(folder), name, run)), "chances": len(places)}


def survey_sets(
    terms: Facts,
    room: Facts,
    marks: Facts,
    documents: Facts,
    shape: list[int],
    chain: list[Facts],
    begin: int,
    stop: int,
    folder: str,
    name: str,
) -> Facts:
    """See where the sets of a whole chain meet in this shape, and how they are written.

    Returns
    -------
    dict
        ``run``: number << 32 | document. Columns by number: ``times``, ``capitals`` and ``marked``. ``chances``.
    """
    places, window = _windows(terms, room, shape, begin, stop)
    numbers, there = _walked(_ascending(window), chain)
    chances, places = len(places), places[there]
    starts: Int64Array = Column(**documents).read()
    document = np.searchsorted(starts, places + begin, side="right") - 1
    n = Column(**chain[-1]).n
    seen = padded(Column(**marks), begin, stop + shape[-1], NO_MARK)
    columns = {
        "times": np.bincount(numbers, minlength=n),
        "capitals": np.zeros(n, np.int64),
        "marked": np.zeros(n, np.int64),
    }
    for word in shape:
        mark = seen[places + word]
        columns["capitals"] += np.bincount(numbers[mark == CAPITAL], minlength=n)
        columns["marked"] += np.bincount(numbers[mark != NO_MARK], minlength=n)
    run = run_of_keys(pair_keys(numbers, document.astype(np.uint32)))
    place = Path(folder)
    kept = {what: dataclasses.asdict(write_column(place / f"{name}.{what}", of)) for what, of in columns.items()}
    return {"run": dataclasses.asdict(write_run(place, name, run)), "chances": chances, **kept}


def count_orders(
    terms: Facts, room: Facts, shape: list[int], chain: list[Facts], begin: int, stop: int, folder: str, name: str
) -> Facts:
    """Count the orders in which the sets of a whole chain meet.

    Returns
    -------
    dict
        The run: number << 32 | order, the digits of which to the base of the number of words, lowest first, are the
        places of the terms in ascending order (of equal terms the first comes first).
    """
    _, window = _windows(terms, room, shape, begin, stop)
    numbers, there = _walked(_ascending(window), chain)
    order = np.argsort(np.stack([column[there] for column in window], axis=1), axis=1, kind="stable")
    weights = len(shape) ** np.arange(len(shape))
    run = run_of_keys(pair_keys(numbers, (order @ weights).astype(np.uint32)))
    return dataclasses.asdict(write_run(Path(folder), name, run))


def _windows(
    terms: Facts, room: Facts, shape: list[int], begin: int, stop: int
) -> tuple[Int64Array, list[UInt32Array]]:
    """Places (less ``begin``) from which the shape fits into its unit, and the terms there, a column a word."""
    space: UInt8Array = Column(**room).read(begin, stop)
    columns = [padded(Column(**terms), begin + word, stop + word, int(NONE)) for word in shape]
    fits = space > shape[-1]
    for column in columns:
        fits &= column != NONE
    places = np.flatnonzero(fits)
    return places, [column[places] for column in columns]


def _ascending(columns: list[UInt32Array]) -> list[UInt32Array]:
    """The same with each row in ascending order: neighbours change places until none has to (Habermann 1972).

    Rows are short and many, so whole columns are compared instead of sorting row by row.
    """
    sorted_ = list(columns)
    for turn in range(len(sorted_)):
        for one in range(turn % 2, len(sorted_) - 1, 2):
            low, high = sorted_[one], sorted_[one + 1]
            sorted_[one], sorted_[one + 1] = np.minimum(low, high), np.maximum(low, high)
    return sorted_


def _walked(bag: list[UInt32Array], chain: list[Facts]) -> tuple[UInt32Array, Int64Array]:
    """Numbers in the last column of a chain of those rows of ascending terms that are in it; and which rows."""
    tables: list[UInt64Array] = [Column(**link).read() for link in chain]
    # the lowest terms are few numbers, each looked up often: by a table of all of them, not by halving
    place = np.full(max(int(tables[0].max(initial=0)), int(bag[0].max(initial=0))) + 1, NONE)
    place[tables[0]] = np.arange(len(tables[0]))
    numbers = place[bag[0]]
    rows = np.flatnonzero(numbers != NONE)
    numbers = numbers[rows]
    for word, table in enumerate(tables[1:], 1):
        numbers, there = looked_up(table, pair_keys(numbers, bag[word][rows]))
        rows = rows[there]
    return numbers, rows
