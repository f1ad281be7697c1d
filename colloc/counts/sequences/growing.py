"""Growing: which sequences are frequent, from the stored stream, in bounded memory.

A sequence can be frequent only if both of its parts are, all but its last word and all but its first. So each place of
the stream carries the number of the frequent sequence that begins there, or none; the numbers at neighbouring places
make a key for the sequence that is one word longer; keys are counted as pairs of words are, in sorted runs, and those
that are frequent are numbered in turn. (The idea is that of Agrawal & Srikant 1994, VLDB, for sets of items.)
Sequences with open slots are grown alike, from a left and a right part that do not touch.

Places, runs and tables of numbers lie in temporary files; in memory are only the frequent sequences.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import asdict
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np

from colloc.counts.budget import DEFAULT_MEMORY, affordable_jobs, plan_memory
from colloc.counts.keys import merge
from colloc.counts.processes import Crew, Task, crew
from colloc.counts.runs import Column, RunFile, save_runs, write_column
from colloc.counts.selection import Selection, documents_selection
from colloc.counts.sequences.levels import Level, Spread
from colloc.counts.sequences.places import NONE, fill, left_of, reserve, right_of
from colloc.counts.sequences.sharing import CAPITAL, MOST_WORDS, NO_MARK, SMALL, Facts
from colloc.counts.words import slice_word_counts
from colloc.errors import LockedError, UsageError
from colloc.records import Int64Array, UInt8Array, UInt64Array, WordCounts
from colloc.settings import Inside
from colloc.store import facts
from colloc.store.connection import Store
from colloc.store.documents import token_places
from colloc.store.scratch import place_for_readers, scratch_folder
from colloc.store.slices import select
from colloc.store.vocabulary import term_count, type_count, type_keys

Progress = Callable[[float, int, str], None]

_WORTH_A_PROCESS = 2**20
"""Tokens for which a worker is started."""
_LARGEST_SHARE = 2**20
_LEAST_RANGE = 2**16
"""Run entries that make a range of keys worth a task of its own."""
_SAMPLES = 2**17
_END = 2**64 - 1
_TYPES_AT_A_TIME = 2**16


class Grower:
    """Counts sequences of one layer in one selection; made by `growing`.

    Attributes
    ----------
    words : WordCounts
        Frequencies of the terms in the selection.
    total : int
        Tokens of the selection that are in the layer.
    units : int
        Units of the selection.
    single : Level
        The words themselves.
    """

    def __init__(
        self,
        store: Store,
        workers: Crew,
        jobs: int,
        entries: int,
        folder: Path,
        layer: str,
        inside: Inside,
        where: str,
        min_count: int,
    ) -> None:
        self._workers, self._jobs, self._entries, self._folder = workers, jobs, entries, folder
        self._least = max(min_count, 1)
        self._made = 0
        numbers = select(store, where)
        selection = documents_selection(store, numbers)
        begins, sizes = token_places(store, numbers)
        begins, sizes = _in_order(begins, sizes)
        self._selection, self._size = selection, len(selection)
        self._documents = self._keep("documents", _places(selection, begins))
        self._sizes = self._keep("sizes", sizes)
        shares = jobs * -(-self._size // (jobs * _LARGEST_SHARE)) if self._size else 0
        self._edges = [self._size * share // max(shares, 1) for share in range(shares + 1)] or [0]
        self.words: WordCounts = slice_word_counts(store, layer, where)
        self.total = int(self.words.tokens.sum())
        self._least_share = float(sizes.min() / max(sizes.sum(), 1)) if len(sizes) else 1.0
        places = {name: self._reserve(name, kind) for name, kind in (("ids", "<u4"), ("room", "|u1"), ("marks", "|u1"))}
        self._room, self._marks = places["room"], places["marks"]
        shared: Facts = {
            "layer": layer,
            "inside": inside,
            "selection": {
                "begins": self._keep("begins", selection.begins),
                "stops": self._keep("stops", selection.stops),
            },
            "capitals": self._keep("capitals", capital_marks(store)),
            "into": places,
        }
        self.units = sum(share["units"] for share in self._shares("lay_out", shared))
        nothing = np.empty(0, np.uint64)
        self.single = Level((0,), None, None, nothing, self.words.tokens, Column(**places["ids"]), None)

    def join(self, left: Level, right: Level, offset: int) -> Level:
        """The frequent sequences of a left part and a right part that begins ``offset`` places later.

        Parts may overlap; what they share stands at the same places of the text.

        Raises
        ------
        UsageError
            The sequence would reach over more than `MOST_WORDS` places.
        """
        name, words, parts = self._begun(left, right, offset)
        counted = self._shares("count_joins", parts, f"{name}-count")
        runs = [_run_file(run) for run in counted]
        least = {"least": self._least, "folder": str(self._folder)}
        tasks: list[Task] = [
            ("merge_joins", {"first": first, "last": last, "name": f"{name}-merge-{i}", **least})
            for i, (first, last) in enumerate(pairwise(self._ranges(runs)))
        ]
        merged = self._merge(tasks, runs, name)
        keys = np.concatenate([np.empty(0, np.uint64), *(_taken(part) for part in merged)])
        counts, ids = self._numbered(name, parts, keys)
        return Level(words, left, right, keys, counts, ids, self._spread(ids, words, len(keys), name))

    def known(self, left: Level, right: Level, offset: int, keys: UInt64Array) -> Level:
        """As `join`, but of given keys (ascending, each once), however often they occur, and without their spread."""
        name, words, parts = self._begun(left, right, offset)
        counts, ids = self._numbered(name, parts, keys)
        return Level(words, left, right, keys, counts, ids, None)

    def fillers(self, level: Level, numbers: Int64Array, slot: int) -> tuple[Int64Array, Int64Array, Int64Array]:
        """What stands in an open slot of some sequences of a level.

        Parameters
        ----------
        numbers : int64 array
            The sequences, each once.
        slot : int
            Offset of the slot.

        Returns
        -------
        index, term, count : int64 arrays
            Sorted by index (into ``numbers``), then by term.
        """
        self._made += 1
        name = f"fillers-{self._made}"
        rows = np.full(len(level), NONE)
        rows[numbers] = np.arange(len(numbers))
        asked = {"ids": asdict(level.ids), "terms": asdict(self.single.ids), "slot": slot, "folder": str(self._folder)}
        counted = self._shares("count_fillers", {**asked, "rows": self._keep(name, rows)}, name)
        runs = [_run_file(run) for run in counted]
        everything = merge([run.between(0, _END) for run in runs])
        index, term = left_of(everything.keys).astype(np.int64), right_of(everything.keys).astype(np.int64)
        counts = everything.counts.astype(np.int64)
        _remove(runs)
        return index, term, counts

    def keep_matches(self, matches: Iterable[tuple[Int64Array, Int64Array]]) -> Column:
        """Keep where something begins, for `matching`.

        Parameters
        ----------
        matches : iterable of (starts, lengths)
            Places of the stream and numbers of words; each part behind the one before. Those of more than `MOST_WORDS`
            words are left out.
        """
        self._made += 1
        column = self._reserve(f"matches-{self._made}", "<u2")
        for starts, lengths in matches:
            fits = lengths <= MOST_WORDS
            places = _places(self._selection, starts[fits])
            if len(places):
                begin = int(places[0])
                bits = np.zeros(int(places[-1]) - begin + 1, np.uint16)
                np.bitwise_or.at(bits, places - begin, np.uint16(1) << lengths[fits].astype(np.uint16))
                fill(Column(**column), begin, bits)
        return Column(**column)

    def matching(self, level: Level, matches: Column) -> Int64Array:
        """How many occurrences of each sequence of a level are where something of as many words begins."""
        self._made += 1
        asked = {"ids": asdict(level.ids), "n": len(level), "words": len(level.words), "matches": asdict(matches)}
        counts = np.zeros(len(level), np.int64)
        for share in self._shares("count_matches", {**asked, "folder": str(self._folder)}, f"matching-{self._made}"):
            counts += _taken(share)
        return counts

    def bags(self, terms: Int64Array) -> Int64Array:
        """How often some words stand side by side, in whatever order.

        Parameters
        ----------
        terms : int64 array, shape (n, words)
            Each row ascending; rows ascending, each once.
        """
        self._made += 1
        name = f"bags-{self._made}"
        chain = []
        before = np.zeros(len(terms), np.int64)
        for word in range(terms.shape[1]):
            keys = before.astype(np.uint64) << np.uint64(32) | terms[:, word].astype(np.uint64)
            distinct, before = np.unique(keys, return_inverse=True)
            chain.append(self._keep(f"{name}-{word}", distinct))
        asked = {"terms": asdict(self.single.ids), "room": self._room, "chain": chain, "folder": str(self._folder)}
        counts = np.zeros(len(terms), np.int64)
        for share in self._shares("count_bags", asked, name):
            counts += _taken(share)
        return counts

    def _begun(self, left: Level, right: Level, offset: int) -> tuple[str, tuple[int, ...], Facts]:
        words = tuple(sorted({*left.words, *(offset + word for word in right.words)}))
        if words[-1] >= MOST_WORDS:
            raise UsageError(f"a sequence reaches over at most {MOST_WORDS} places, not {words[-1] + 1}")
        self._made += 1
        parts = {"left": asdict(left.ids), "right": asdict(right.ids), "offset": offset, "span": words[-1] + 1}
        return f"level-{self._made}", words, {**parts, "room": self._room, "folder": str(self._folder)}

    def _numbered(self, name: str, parts: Facts, keys: UInt64Array) -> tuple[Int64Array, Column]:
        ids = self._reserve(f"{name}.ids", "<u4")
        numbering = {**parts, "keys": self._keep(f"{name}.keys", keys), "ids": ids}
        counts = np.zeros(len(keys), np.int64)
        for share in self._shares("number_joins", numbering, f"{name}-number"):
            counts += _taken(share)
        return counts, Column(**ids)

    def _spread(self, ids: Column, words: tuple[int, ...], n: int, name: str) -> Spread:
        where = {"room": self._room, "marks": self._marks, "documents": self._documents, "folder": str(self._folder)}
        survey = {"ids": asdict(ids), "n": n, "words": list(words), **where}
        sums = {what: np.zeros(n, np.int64) for what in ("capitals", "marked", "opening", "closing")}
        surveyed = self._shares("survey_sequences", survey, f"{name}-survey")
        for share in surveyed:
            for what, so_far in sums.items():
                so_far += _taken(share[what])
        runs = [_run_file(share["run"]) for share in surveyed]
        entries = sum(run.keys.n for run in runs)
        ranges = min(max(n, 1), self._range_count(entries))
        edges = sorted({n * part // ranges for part in range(ranges + 1)})
        same = {"sizes": self._sizes, "folder": str(self._folder)}
        tasks: list[Task] = [
            ("spread_sequences", {"first": first, "last": last, "name": f"{name}-spread-{i}", **same})
            for i, (first, last) in enumerate(pairwise(edges))
        ]
        parts = self._merge(tasks, runs, f"{name}-spread")
        none = np.empty(0, np.int64)
        documents, largest = (
            np.concatenate([none, *(_taken(part[what]) for part in parts)]) for what in ("documents", "largest")
        )
        dp = np.concatenate([np.empty(0), *(_taken(part["distance"]) for part in parts)]) / 2
        with np.errstate(invalid="ignore", divide="ignore"):
            written = np.where(sums["marked"] > 0, sums["capitals"] / sums["marked"], np.nan)
            dp_norm = dp / (1 - self._least_share) if self._least_share < 1 else np.full(n, np.nan)
        return Spread(documents, largest, dp, dp_norm, written, sums["opening"], sums["closing"])

    def _shares(self, task: str, arguments: Facts, name: str | None = None) -> list[Facts]:
        """Do a task for every share of the selection."""
        tasks: list[Task] = []
        for share, (begin, stop) in enumerate(pairwise(self._edges)):
            named = {"name": f"{name}-{share}"} if name is not None else {}
            tasks.append((task, {**arguments, "begin": begin, "stop": stop, **named}))
        return list(self._workers.results(tasks))

    def _merge(self, tasks: Sequence[Task], runs: Sequence[RunFile], name: str) -> list[Facts]:
        """Do tasks that read all runs, which are gone afterwards."""
        listed = self._folder / f"{name}.runs"
        save_runs(listed, runs)
        done = list(self._workers.results([(task, {**arguments, "runs": str(listed)}) for task, arguments in tasks]))
        _remove(runs)
        return done

    def _range_count(self, entries: int) -> int:
        """Into how many ranges of keys so many run entries are cut."""
        return max(1, -(-entries // self._entries), min(self._jobs, entries // _LEAST_RANGE))

    def _ranges(self, runs: Sequence[RunFile]) -> list[int]:
        """Cuts between keys, so that the ranges have about equally many entries of all runs."""
        entries = sum(run.keys.n for run in runs)
        step = max(1, entries // _SAMPLES)
        sample = np.sort(np.concatenate([np.empty(0, np.uint64), *(run.keys.read()[::step] for run in runs)]))
        ranges = self._range_count(entries)
        cuts = np.unique(sample[len(sample) * np.arange(1, ranges) // ranges]) if len(sample) else sample
        return [0, *cuts[cuts > 0].tolist(), _END]

    def _keep(self, name: str, values: Any) -> Facts:
        return asdict(write_column(self._folder / f"{name}.column", np.asarray(values)))

    def _reserve(self, name: str, kind: str) -> Facts:
        return asdict(reserve(self._folder / f"{name}.places", kind, self._size))


@contextmanager
def growing(
    store: Store,
    *,
    layer: str,
    where: str = "",
    inside: Inside = "sentence",
    min_count: int = 5,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    temp: str | os.PathLike[str] | None = None,
) -> Iterator[Grower]:
    """A `Grower` for a slice of a store; its files and processes are gone afterwards.

    Parameters
    ----------
    where : str
        The slice in canonical form; empty for all documents.
    inside : str
        What no sequence reaches beyond.
    min_count : int
        Occurrences from which a sequence is frequent.
    temp : path, optional
        Where temporary files go; as `place_for_readers` says when None.
    memory : int
        Bytes for all processes together; the tables of frequent sequences come on top.

    Raises
    ------
    UsageError
        The layer or the slice is not there.
    LockedError
        The store changed meanwhile.
    """
    if not store.writable:
        store.refresh()  # processes that count see the last commit, and so must this one
    generation = facts.generation(store)
    tokens = int(token_places(store, select(store, where))[1].sum())
    wanted = jobs if jobs is not None else os.cpu_count() or 1
    used = affordable_jobs(memory, max(1, min(wanted, tokens // _WORTH_A_PROCESS)))
    budget = plan_memory(memory, used, term_count(store, layer))
    place = place_for_readers(store.path, temp)
    with scratch_folder(store.path, place) as folder, crew(store, used) as workers:
        yield Grower(store, workers, used, budget.entries, folder, layer, inside, where, min_count)
    if not store.writable:
        store.refresh()
    if facts.generation(store) != generation:
        raise LockedError(f"{store.path}: documents were added or removed while it was counted; try again")


def capital_marks(store: Store) -> UInt8Array:
    """The mark of each type: whether its form begins with a capital; words that are one letter say nothing."""
    n = type_count(store)
    marks = np.empty(n, np.uint8)
    for first in range(0, n, _TYPES_AT_A_TIME):
        keys = type_keys(store, first, min(first + _TYPES_AT_A_TIME, n))
        forms = [key if isinstance(key, str) else key[0] for key in keys]
        marks[first : first + len(forms)] = [_mark(form) for form in forms]
    return marks


def _mark(form: str) -> int:
    if form[0].lower() == form[0].upper():
        return SMALL
    if not form[1:2].isalpha():
        # "I", "I'm": one letter that is always or never a capital tells nothing of names
        return NO_MARK
    return CAPITAL if form[0].isupper() or form[0].istitle() else SMALL


def _in_order(begins: Int64Array, sizes: Int64Array) -> tuple[Int64Array, Int64Array]:
    """Documents with tokens by their place in the stream."""
    order = np.argsort(begins, kind="stable")
    order = order[sizes[order] > 0]
    return begins[order], sizes[order]


def _places(selection: Selection, begins: Int64Array) -> Int64Array:
    """The selection's own places of places in the stream."""
    stretch = np.searchsorted(selection.begins, begins, side="right") - 1
    return begins - selection.begins[stretch] + selection.places[stretch]


def _run_file(run: Facts) -> RunFile:
    return RunFile(Column(**run["keys"]), Column(**run["counts"]))


def _remove(runs: Sequence[RunFile]) -> None:
    for run in runs:
        Path(run.keys.path).unlink()
        Path(run.counts.path).unlink()


def _taken(column: Facts) -> Any:
    """What a column holds; its file is gone afterwards."""
    values = np.array(Column(**column).read())
    Path(column["path"]).unlink()
    return values
