"""Sets of words that stand near each other in whatever order: found, or looked up, in bounded memory."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from colloc.counts.keys import merge
from colloc.counts.runs import RunFile
from colloc.counts.sequences.ground import Ground, written_with_capitals
from colloc.counts.sequences.places import left_of, right_of
from colloc.counts.sequences.sharing import Facts
from colloc.counts.sequences.sharing_out import END, remove_runs, run_file, taken
from colloc.records import FloatArray, Int64Array, UInt64Array


@dataclass(frozen=True, slots=True, eq=False)
class WordSets:
    """Sets of one number of words; arrays of shape (n,) where not said otherwise.

    Attributes
    ----------
    terms : int64 array, shape (n, words)
        Each row ascending, a word as often as it is in the set; rows ascending.
    counts : int64 array
        Choices of places at which the set stands.
    adjacent : int64 array
        Those of them that are side by side.
    documents, largest, dp_norm, capitals
        As in `colloc.counts.sequences.levels.Spread`.
    chances : int
        Choices of places that there are, whatever stands there.
    """

    terms: Int64Array
    counts: Int64Array
    adjacent: Int64Array
    documents: Int64Array
    largest: Int64Array
    dp_norm: FloatArray
    capitals: FloatArray
    chances: int

    def __len__(self) -> int:
        return len(self.terms)


def set_shapes(words: int, gap: int) -> list[tuple[int, ...]]:
    """Offsets of all choices of places with at most ``gap`` other places between the first and the last."""
    return [(0, *rest) for rest in combinations(range(1, words + gap), words - 1)]


class SetCounter:
    """Counts sets on the ground that sequences are grown on.

    Parameters
    ----------
    gap : int
        Words of others between the first and the last place, at most.
    """

    def __init__(self, ground: Ground, gap: int) -> None:
        self._ground, self._gap, self._made = ground, gap, 0

    def frequent(self, words: int, tokens: Int64Array, least: int) -> Int64Array:
        """The sets of so many words that meet at least ``least`` times: their terms, as in `WordSets`.

        Parameters
        ----------
        tokens : int64 array
            How often each term occurs.
        """
        # one occurrence is in as many choices of places as there are shapes and places in them: a word between two of
        # another meets it twice
        most = words * len(set_shapes(words, self._gap))
        chain = [np.flatnonzero(tokens * most >= least).astype(np.uint64)]
        kept = [self._keep(chain[0])]
        shop = self._ground.shop
        for _ in range(words - 1):
            runs, name = [], self._name()
            for place, shape in enumerate(set_shapes(words, self._gap)):
                counted = shop.share_out("count_sets", self._asked(shape, kept), f"{name}-{place}")
                runs += [run_file(share["run"]) for share in counted]
            merged = shop.merge("merge_joins", shop.key_cuts(runs), {"least": least}, runs, f"{name}-merge")
            chain.append(np.concatenate([np.empty(0, np.uint64), *(taken(part) for part in merged)]))
            kept.append(self._keep(chain[-1]))
        return _unchained(chain)

    def survey(self, terms: Int64Array) -> WordSets:
        """Given sets, however often they meet: ``terms`` as in `WordSets`, each once."""
        n, words = terms.shape
        kept, name, shop = self._kept(terms), self._name(), self._ground.shop
        sums = {what: np.zeros(n, np.int64) for what in ("times", "capitals", "marked")}
        adjacent, chances = np.zeros(n, np.int64), 0
        runs: list[RunFile] = []
        more = {"marks": self._ground.marks, "documents": self._ground.documents}
        for place, shape in enumerate(set_shapes(words, self._gap)):
            for share in shop.share_out("survey_sets", {**self._asked(shape, kept), **more}, f"{name}-{place}"):
                found = {what: taken(share[what]) for what in sums}
                for what, values in found.items():
                    sums[what] += values
                if shape[-1] == words - 1:
                    adjacent += found["times"]
                chances += share["chances"]
                runs.append(run_file(share["run"]))
        documents, largest, _, dp_norm = self._ground.over_documents(runs, n, name)
        capitals = written_with_capitals(sums["capitals"], sums["marked"])
        return WordSets(terms, sums["times"], adjacent, documents, largest, dp_norm, capitals, chances)

    def orders(self, terms: Int64Array) -> tuple[Int64Array, Int64Array, Int64Array]:
        """In which orders given sets meet.

        Returns
        -------
        index : int64 array, shape (m,)
            Row of ``terms``; sorted.
        ordered : int64 array, shape (m, words)
            The terms in an order that occurs.
        count : int64 array, shape (m,)
        """
        words = terms.shape[1]
        kept, name, runs = self._kept(terms), self._name(), []
        for place, shape in enumerate(set_shapes(words, self._gap)):
            found = self._ground.shop.share_out("count_orders", self._asked(shape, kept), f"{name}-{place}")
            runs += [run_file(run) for run in found]
        everything = merge([run.between(0, END) for run in runs])
        index, code = left_of(everything.keys).astype(np.int64), right_of(everything.keys).astype(np.int64)
        counts = everything.counts.astype(np.int64)
        remove_runs(runs)
        ordered = np.empty((len(index), words), np.int64)
        for word in range(words):
            ordered[np.arange(len(index)), code // words**word % words] = terms[index, word]
        return index, ordered, counts

    def _asked(self, shape: Sequence[int], chain: list[Facts]) -> Facts:
        ground = self._ground
        return {
            "terms": ground.terms,
            "room": ground.room,
            "shape": list(shape),
            "chain": chain,
            "folder": ground.folder,
        }

    def _name(self) -> str:
        self._made += 1
        return f"sets-{self._gap}-{self._made}"

    def _keep(self, keys: UInt64Array) -> Facts:
        return self._ground.shop.keep(f"{self._name()}-chain", keys)

    def _kept(self, terms: Int64Array) -> list[Facts]:
        return [self._keep(link) for link in chained(terms)]


def chained(terms: Int64Array) -> list[UInt64Array]:
    """The chain (`colloc.counts.sequences.set_tasks`) of some sets, whose places in its last column are their rows.

    Parameters
    ----------
    terms : int64 array, shape (n, words)
        As in `WordSets`.
    """
    chain: list[UInt64Array] = []
    before: Int64Array = np.zeros(len(terms), np.int64)
    for word in range(terms.shape[1]):
        keys = before.astype(np.uint64) << np.uint64(32) | terms[:, word].astype(np.uint64)
        distinct, before = np.unique(keys, return_inverse=True)
        chain.append(distinct)
    return chain


def rows_in(chain: Sequence[UInt64Array], terms: Int64Array) -> Int64Array:
    """Rows of sets that are all in a chain."""
    rows = np.searchsorted(chain[0], terms[:, 0].astype(np.uint64))
    for word, link in enumerate(chain[1:], 1):
        rows = np.searchsorted(link, rows.astype(np.uint64) << np.uint64(32) | terms[:, word].astype(np.uint64))
    return rows.astype(np.int64)


def _unchained(chain: list[UInt64Array]) -> Int64Array:
    """The terms of the sets in the last column of a chain."""
    place = np.arange(len(chain[-1]))
    columns: list[Int64Array] = []
    for link in reversed(chain[1:]):
        columns.append(right_of(link[place]).astype(np.int64))
        place = left_of(link[place]).astype(np.int64)
    return np.stack([chain[0][place].astype(np.int64), *reversed(columns)], axis=1)
