"""Sequences counted as plainly as can be: what growing is checked against."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np

from colloc.counts.sequences.levels import Level
from colloc.records import NO_TERM, Int64Array
from tests.counts.brute import units_of


@dataclass
class Seen:
    """All that is asked of one sequence."""

    count: int = 0
    documents: Counter[int] = field(default_factory=Counter)
    opening: int = 0
    closing: int = 0


def sequences(
    documents: Sequence[tuple[Sequence[int], Sequence[int]]], words: Sequence[int]
) -> dict[tuple[int, ...], Seen]:
    """Every sequence of a shape.

    Parameters
    ----------
    documents : sequence of (terms, starts)
        Terms of each document, and where its units begin.
    words : sequence of int
        Offsets of the words from the first.
    """
    found: defaultdict[tuple[int, ...], Seen] = defaultdict(Seen)
    for number, (terms, starts) in enumerate(documents):
        for unit in units_of(terms, starts):
            for place, picked in _windows(unit, words):
                seen = found[picked]
                seen.count += 1
                seen.documents[number] += 1
                seen.opening += place == 0
                seen.closing += place + words[-1] == len(unit) - 1
    return dict(found)


def terms_of(level: Level) -> Int64Array:
    """Terms of the words of all sequences of a level: shape (n, words)."""
    if level.left is None or level.right is None:
        return np.arange(len(level))[:, None]
    left, right = terms_of(level.left)[level.lefts], terms_of(level.right)[level.rights]
    # the parts may overlap, but not so much that the last word of the right part is not the last of all
    begin = len(level.words) - right.shape[1]
    assert (left[:, begin:] == right[:, : left.shape[1] - begin]).all()
    return np.concatenate([left[:, :begin], right], axis=1)


def fillers(
    documents: Sequence[tuple[Sequence[int], Sequence[int]]], words: Sequence[int], wanted: tuple[int, ...], slot: int
) -> Counter[int]:
    """What stands at an offset between the words of one sequence."""
    found: Counter[int] = Counter()
    for terms, starts in documents:
        for unit in units_of(terms, starts):
            found.update(unit[place + slot] for place, picked in _windows(unit, words) if picked == wanted)
    found.pop(int(NO_TERM), None)
    return found


def _windows(unit: Sequence[int], words: Sequence[int]) -> Iterator[tuple[int, tuple[int, ...]]]:
    for place in range(len(unit) - words[-1]):
        picked = tuple(unit[place + word] for word in words)
        if NO_TERM not in picked:
            yield place, picked
