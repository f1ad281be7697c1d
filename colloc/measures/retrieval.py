"""How well a ranking brings what is wanted to its top: precision, recall, average precision, the best threshold.

Rows with equal scores are one step of the ranking: nothing depends on an order that the scores do not give. A score
that is no number ranks below all others.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.measures.contingency import FloatArray

_CELLS_AT_ONCE = 4_000_000


@dataclass(frozen=True, slots=True)
class Steps:
    """A ranking as its steps, best first.

    Attributes
    ----------
    scores : float64 array, shape (n_steps,)
    wanted, rows : int64 arrays, shape (n_steps,)
        How many wanted rows, and how many rows, each step has.
    """

    scores: FloatArray
    wanted: NDArray[np.int64]
    rows: NDArray[np.int64]

    @property
    def precision(self) -> FloatArray:
        """Share of wanted rows among those down to each step."""
        share: FloatArray = np.cumsum(self.wanted) / np.cumsum(self.rows)
        return share

    @property
    def recall(self) -> FloatArray:
        """Share of all wanted rows that stand down to each step."""
        share: FloatArray = np.cumsum(self.wanted) / max(int(self.wanted.sum()), 1)
        return share


def steps(wanted: ArrayLike, scores: ArrayLike) -> Steps:
    """The steps of a ranking by ``scores``, highest first.

    Parameters
    ----------
    wanted : bool array, shape (n,)
    scores : float array, shape (n,)
    """
    value = np.asarray(scores, dtype=np.float64)
    value = np.where(np.isnan(value), -np.inf, value)
    distinct, place = np.unique(-value, return_inverse=True)
    hits = np.bincount(place, weights=np.asarray(wanted, dtype=np.float64), minlength=len(distinct))
    rows = np.bincount(place, minlength=len(distinct))
    return Steps(-distinct, hits.astype(np.int64), rows.astype(np.int64))


def average_precision(ranking: Steps) -> float:
    """Sum over the steps of precision times the recall gained there; nan where nothing is wanted.

    The definition of scikit-learn's ``average_precision_score``; without ties the mean precision at the wanted rows.
    """
    total = int(ranking.wanted.sum())
    return float((ranking.precision * ranking.wanted).sum() / total) if total else float("nan")


def precision_recall_at(ranking: Steps, n: int) -> tuple[float, float]:
    """Precision and recall of the first ``n`` rows; where a step is cut, its rows are taken in random order on average.

    Fewer rows than ``n``: precision is over those there are.
    """
    ends = np.cumsum(ranking.rows)
    total = int(ranking.wanted.sum())
    size = min(n, int(ends[-1])) if len(ends) else 0
    if not size or not total:
        return float("nan"), float("nan")
    step = int(np.searchsorted(ends, size))
    before = int(ends[step - 1]) if step else 0
    hits = float(ranking.wanted[:step].sum()) + (size - before) * float(ranking.wanted[step]) / float(
        ranking.rows[step]
    )
    return hits / size, hits / total


@dataclass(frozen=True, slots=True)
class Threshold:
    """Where to cut a ranking: at ``score`` and above; precision, recall and F1 there."""

    score: float
    precision: float
    recall: float
    f1: float


def best_threshold(ranking: Steps) -> Threshold:
    """The step with the highest F1 = 2PR/(P + R); the first of several."""
    precision, recall = ranking.precision, ranking.recall
    with np.errstate(invalid="ignore"):
        f1 = np.nan_to_num(2 * precision * recall / (precision + recall))
    best = int(np.argmax(f1))
    return Threshold(float(ranking.scores[best]), float(precision[best]), float(recall[best]), float(f1[best]))


def bootstrap_average_precision(ranking: Steps, repeats: int, generator: np.random.Generator) -> FloatArray:
    """Average precision of ``repeats`` samples of the rows, drawn with replacement; nan where none is wanted.

    Drawing n rows is drawing the counts of the cells (step, wanted or not) from a multinomial; unwanted rows between
    two steps with wanted ones are one cell, since only their number matters.
    """
    has = np.flatnonzero(ranking.wanted)
    unwanted = ranking.rows - ranking.wanted
    if not len(has):
        return np.full(repeats, np.nan)
    through = np.cumsum(unwanted)[has] - unwanted[has]  # unwanted rows above each such step
    between = np.diff(through - np.concatenate([[0], unwanted[has][:-1].cumsum()]), prepend=0)
    below = int(unwanted.sum() - between.sum() - unwanted[has].sum())
    n = int(ranking.rows.sum())
    cells = np.concatenate([between, unwanted[has], ranking.wanted[has], [below]])
    width = len(has)
    at_once = max(_CELLS_AT_ONCE // len(cells), 1)
    parts: list[FloatArray] = []
    for start in range(0, repeats, at_once):
        drawn = generator.multinomial(n, cells / n, size=min(at_once, repeats - start))
        others, beside, hits = drawn[:, :width], drawn[:, width : 2 * width], drawn[:, 2 * width : 3 * width]
        rows = np.cumsum(others + beside + hits, axis=1)
        with np.errstate(invalid="ignore", divide="ignore"):
            gained = np.where(hits > 0, np.cumsum(hits, axis=1) / rows * hits, 0.0)
            parts.append(gained.sum(axis=1) / hits.sum(axis=1))
    return np.concatenate(parts)


def percentile_interval(values: Sequence[float] | FloatArray, level: float = 0.95) -> tuple[float, float]:
    """The middle part of bootstrap values; nan where there are none."""
    there = np.asarray(values, dtype=np.float64)
    there = there[~np.isnan(there)]
    if not len(there):
        return float("nan"), float("nan")
    low, high = np.quantile(there, [(1 - level) / 2, (1 + level) / 2])
    return float(low), float(high)
