"""The definitions of the counts, written out as plainly as can be: what the kernels are checked against."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence

import numpy as np

from colloc.counts.keys import Run
from colloc.records import NO_TERM, TokenSpan

Cells = dict[tuple[int, int], int]


def units_of(terms: Sequence[int], starts: Sequence[int]) -> Iterator[list[int]]:
    """The units of a stream, tokens in order, `NO_TERM` kept in place."""
    inner = sorted({start for start in starts if 0 < start < len(terms)})
    for begin, stop in zip([0, *inner], [*inner, len(terms)], strict=True):
        yield [int(term) for term in terms[begin:stop]]


def windows(terms: Sequence[int], starts: Sequence[int], left: int, right: int) -> Cells:
    """M_right + transpose(M_left)."""
    cells: Counter[tuple[int, int]] = Counter()
    for unit in units_of(terms, starts):
        for i, x in enumerate(unit):
            for j, y in enumerate(unit):
                if NO_TERM in (x, y):
                    continue
                if 1 <= j - i <= right:
                    cells[x, y] += 1
                if 1 <= i - j <= left:
                    cells[x, y] += 1
    return dict(cells)


def windows_fast(terms: Sequence[int], starts: Sequence[int], left: int, right: int) -> Cells:
    """The same for long text: only neighbours are looked at."""
    cells: Counter[tuple[int, int]] = Counter()
    for unit in units_of(terms, starts):
        for distance in range(1, max(left, right) + 1):
            pairs = list(zip(unit, unit[distance:], strict=False))
            if distance <= right:
                cells.update(pairs)
            if distance <= left:
                cells.update((y, x) for x, y in pairs)
    return {pair: count for pair, count in cells.items() if NO_TERM not in pair}


def positions(terms: Sequence[int], starts: Sequence[int], left: int, right: int) -> Cells:
    """Tokens of x with at least one y at distance -left..right, the token itself left out."""
    cells: Counter[tuple[int, int]] = Counter()
    for unit in units_of(terms, starts):
        for i, x in enumerate(unit):
            around = unit[max(0, i - left) : i] + unit[i + 1 : i + right + 1]
            cells.update((x, y) for y in set(around))
    return {pair: count for pair, count in cells.items() if NO_TERM not in pair}


def units(terms: Sequence[int], starts: Sequence[int]) -> Cells:
    """Units that contain both x and y, for x < y."""
    cells: Counter[tuple[int, int]] = Counter()
    for unit in units_of(terms, starts):
        present = sorted({term for term in unit if term != NO_TERM})
        cells.update((x, y) for k, x in enumerate(present) for y in present[k + 1 :])
    return dict(cells)


def cells_of(run: Run) -> Cells:
    """A run as a dictionary, decoded key by key."""
    found: Cells = {}
    for key, count in zip(run.keys.tolist(), run.counts.tolist(), strict=True):
        low, high = key >> 32, key >> 1 & 0x7FFFFFFF
        pair = (high, low) if key & 1 else (low, high)
        assert low <= high
        assert pair not in found
        found[pair] = count
    return found


def span(terms: Sequence[int], starts: Sequence[int] = (), context: int = 0, ahead: int = 0) -> TokenSpan:
    """A `TokenSpan` of Python numbers."""
    return TokenSpan(np.array(terms, np.uint32), np.array(sorted(starts), np.int64), context, ahead)
