"""A ranking learnt from labels: regularised logistic regression over the measures, with honest cross-validation.

Candidates that share their first word are never divided between training and test. The
strength of the regularisation is chosen inside each training part, and so is the
single measure that the combination is compared with.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.answers.appraisal.labelled import Labelled
from colloc.answers.columns import Columns
from colloc.errors import MissingExtraError, UsageError
from colloc.measures.retrieval import average_precision, steps
from colloc.records import FloatArray

FOLDS, INNER_FOLDS = 5, 3
STRENGTHS = (0.01, 0.1, 1.0, 10.0)
"""Inverse strengths of the regularisation that are tried."""
LEAST = 20
"""Wanted candidates, and others, from which on something can be learnt."""
MOST_TRAINED = 10_000
"""Candidates a model learns from: all wanted ones and a seeded choice of the others."""


@dataclass(frozen=True, slots=True)
class Combination:
    """What was learnt.

    Attributes
    ----------
    out_of_fold : float64 array, shape (n,)
        For each candidate the log odds by a model that has not seen it.
    folds : Columns
        fold, candidates, wanted, combined (average precision of the combination), single (of the measure that was
        best in training), measure (its name), strength (chosen).
    weights : Columns
        measure and weight of the model learnt from everything, on scores brought to a normal distribution.
    model : object
        That model, for :func:`ranked`.
    measures : tuple of str
    """

    out_of_fold: FloatArray
    folds: Columns
    weights: Columns
    model: _Model
    measures: tuple[str, ...]


def combine(labelled: Labelled, scores: dict[str, FloatArray], *, seed: int = 0) -> Combination:
    """Learn a combined ranking.

    Parameters
    ----------
    scores : dict of str to float64 array
        Ranking values by measure.

    Raises
    ------
    MissingExtraError
        Where scikit-learn is not installed.
    UsageError
        For too few wanted candidates, others or first words.
    """
    try:
        from sklearn.model_selection import StratifiedGroupKFold
    except ImportError as error:
        raise MissingExtraError("a combined ranking needs scikit-learn: pip install 'colloc[judging]'") from error
    features, wanted = _features(scores), labelled.wanted
    groups = labelled.groups
    few = min(int(wanted.sum()), int((~wanted).sum()))
    of_wanted = min(len(np.unique(groups[wanted])), len(np.unique(groups[~wanted]))) if few else 0
    if few < LEAST or of_wanted < FOLDS:
        raise UsageError(
            f"{int(wanted.sum())} wanted and {int((~wanted).sum())} other {labelled.what} are too few to learn "
            f"from: "
            f"{LEAST} of each are needed, with at least {FOLDS} different first words"
        )
    generator = np.random.default_rng(seed)
    out = np.full(len(wanted), np.nan)
    rows: list[dict[str, Any]] = []
    folds = StratifiedGroupKFold(FOLDS, shuffle=True, random_state=seed)
    for number, (train, test) in enumerate(folds.split(features, wanted, groups), 1):
        train = _thinned(train, wanted, generator)
        strength, model = _learnt(features[train], wanted[train], groups[train], seed)
        out[test] = model.odds(features[test])
        best = max(scores, key=lambda name: average_precision(steps(wanted[train], scores[name][train])))
        rows.append(
            {
                "fold": number,
                "candidates": len(test),
                "wanted": int(wanted[test].sum()),
                "combined": average_precision(steps(wanted[test], out[test])),
                "single": average_precision(steps(wanted[test], scores[best][test])),
                "measure": best,
                "strength": strength,
            }
        )
    everything = _thinned(np.arange(len(wanted)), wanted, generator)
    _, model = _learnt(features[everything], wanted[everything], groups[everything], seed)
    weights = {"measure": list(scores), "weight": model.weights}
    order = np.argsort(-np.abs(model.weights), kind="stable")
    settings = {"seed": seed, "groups": "first word", "folds": FOLDS}
    columns = {name: [row[name] for row in rows] for name in rows[0]}
    fold_columns = {name: values if name == "measure" else np.array(values) for name, values in columns.items()}
    return Combination(
        out, Columns(fold_columns, settings), Columns(weights, settings).take(order), model, tuple(scores)
    )


def ranked(combination: Combination, labelled: Labelled, min_count: int, limit: int) -> Columns:
    """What the store has, as the model learnt from everything ranks it: see `Labelled.ranked`."""
    return labelled.ranked(
        combination.measures, lambda scores: combination.model.odds(_features(scores)), min_count, limit
    )


def _features(scores: dict[str, FloatArray]) -> FloatArray:
    """Infinities and what is no number at the ends of what is there: only the order matters to what follows."""
    columns = []
    for values in scores.values():
        finite = values[np.isfinite(values)]
        low, high = (float(finite.min()), float(finite.max())) if len(finite) else (0.0, 0.0)
        columns.append(np.nan_to_num(values, nan=low, posinf=high, neginf=low))
    return np.stack(columns, axis=1)


def _thinned(rows: NDArray[np.int64], wanted: NDArray[np.bool_], generator: np.random.Generator) -> NDArray[np.int64]:
    """All wanted rows and as many others as a model learns from; fewer others move the odds, not the order."""
    if len(rows) <= MOST_TRAINED:
        return rows
    hits, others = rows[wanted[rows]], rows[~wanted[rows]]
    kept = generator.choice(others, min(len(others), max(MOST_TRAINED - len(hits), len(hits))), replace=False)
    return np.sort(np.concatenate([hits, kept]))


def _learnt(
    features: FloatArray, wanted: NDArray[np.bool_], groups: NDArray[np.int64], seed: int
) -> tuple[float, _Model]:
    """The strength with the least log loss in an inner cross-validation, and the model learnt with it."""
    from sklearn.model_selection import StratifiedGroupKFold

    losses = dict.fromkeys(STRENGTHS, 0.0)
    inner = StratifiedGroupKFold(INNER_FOLDS, shuffle=True, random_state=seed)
    for train, test in inner.split(features, wanted, groups):
        if len(np.unique(wanted[train])) < 2:
            continue
        places = _Places(features[train])
        seen, unseen = places.of(features[train]), places.of(features[test])
        for strength in STRENGTHS:
            odds = _regression(strength).fit(seen, wanted[train]).decision_function(unseen)
            losses[strength] += float(np.logaddexp(0.0, np.where(wanted[test], -odds, odds)).sum())
    strength = min(losses, key=lambda one: (losses[one], one))
    places = _Places(features)
    return strength, _Model(places, _regression(strength).fit(places.of(features), wanted))


def _regression(strength: float) -> Any:
    from sklearn.linear_model import LogisticRegression

    return LogisticRegression(C=strength, max_iter=2000)


class _Places:
    """Scores brought to a normal distribution by their places among those of the training.

    Normal scores of the mid-ranks (Blom 1958: (rank - 3/8) / (n + 1/4)); equal values have equal scores.
    """

    def __init__(self, features: FloatArray) -> None:
        self._sorted = np.sort(features, axis=0)

    def of(self, features: FloatArray) -> FloatArray:
        """Normal scores, of the shape of ``features``."""
        from scipy.special import ndtri

        n, ranks = len(self._sorted), np.empty(features.shape)
        for one in range(features.shape[1]):
            known, values = self._sorted[:, one], features[:, one]
            ranks[:, one] = (np.searchsorted(known, values, "left") + np.searchsorted(known, values, "right") + 1) / 2
        found: FloatArray = ndtri(np.clip((ranks - 0.375) / (n + 0.25), 0.25 / n, 1 - 0.25 / n))
        return found


@dataclass(frozen=True, slots=True)
class _Model:
    """What was learnt from some candidates."""

    places: _Places
    regression: Any

    def odds(self, features: FloatArray) -> FloatArray:
        """Log odds of being wanted."""
        found: FloatArray = self.regression.decision_function(self.places.of(features))
        return found

    @property
    def weights(self) -> FloatArray:
        """One a feature."""
        found: FloatArray = self.regression.coef_[0]
        return found
