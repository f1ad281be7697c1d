"""How well a space agrees with people: rank correlation with lists of word pairs and their judged similarity."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.spaces.likeness import Space
from colloc.errors import UsageError
from colloc.records import FloatArray

RESAMPLES = 1000
LEVEL = 0.95


@dataclass(frozen=True, slots=True)
class JudgedPairs:
    """Word pairs with the judgement of people.

    Attributes
    ----------
    name : str
        The file.
    pairs : sequence of (str, str)
    scores : float64 array, shape (n,)
    """

    name: str
    pairs: Sequence[tuple[str, str]]
    scores: FloatArray


def agreement(space: Space, lists: Sequence[JudgedPairs], *, seed: int = 0) -> Columns:
    """Spearman's correlation of cosines with judgements, for each list.

    Pairs with a word that the space lacks are left out, and counted in ``covered``.

    Returns
    -------
    Columns
        list, pairs, covered (pairs with both words), coverage (share), spearman, low, high: the limits of the 95 %
        percentile bootstrap interval over pairs (Efron & Tibshirani 1993, chapter 13; 1,000 resamples, seeded).
    """
    rows = [_one(space, judged, seed) for judged in lists]
    names = ("list", "pairs", "covered", "coverage", "spearman", "low", "high")
    columns: dict[str, Any] = {name: [row[place] for row in rows] for place, name in enumerate(names)}
    for name in names[1:]:
        columns[name] = np.array(columns[name])
    return Columns(columns, {**space.settings, "level": LEVEL, "resamples": RESAMPLES})


def _one(space: Space, judged: JudgedPairs, seed: int) -> tuple[Any, ...]:
    from scipy.stats import rankdata

    first = space.numbers([pair[0] for pair in judged.pairs])
    second = space.numbers([pair[1] for pair in judged.pairs])
    known = (first >= 0) & (second >= 0)
    covered = int(known.sum())
    if covered < 3:
        raise UsageError(f"{judged.name}: {covered} of its pairs have both words in the space; at least 3 are needed")
    cosines = space.cosines(first[known], second[known])
    scores = judged.scores[known]

    def correlations(index: np.ndarray) -> FloatArray:
        one, other = (rankdata(values[index], axis=-1) for values in (cosines, scores))
        one -= one.mean(axis=-1, keepdims=True)
        other -= other.mean(axis=-1, keepdims=True)
        result: FloatArray = (one * other).sum(axis=-1) / np.sqrt((one**2).sum(axis=-1) * (other**2).sum(axis=-1))
        return result

    with np.errstate(invalid="ignore", divide="ignore"):
        found = correlations(np.arange(covered)[np.newaxis])[0]
        draws = np.random.default_rng(seed).integers(0, covered, size=(RESAMPLES, covered))
        low, high = np.nanquantile(correlations(draws), [(1 - LEVEL) / 2, (1 + LEVEL) / 2])
    return judged.name, len(judged.pairs), covered, covered / len(judged.pairs), found, low, high
