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
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from dataclasses import asdict
from functools import partial

import numpy as np

from colloc.counts.budget import DEFAULT_MEMORY, affordable_jobs, plan_memory
from colloc.counts.grouping import deal
from colloc.counts.keys import merge
from colloc.counts.processes import crew
from colloc.counts.runs import Column
from colloc.counts.selection import Selection, documents_selection
from colloc.counts.sequences.capitals import capital_marks
from colloc.counts.sequences.ground import Ground, written_with_capitals
from colloc.counts.sequences.levels import Level, Spread
from colloc.counts.sequences.places import NONE, fill, left_of, right_of
from colloc.counts.sequences.sharing import MOST_WORDS, Facts
from colloc.counts.sequences.sharing_out import END, Shop, remove_runs, run_file, taken
from colloc.counts.words import slice_word_counts
from colloc.errors import LockedError, UsageError
from colloc.records import Int64Array, UInt32Array, UInt64Array, WordCounts
from colloc.settings import Inside
from colloc.store import facts
from colloc.store.connection import Store
from colloc.store.documents import token_places
from colloc.store.scratch import place_for_readers, scratch_folder
from colloc.store.slices import select
from colloc.store.vocabulary import term_count

_WORTH_A_PROCESS = 2**20
"""Tokens for which a worker is started."""


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
    ground : Ground
        What it goes by, for sets of words.
    groups : int
        Groups that the documents are dealt into, for intervals.
    """

    def __init__(
        self, store: Store, make_shop: Callable[[int], Shop], layer: str, inside: Inside, where: str, min_count: int
    ) -> None:
        self._least = max(min_count, 1)
        self._made = 0
        numbers = select(store, where)
        self._selection = documents_selection(store, numbers)
        begins, sizes = _in_order(*token_places(store, numbers))
        self._shop = make_shop(len(self._selection))
        self._folder = {"folder": str(self._shop.folder)}
        self._documents = self._shop.keep("documents", _places(self._selection, begins))
        kept_sizes = self._shop.keep("sizes", sizes)
        dealt = deal(len(sizes))
        self.groups = int(dealt.max(initial=-1)) + 1
        self._groups = self._shop.keep("groups", dealt)
        least_share = float(sizes.min() / max(sizes.sum(), 1)) if len(sizes) else 1.0
        self.words: WordCounts = slice_word_counts(store, layer, where)
        self.total = int(self.words.tokens.sum())
        kinds = {"ids": "<u4", "room": "|u1", "marks": "|u1"}
        places = {name: self._shop.reserve(name, kind) for name, kind in kinds.items()}
        self._room, self._marks = places["room"], places["marks"]
        stretches = {name: self._shop.keep(name, getattr(self._selection, name)) for name in ("begins", "stops")}
        marks = self._shop.keep("capitals", capital_marks(store))
        laid = {"layer": layer, "inside": inside, "selection": stretches, "capitals": marks, "into": places}
        self.units = sum(share["units"] for share in self._shop.share_out("lay_out", laid))
        self.ground = Ground(
            self._shop, places["ids"], self._room, self._marks, self._documents, kept_sizes, least_share
        )
        nothing = np.empty(0, np.uint64)
        self.single = Level((0,), None, None, nothing, self.words.tokens, Column(**places["ids"]), None)

    def join(self, left: Level, right: Level, offset: int, also: UInt64Array | None = None) -> Level:
        """The frequent sequences of a left part and a right part that begins ``offset`` places later.

        Parts may overlap; what they share stands at the same places of the text.

        Parameters
        ----------
        also : uint64 array, optional
            Keys of sequences that are wanted too, however often they occur.

        Raises
        ------
        UsageError
            The sequence would reach over more than `MOST_WORDS` places.
        """
        name, words, parts = self._begun(left, right, offset)
        runs = [run_file(run) for run in self._shop.share_out("count_joins", parts, f"{name}-count")]
        least = {"least": self._least}
        merged = self._shop.merge("merge_joins", self._shop.key_cuts(runs), least, runs, f"{name}-merge")
        keys = np.concatenate([np.empty(0, np.uint64), *(taken(part) for part in merged)])
        if also is not None:
            keys = np.union1d(keys, also)
        counts, ids = self._numbered(name, parts, keys)
        return Level(words, left, right, keys, counts, ids, self._spread(ids, words, len(keys), name))

    def known(self, left: Level, right: Level, offset: int, keys: UInt64Array, *, spread: bool = False) -> Level:
        """As `join`, but of given keys (ascending, each once), however often they occur; with their spread if asked."""
        name, words, parts = self._begun(left, right, offset)
        counts, ids = self._numbered(name, parts, keys)
        seen = self._spread(ids, words, len(keys), name) if spread else None
        return Level(words, left, right, keys, counts, ids, seen)

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
        asked = {"terms": asdict(self.single.ids), "slot": slot}
        return self._beside(level, _wanted(level, numbers), "count_fillers", asked)

    def by_group(self, level: Level, rows: UInt32Array) -> Int64Array:
        """How often sequences of a level occur in each group of documents (`colloc.counts.grouping.deal`).

        Parameters
        ----------
        rows : uint32 array, shape (len(level),)
            The row that each sequence is counted in, or `NONE`.

        Returns
        -------
        int64 array, shape (rows, groups)
        """
        counts = np.zeros((int(rows[rows != NONE].max(initial=0)) + 1, self.groups), np.int64)
        asked = {"documents": self._documents, "groups": self._groups}
        row, group, count = self._beside(level, rows, "count_groups", asked)
        counts[row, group] = count
        return counts

    def _beside(
        self, level: Level, rows: UInt32Array, task: str, asked: Facts
    ) -> tuple[Int64Array, Int64Array, Int64Array]:
        """What a task counts beside some sequences: row, what is there, and how often; sorted."""
        self._made += 1
        name = f"beside-{self._made}"
        facts = {"ids": asdict(level.ids), "rows": self._shop.keep(name, rows), **asked, **self._folder}
        runs = [run_file(run) for run in self._shop.share_out(task, facts, name)]
        everything = merge([run.between(0, END) for run in runs])
        index, there = left_of(everything.keys).astype(np.int64), right_of(everything.keys).astype(np.int64)
        counts = everything.counts.astype(np.int64)
        remove_runs(runs)
        return index, there, counts

    def keep_matches(self, matches: Iterable[tuple[Int64Array, Int64Array]]) -> Column:
        """Keep where something begins, for `matching`.

        Parameters
        ----------
        matches : iterable of (starts, lengths)
            Places of the stream and numbers of words; each part behind the one before. Those of more than `MOST_WORDS`
            words are left out.
        """
        self._made += 1
        column = self._shop.reserve(f"matches-{self._made}", "<u2")
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
        for share in self._shop.share_out("count_matches", {**asked, **self._folder}, f"matching-{self._made}"):
            counts += taken(share)
        return counts

    def _begun(self, left: Level, right: Level, offset: int) -> tuple[str, tuple[int, ...], Facts]:
        words = tuple(sorted({*left.words, *(offset + word for word in right.words)}))
        if words[-1] >= MOST_WORDS:
            raise UsageError(f"a sequence reaches over at most {MOST_WORDS} places, not {words[-1] + 1}")
        self._made += 1
        parts = {"left": asdict(left.ids), "right": asdict(right.ids), "offset": offset, "span": words[-1] + 1}
        return f"level-{self._made}", words, {**parts, "room": self._room, **self._folder}

    def _numbered(self, name: str, parts: Facts, keys: UInt64Array) -> tuple[Int64Array, Column]:
        ids = self._shop.reserve(f"{name}.ids", "<u4")
        numbering = {**parts, "keys": self._shop.keep(f"{name}.keys", keys), "ids": ids}
        counts = np.zeros(len(keys), np.int64)
        for share in self._shop.share_out("number_joins", numbering, f"{name}-number"):
            counts += taken(share)
        return counts, Column(**ids)

    def _spread(self, ids: Column, words: tuple[int, ...], n: int, name: str) -> Spread:
        where = {"room": self._room, "marks": self._marks, "documents": self._documents, **self._folder}
        survey = {"ids": asdict(ids), "n": n, "words": list(words), **where}
        sums = {what: np.zeros(n, np.int64) for what in ("capitals", "marked", "opening", "closing")}
        surveyed = self._shop.share_out("survey_sequences", survey, f"{name}-survey")
        for share in surveyed:
            for what, so_far in sums.items():
                so_far += taken(share[what])
        runs = [run_file(share["run"]) for share in surveyed]
        written = written_with_capitals(sums["capitals"], sums["marked"])
        spread = self.ground.over_documents(runs, n, name)
        return Spread(*spread, written, sums["opening"], sums["closing"])


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
        yield Grower(store, partial(Shop, workers, used, budget.entries, folder), layer, inside, where, min_count)
    if not store.writable:
        store.refresh()
    if facts.generation(store) != generation:
        raise LockedError(f"{store.path}: documents were added or removed while it was counted; try again")


def _wanted(level: Level, numbers: Int64Array) -> UInt32Array:
    """The place of each sequence of a level among some of them, or NONE."""
    rows = np.full(len(level), NONE)
    rows[numbers] = np.arange(len(numbers))
    return rows


def _in_order(begins: Int64Array, sizes: Int64Array) -> tuple[Int64Array, Int64Array]:
    """Documents with tokens by their place in the stream."""
    order = np.argsort(begins, kind="stable")
    order = order[sizes[order] > 0]
    return begins[order], sizes[order]


def _places(selection: Selection, begins: Int64Array) -> Int64Array:
    """The selection's own places of places in the stream."""
    stretch = np.searchsorted(selection.begins, begins, side="right") - 1
    return begins - selection.begins[stretch] + selection.places[stretch]
