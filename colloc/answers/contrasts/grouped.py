"""Given pairs, or words, in many groups of documents at once: one pass over the stream for all groups."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from colloc.answers.questions import Question
from colloc.answers.tables import PairTable, Sums, TableMaker
from colloc.counts.candidates import CandidatePass
from colloc.errors import UsageError
from colloc.records import Int64Array, UInt32Array, WordCounts
from colloc.store import slices
from colloc.store.connection import Store

MOST_GROUPS = 1000
"""More values than this are no groups but names of documents."""


@dataclass(frozen=True, slots=True)
class Groups:
    """Documents in groups.

    Attributes
    ----------
    names : tuple of str
    numbers : int64 array, shape (n,)
        Document numbers in the store, ascending; those of no group are left out.
    group : int64 array, shape (n,)
        Index into ``names``.
    """

    names: tuple[str, ...]
    numbers: Int64Array
    group: Int64Array

    def __len__(self) -> int:
        return len(self.names)

    def of(self, numbers: Int64Array) -> Int64Array:
        """The group of each document; ``len(self)`` for those of no group."""
        place = np.searchsorted(self.numbers, numbers)
        place[place == len(self.numbers)] = 0
        known = self.numbers[place] == numbers if len(self.numbers) else np.zeros(len(numbers), np.bool_)
        return np.where(known, self.group[place] if len(self.group) else 0, len(self.names))

    @property
    def sizes(self) -> Int64Array:
        """Documents of each group."""
        return np.bincount(self.group, minlength=len(self.names))


def groups_by_value(store: Store, key: str, within: Sequence[str] = ()) -> Groups:
    """A group for each value of a metadata key, in the order of :func:`slices.values_of`.

    Raises
    ------
    UsageError
        No document has the key, all have the same value, or there are more values than `MOST_GROUPS`.
    """
    values = slices.values_of(store, key)
    if not values:
        known = ", ".join(slices.metadata_keys(store)) or "none"
        raise UsageError(f"{store.path}: no document has the key {key!r}; keys: {known}")
    if len(values) > MOST_GROUPS:
        raise UsageError(f"{store.path}: {key!r} has {len(values)} values; a contrast takes at most {MOST_GROUPS}")
    parts: dict[str, Int64Array] = {}
    for value in values:
        numbers = slices.select(store, slices.canonical([f"{slices.quoted(key)}={slices.quoted(value)}", *within]))
        if len(numbers):
            parts[value] = numbers
    if len(parts) < 2:
        raise UsageError(f"{store.path}: {key!r} has only one value here; a contrast needs at least two")
    return gather_groups(parts)


def gather_groups(parts: Mapping[str, Int64Array]) -> Groups:
    """Groups from the document numbers of each."""
    numbers = np.concatenate([np.empty(0, np.int64), *parts.values()])
    group = np.repeat(np.arange(len(parts)), [len(part) for part in parts.values()])
    order = np.argsort(numbers, kind="stable")
    return Groups(tuple(parts), numbers[order], group[order])


@dataclass(frozen=True, slots=True)
class GroupedPairs:
    """Pairs in groups.

    Attributes
    ----------
    tables : list of PairTable
        One for each group, the pairs in the order given.
    documents : int64 array, shape (n_groups, n)
        Documents of the group that hold the pair.
    largest : int64 array, shape (n_groups, n)
        The most that one document of the group has.
    """

    tables: list[PairTable]
    documents: Int64Array
    largest: Int64Array

    @property
    def joint(self) -> Int64Array:
        """Joint counts, shape (n_groups, n)."""
        return np.stack([table.joint for table in self.tables])

    @property
    def arguments(self) -> tuple[np.ndarray, ...]:
        """joint, first_total, second_total, total with the groups along the last axis, shape (n, n_groups)."""
        stacked = zip(*(table.arguments for table in self.tables), strict=True)
        return tuple(np.stack(column, axis=-1).astype(np.float64) for column in stacked)


def pairs_in_groups(question: Question, first: UInt32Array, second: UInt32Array, groups: Groups) -> GroupedPairs:
    """The contingency tables of given pairs in every group, counted as the question's tally counts.

    Parameters
    ----------
    question : Question
        About the documents of all groups, or more.
    """
    n, n_groups = len(first), len(groups)
    found = CandidatePass(question.store, question.spec, first, second, directed=question.reader.ordered, groups=1)
    found.group_of = groups.of(found.documents.numbers)
    # One group more, for the documents of no group.
    shape = (n_groups + 1, n)
    joint, documents, largest = (np.zeros(shape, np.int64) for _ in range(3))
    for part in found:
        group = found.group_of[np.searchsorted(found.documents.numbers, part.document)]
        np.add.at(joint, (group, part.pair), part.count)
        np.add.at(documents, (group, part.pair), 1)
        np.maximum.at(largest, (group, part.pair), part.count)
    assert found.margins is not None  # the iteration has come to its end
    margins = found.margins
    one, two = found.first.astype(np.uint32), found.second.astype(np.uint32)
    tables = []
    for place in range(n_groups):
        sums = [_row(table, place) for table in (margins.first, margins.second, margins.words)]
        total = int(margins.total[place]) if place < len(margins.total) else 0
        words = WordCounts(sums[2], np.zeros_like(sums[2]))
        maker = TableMaker(Sums(question.spec, total, sums[0], sums[1]), question.convention, words)
        made = maker.counted(one, two, joint[place])
        tables.append(replace(made, first=first, second=second))
    return GroupedPairs(tables, documents[:n_groups], largest[:n_groups])


def _row(table: Int64Array, group: int) -> Int64Array:
    """The sums of a group; groups after the last that has documents have none."""
    return table[group] if group < len(table) else np.zeros(table.shape[1], np.int64)
