"""Growing cut into tasks: shares of the stream are read, joined, counted and numbered, key ranges merged."""

from __future__ import annotations

import dataclasses
from pathlib import Path
from typing import Any

import numpy as np

from colloc.counts.keys import Run, merge, run_of_keys
from colloc.counts.runs import Column, load_runs, write_column, write_run
from colloc.counts.selection import selection_of
from colloc.counts.sequences.places import NONE, fill, left_of, padded, pair_keys, right_of
from colloc.counts.spans import apply_layer, read_stretches
from colloc.records import Int64Array, UInt8Array, UInt32Array, UInt64Array
from colloc.settings import Inside
from colloc.store.connection import Store
from colloc.store.vocabulary import layer_map

Facts = dict[str, Any]

MOST_WORDS = 12
"""Places that a sequence can reach over, open slots included: further ahead the end of a unit is not looked for."""
NO_MARK, SMALL, CAPITAL = 0, 1, 2
"""Marks of a token: says nothing about capitals (it begins a unit, or its word has one letter), or says which."""


def lay_out(
    store: Store,
    layer: str,
    inside: Inside,
    selection: Facts,
    begin: int,
    stop: int,
    capitals: Facts,
    into: Facts,
) -> Facts:
    """Write the columns that growing goes by, for the places ``begin`` to ``stop`` of a selection.

    Parameters
    ----------
    capitals : Column facts
        The mark of each type.
    into : dict of Column facts
        ``ids``: terms. ``room``: tokens up to the end of the unit, at most MOST_WORDS.
        ``marks``: see `NO_MARK`.

    Returns
    -------
    dict
        ``units`` that begin in the share.
    """
    chosen = selection_of(Column(**selection["begins"]).read(), Column(**selection["stops"]).read())
    terms_of = layer_map(store, layer)
    ahead = min(stop + MOST_WORDS, len(chosen))
    types = np.full(ahead - begin, NONE)
    begins_unit = np.zeros(ahead - begin + 1, bool)
    same = np.arange(len(terms_of), dtype=np.uint32)
    for stretch in read_stretches(store, same, chosen, inside, begin, ahead):
        types[stretch.first - begin : stretch.stop - begin] = stretch.terms
        begins_unit[stretch.units - begin] = True
    begins_unit[-1] = True  # the end of the selection, or too far ahead to matter
    n = stop - begin
    marks = np.zeros(n, np.uint8)
    there = types[:n] != NONE
    marks[there] = Column(**capitals).read()[types[:n][there]]
    marks[begins_unit[:n]] = NO_MARK
    starts = np.flatnonzero(begins_unit)
    following = starts[np.searchsorted(starts, np.arange(n), side="right")]
    fill(Column(**into["ids"]), begin, apply_layer(terms_of, types[:n]))
    fill(Column(**into["room"]), begin, np.minimum(following - np.arange(n), MOST_WORDS).astype(np.uint8))
    fill(Column(**into["marks"]), begin, marks)
    return {"units": int(np.count_nonzero(begins_unit[:n]))}


def _joined(
    left: Facts, right: Facts, offset: int, span: int, room: Facts, begin: int, stop: int
) -> tuple[Int64Array, UInt64Array]:
    """Places (less ``begin``) where a frequent left part has a frequent right part at its offset, and their keys."""
    first: UInt32Array = Column(**left).read(begin, stop)
    second: UInt32Array = padded(Column(**right), begin + offset, stop + offset, int(NONE))
    space: UInt8Array = Column(**room).read(begin, stop)
    places = np.flatnonzero((first != NONE) & (second != NONE) & (space >= span))
    return places, pair_keys(first[places], second[places])


def count_joins(
    left: Facts, right: Facts, offset: int, span: int, room: Facts, begin: int, stop: int, folder: str, name: str
) -> Facts:
    """Count the pairs of a left and a right part in a share, into a run."""
    _, keys = _joined(left, right, offset, span, room, begin, stop)
    return dataclasses.asdict(write_run(Path(folder), name, run_of_keys(keys)))


def merge_joins(first: int, last: int, least: int, runs: str, folder: str, name: str) -> Facts:
    """The column of keys with first <= key < last that occur ``least`` times in all runs together, ascending."""
    run = _merged(runs, first, last)
    return dataclasses.asdict(write_column(Path(folder) / f"{name}.keys", run.keys[run.counts >= least]))


def number_joins(
    left: Facts,
    right: Facts,
    offset: int,
    span: int,
    room: Facts,
    keys: Facts,
    ids: Facts,
    begin: int,
    stop: int,
    folder: str,
    name: str,
) -> Facts:
    """Write which sequence begins at each place of a share, of those whose keys are given, and count them.

    Parameters
    ----------
    keys : Column facts
        Sorted: a sequence's number is its place here.

    Returns
    -------
    dict
        The column of counts by number.
    """
    places, pairs = _joined(left, right, offset, span, room, begin, stop)
    table: UInt64Array = Column(**keys).read()
    numbers = np.full(stop - begin, NONE)
    found, there = looked_up(table, pairs)
    numbers[places[there]] = found
    fill(Column(**ids), begin, numbers)
    counts = np.bincount(found, minlength=len(table))
    return dataclasses.asdict(write_column(Path(folder) / f"{name}.counts", counts))


def survey_sequences(
    ids: Facts,
    n: int,
    words: list[int],
    room: Facts,
    marks: Facts,
    documents: Facts,
    begin: int,
    stop: int,
    folder: str,
    name: str,
) -> Facts:
    """See where ``n`` sequences stand in a share, and how they are written.

    Parameters
    ----------
    words : list of int
        Offsets of the words of the sequences, from 0; places between them are open slots.
    documents : Column facts
        Place where each document begins, ascending.

    Returns
    -------
    dict
        ``run``: number << 32 | document, with counts. Columns by number: ``capitals`` and ``marked``, how many of the
        words are written with a capital, and how many can tell; ``opening`` and ``closing``, how often the sequence
        begins and ends a unit.
    """
    numbers: UInt32Array = Column(**ids).read(begin, stop)
    places = np.flatnonzero(numbers != NONE)
    found = numbers[places]
    starts: Int64Array = Column(**documents).read()
    document = np.searchsorted(starts, places + begin, side="right") - 1
    run = run_of_keys(pair_keys(found, document.astype(np.uint32)))
    seen = padded(Column(**marks), begin, stop + words[-1], NO_MARK)
    before, space = _room_around(room, begin, stop)
    columns = {
        "capitals": np.zeros(n, np.int64),
        "marked": np.zeros(n, np.int64),
        # the place before is the last of its unit
        "opening": np.bincount(found[before[places] == 1], minlength=n),
        "closing": np.bincount(found[space[places] == words[-1] + 1], minlength=n),
    }
    for word in words:
        mark = seen[places + word]
        columns["capitals"] += np.bincount(found[mark == CAPITAL], minlength=n)
        columns["marked"] += np.bincount(found[mark != NO_MARK], minlength=n)
    place = Path(folder)
    kept = {what: dataclasses.asdict(write_column(place / f"{name}.{what}", of)) for what, of in columns.items()}
    return {"run": dataclasses.asdict(write_run(place, name, run)), **kept}


def _room_around(room: Facts, begin: int, stop: int) -> tuple[UInt8Array, UInt8Array]:
    """Room at the place before each place of a share, and at the place; the first of all counts as after a unit."""
    space: UInt8Array = Column(**room).read(begin, stop)
    last = Column(**room).read(begin - 1, begin) if begin else np.ones(1, np.uint8)
    return np.concatenate([last, space[:-1]]), space


def count_fillers(
    ids: Facts, rows: Facts, terms: Facts, slot: int, begin: int, stop: int, folder: str, name: str
) -> Facts:
    """Count the words in an open slot of some frames in a share, into a run.

    Parameters
    ----------
    rows : Column facts
        For each number of the level the row of the frame, NONE for those not asked about.
    slot : int
        Offset of the slot.

    Returns
    -------
    dict
        The run: row << 32 | term.
    """
    places, wanted = _asked_about(ids, rows, begin, stop)
    fillers: UInt32Array = padded(Column(**terms), begin + slot, stop + slot, int(NONE))[places]
    there = fillers != NONE
    return dataclasses.asdict(write_run(Path(folder), name, run_of_keys(pair_keys(wanted[there], fillers[there]))))


def count_groups(
    ids: Facts, rows: Facts, documents: Facts, groups: Facts, begin: int, stop: int, folder: str, name: str
) -> Facts:
    """Count some sequences in a share by group of documents, into a run.

    Parameters
    ----------
    rows : Column facts
        As for `count_fillers`.
    documents, groups : Column facts
        Place where each document begins, ascending, and its group.

    Returns
    -------
    dict
        The run: row << 32 | group.
    """
    places, wanted = _asked_about(ids, rows, begin, stop)
    starts: Int64Array = Column(**documents).read()
    group: Int64Array = Column(**groups).read()[np.searchsorted(starts, places + begin, side="right") - 1]
    return dataclasses.asdict(write_run(Path(folder), name, run_of_keys(pair_keys(wanted, group.astype(np.uint32)))))


def _asked_about(ids: Facts, rows: Facts, begin: int, stop: int) -> tuple[Int64Array, UInt32Array]:
    """Places (less ``begin``) where sequences begin that are asked about, and their rows."""
    numbers: UInt32Array = Column(**ids).read(begin, stop)
    row: UInt32Array = Column(**rows).read()
    places = np.flatnonzero(numbers != NONE)
    wanted = row[numbers[places]]
    return places[wanted != NONE], wanted[wanted != NONE]


def count_matches(
    ids: Facts, n: int, words: int, matches: Facts, begin: int, stop: int, folder: str, name: str
) -> Facts:
    """Count sequences where something that is as long begins: the column of counts by number.

    Parameters
    ----------
    matches : Column facts
        For each place, bit i is set where something of i words begins.
    """
    numbers: UInt32Array = Column(**ids).read(begin, stop)
    long_enough = Column(**matches).read(begin, stop) >> np.uint16(words) & np.uint16(1)
    found = numbers[(numbers != NONE) & (long_enough == 1)]
    counts = np.bincount(found, minlength=n)
    return dataclasses.asdict(write_column(Path(folder) / f"{name}.counts", counts))


def looked_up(table: UInt64Array, keys: UInt64Array) -> tuple[UInt32Array, np.ndarray]:
    """Places in the sorted table of those keys that are in it, and which of the keys these are."""
    if not len(table):
        return np.empty(0, np.uint32), np.zeros(len(keys), bool)
    place = np.searchsorted(table, keys)
    place[place == len(table)] = 0
    there = table[place] == keys
    return place[there].astype(np.uint32), there


def spread_sequences(first: int, last: int, runs: str, sizes: Facts, folder: str, name: str) -> Facts:
    """How the sequences number ``first`` to ``last`` are spread over documents.

    Parameters
    ----------
    sizes : Column facts
        Tokens of each document.

    Returns
    -------
    dict of Column facts
        ``documents`` that hold the sequence, ``largest`` count in one of them, ``distance``: the sum over documents of
        abs(share of the sequence - share of all tokens).
    """
    run = _merged(runs, first << 32, last << 32)
    number, document = left_of(run.keys).astype(np.int64) - first, right_of(run.keys)
    n = last - first
    documents = np.bincount(number, minlength=n)
    frequency = np.bincount(number, weights=run.counts, minlength=n)
    largest = np.zeros(n, np.int64)
    np.maximum.at(largest, number, run.counts)
    tokens: Int64Array = Column(**sizes).read()
    share = (tokens / max(int(tokens.sum()), 1))[document]
    # documents without the sequence add their share: begin with 1 and correct where it occurs
    distance = 1.0 + np.bincount(number, weights=np.abs(run.counts / frequency[number] - share) - share, minlength=n)
    place = Path(folder)
    columns = {"documents": documents, "largest": largest, "distance": np.maximum(distance, 0.0)}
    return {
        what: dataclasses.asdict(write_column(place / f"{name}.{what}", values)) for what, values in columns.items()
    }


def _merged(runs: str, first: int, last: int) -> Run:
    parts = [run.between(first, last) for run in load_runs(Path(runs))]
    return merge([Run(part.keys, part.counts.astype(np.int64)) for part in parts])
