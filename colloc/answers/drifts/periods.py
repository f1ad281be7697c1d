"""Documents dealt into periods by a numeric metadata key, so that each period has enough of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from colloc.answers.contrasts.grouped import Groups, gather_groups
from colloc.errors import UsageError
from colloc.records import FloatArray, Int64Array
from colloc.store import documents, slices
from colloc.store.connection import Store

MOST_PERIODS = 10
"""So many periods are made at most where nobody says how many."""
LEAST_DOCUMENTS = 5
"""Each of them holds at least so many documents, where the store has enough for three periods."""
FEWEST_PERIODS = 3


@dataclass(frozen=True, slots=True)
class Periods:
    """Periods in order.

    Attributes
    ----------
    groups : Groups
        Their names (``1790..1809``) and documents.
    times : float64 array, shape (n_periods,)
        Mean time of each period's tokens.
    document_times : float64 array, shape (n_documents,)
        Time of each document of ``groups.numbers``.
    """

    groups: Groups
    times: FloatArray
    document_times: FloatArray

    def __len__(self) -> int:
        return len(self.groups)


def make_periods(
    store: Store,
    key: str,
    *,
    where: str = "",
    bins: int | None = None,
    edges: Sequence[float] = (),
    width: float | None = None,
) -> Periods:
    """Periods of the documents of a slice.

    Parameters
    ----------
    key : str
        A metadata key with numbers; documents without one are left out.
    bins : int
        So many periods of about equally many tokens.
    edges : sequence of float
        Where new periods begin.
    width : float
        Periods of this length, beginning at multiples of it.
    bins, edges and width exclude one another; without any of them the number of periods is chosen: at most
    ``MOST_PERIODS``, each of at least ``LEAST_DOCUMENTS`` documents.

    Raises
    ------
    UsageError
        No document has a number there, or there are fewer than three periods with text.
    """
    if sum((bins is not None, bool(edges), width is not None)) > 1:
        raise UsageError("bins, edges and width are three ways to make periods: give one of them")
    numbers, times = _times(store, key, where)
    sizes = _sizes(store, numbers)
    filled = sizes > 0
    numbers, times, sizes = numbers[filled], times[filled], sizes[filled]
    if len(np.unique(times)) < FEWEST_PERIODS:
        raise UsageError(
            f"{store.path}: drift needs at least {FEWEST_PERIODS} different values of {key!r} in documents with text, "
            f"not {len(np.unique(times))}"
        )
    given = bool(edges) or width is not None
    period = _by_edges(times, edges, width) if given else _by_tokens(times, sizes, bins)
    present, period = np.unique(period, return_inverse=True)
    if len(present) < FEWEST_PERIODS:
        raise UsageError(f"these periods leave {len(present)} with text; drift needs at least {FEWEST_PERIODS}")
    parts: dict[str, Int64Array] = {}
    means = []
    for place in range(len(present)):
        inside = period == place
        low, high = float(times[inside].min()), float(times[inside].max())
        parts[_written(low) if low == high else f"{_written(low)}..{_written(high)}"] = numbers[inside]
        means.append(float(np.average(times[inside], weights=sizes[inside])))
    groups = gather_groups(parts)
    document_times = times[np.searchsorted(numbers, groups.numbers)]
    return Periods(groups, np.array(means), document_times)


def _times(store: Store, key: str, where: str) -> tuple[Int64Array, FloatArray]:
    """Document numbers, ascending, with their numbers of the key."""
    found = slices.numbers_of(store, key)
    chosen = slices.fitting(store, where)
    keep = np.isin(found[0], chosen)
    if not keep.any():
        known = ", ".join(slices.metadata_keys(store)) or "none"
        raise UsageError(f"{store.path}: no document here has a number as {key!r}; keys: {known}")
    return found[0][keep], found[1][keep]


def _sizes(store: Store, numbers: Int64Array) -> Int64Array:
    _, sizes = documents.token_places(store, numbers)
    return sizes


def _by_edges(times: FloatArray, edges: Sequence[float], width: float | None) -> Int64Array:
    if width is not None:
        if width <= 0:
            raise UsageError(f"the width of a period must be above 0, not {width:g}")
        return np.floor(times / width).astype(np.int64)
    if list(edges) != sorted(set(edges)):
        raise UsageError("edges must ascend: each begins a new period")
    return np.searchsorted(np.array(edges, np.float64), times, side="right")


def _by_tokens(times: FloatArray, sizes: Int64Array, bins: int | None) -> Int64Array:
    """Neighbouring values together until each period has its share of the tokens and enough documents."""
    if bins is not None and bins < FEWEST_PERIODS:
        raise UsageError(f"drift needs at least {FEWEST_PERIODS} periods, not {bins}")
    values, place = np.unique(times, return_inverse=True)
    tokens = np.bincount(place, weights=sizes)
    held = np.bincount(place)
    wanted = bins if bins is not None else min(MOST_PERIODS, max(len(times) // LEAST_DOCUMENTS, FEWEST_PERIODS))
    wanted = min(wanted, len(values))
    least = 1 if bins is not None else min(LEAST_DOCUMENTS, len(times) // wanted)
    share = tokens.sum() / wanted
    period = np.zeros(len(values), np.int64)
    current, sum_tokens, sum_documents, before = 0, 0.0, 0, 0.0
    for row in range(len(values)):
        # A period ends where going on would take it further beyond its share than stopping leaves it short.
        full = sum_documents >= least and before + sum_tokens + tokens[row] / 2 > share * (current + 1)
        left = len(values) - row
        if sum_documents and current + 1 < wanted and (full or left <= wanted - current - 1):
            before += sum_tokens
            current, sum_tokens, sum_documents = current + 1, 0.0, 0
        period[row] = current
        sum_tokens += float(tokens[row])
        sum_documents += int(held[row])
    if current and sum_documents < least:
        period[period == current] = current - 1
    return period[place]


def _written(number: float) -> str:
    return str(int(number)) if number.is_integer() else f"{number:g}"
