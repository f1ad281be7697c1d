"""The stored text with its words shuffled: what chance alone makes of it.

The places of units, documents and gaps stay; the words trade places within given parts (each document, or the whole
selection). Every order of the words of a part is equally likely.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from colloc.counts.selection import Selection
from colloc.counts.spans import Stretch, read_stretches
from colloc.errors import UsageError
from colloc.records import NO_TERM, Anchors, Int64Array, UInt32Array
from colloc.settings import Inside
from colloc.store.connection import Store
from colloc.store.stream import Block, append_block

LARGEST_URN = 10**9 - 1
"""Words of one part: numpy draws without putting back from no more."""


class Urn:
    """Words to be drawn without putting back, known by how often each is in it.

    Parameters
    ----------
    counts : int64 array, shape (n_terms,)

    Raises
    ------
    UsageError
        More than `LARGEST_URN` words.
    """

    def __init__(self, counts: Int64Array) -> None:
        self._terms = np.flatnonzero(counts).astype(np.uint32)
        self._left = counts[self._terms].astype(np.int64)
        if self._left.sum() > LARGEST_URN:
            raise UsageError(
                f"{self._left.sum():,} words cannot be shuffled together, {LARGEST_URN:,} at most: "
                "ask for a part of the documents with where"
            )

    def draw(self, n: int, random: np.random.Generator) -> UInt32Array:
        """The next ``n`` words, in random order."""
        taken = random.multivariate_hypergeometric(self._left, n, method="marginals")
        self._left -= taken
        words = np.repeat(self._terms, taken)
        random.shuffle(words)
        return words


def shuffled_stretches(
    store: Store,
    layer: UInt32Array,
    n_terms: int,
    selection: Selection,
    inside: Inside,
    parts: Int64Array,
    random: np.random.Generator,
) -> Iterator[Stretch]:
    """The selection with its words shuffled, in memory for one block and the frequencies of one part.

    Parameters
    ----------
    parts : int64 array
        Places where the parts begin within which words trade places, ascending; the first is 0.
    """
    edges = np.append(parts, len(selection))
    urns: dict[int, Urn] = {}
    for stretch in read_stretches(store, layer, selection, inside):
        first, last = np.searchsorted(edges, [stretch.first, stretch.stop - 1], side="right") - 1
        cuts = np.clip(edges[first : last + 2], stretch.first, stretch.stop) - stretch.first
        part = np.repeat(np.arange(first, last + 1), np.diff(cuts))
        terms = _shuffled_within(stretch.terms, part, random)
        # the part that goes on from before comes first, so that its urn is used before the next one takes its place
        for number in range(int(first), int(last) + 1, max(int(last - first), 1)):
            begin, stop = int(edges[number]), int(edges[number + 1])
            if begin >= stretch.first and stop <= stretch.stop:
                continue
            if number not in urns:
                urns = {number: Urn(_frequencies(store, layer, n_terms, selection, inside, begin, stop))}
            here = np.flatnonzero((part == number) & (terms != NO_TERM))
            terms[here] = urns[number].draw(len(here), random)
        yield Stretch(stretch.first, terms, stretch.units)


def _shuffled_within(terms: UInt32Array, part: Int64Array, random: np.random.Generator) -> UInt32Array:
    """Words trade places within each part of this stretch; gaps stay where they are."""
    there = np.flatnonzero(terms != NO_TERM)
    # two sorts in one: the part in front, then chance
    keys = part[there].astype(np.uint64) << np.uint64(32)
    keys |= random.integers(0, 2**32, len(there), dtype=np.uint64)
    shuffled = terms.copy()
    shuffled[there] = terms[there][np.argsort(keys)]
    return shuffled


def _frequencies(
    store: Store, layer: UInt32Array, n_terms: int, selection: Selection, inside: Inside, begin: int, stop: int
) -> Int64Array:
    counts = np.zeros(n_terms, np.int64)
    for stretch in read_stretches(store, layer, selection, inside, begin, stop):
        counts += np.bincount(stretch.terms[stretch.terms != NO_TERM], minlength=n_terms)
    return counts


def keep_stretches(target: Store, stretches: Iterator[Stretch]) -> None:
    """Write stretches as the stream of ``target``, a store of `colloc.store.aside.stream_aside`."""
    none = np.empty(0, np.int64)
    for number, stretch in enumerate(stretches):
        units = stretch.units - stretch.first
        # whatever a window is kept inside of, these are the units; the first tokens may go on in the unit before
        block = Block(
            number=number,
            first_token=stretch.first,
            tokens=stretch.terms,
            sentences=units,
            paragraphs=units,
            document_starts=units,
            document_numbers=np.full(len(units), -1, np.int64),
            continues=True,
            anchors=Anchors(none, none),
        )
        with target.transaction():
            append_block(target, block)
