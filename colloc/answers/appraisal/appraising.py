"""Every measure held against labels: precision, recall, average precision with an interval, the best threshold."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from colloc.answers.appraisal.labelled import Labelled
from colloc.answers.columns import Columns
from colloc.errors import UsageError
from colloc.measures.retrieval import (
    average_precision,
    best_threshold,
    bootstrap_average_precision,
    percentile_interval,
    precision_recall_at,
    steps,
)
from colloc.records import FloatArray

DEFAULT_PLACES = (100,)
REPEATS = 1000


def appraised(
    labelled: Labelled,
    scores: dict[str, FloatArray],
    *,
    at: Sequence[int] = DEFAULT_PLACES,
    repeats: int = REPEATS,
    seed: int = 0,
) -> Columns:
    """One row a ranking, best first.

    Parameters
    ----------
    scores : dict of str to float64 array
        Ranking values by name, highest first.
    at : sequence of int
        Places at which precision and recall are told.
    repeats, seed : int
        Of the bootstrap over candidates.

    Returns
    -------
    Columns
        measure, average_precision, ap_low, ap_high (95 %), precision_at_N and recall_at_N (nan where there are fewer
        than N candidates), threshold (in the unit of
        the measure, with the highest F1) and threshold_precision, threshold_recall, threshold_f1. The threshold was
        chosen on the same candidates, so its precision and recall flatter it a little.
    """
    if any(place < 1 for place in at):
        raise UsageError("places in a ranking begin at 1")
    rows: list[dict[str, Any]] = []
    for name, values in scores.items():
        ranking = steps(labelled.wanted, values)
        drawn = bootstrap_average_precision(ranking, repeats, np.random.default_rng(seed))
        low, high = percentile_interval(drawn)
        row: dict[str, Any] = {
            "measure": name,
            "average_precision": average_precision(ranking),
            "ap_low": low,
            "ap_high": high,
        }
        for place in dict.fromkeys(at):
            there = precision_recall_at(ranking, place) if place <= len(labelled) else (np.nan, np.nan)
            row[f"precision_at_{place}"], row[f"recall_at_{place}"] = there
        cut = best_threshold(ranking)
        row["threshold"] = -cut.score if labelled.turned(name) else cut.score
        row |= {"threshold_precision": cut.precision, "threshold_recall": cut.recall, "threshold_f1": cut.f1}
        rows.append(row)
    rows.sort(key=lambda row: (-row["average_precision"], row["measure"]))
    columns = {name: [row[name] for row in rows] for name in rows[0]}
    arrays = {name: values if name == "measure" else np.array(values, np.float64) for name, values in columns.items()}
    return Columns(arrays, settings_of(labelled, repeats=repeats, seed=seed))


def settings_of(labelled: Labelled, **more: Any) -> dict[str, Any]:
    """How the candidates were counted, how many were held against what."""
    wanted = int(labelled.wanted.sum())
    return labelled.settings(
        candidates=len(labelled),
        wanted=wanted,
        share_wanted=round(wanted / max(len(labelled), 1), 6),
        listed=labelled.listed,
        passed_over=labelled.passed_over,
        **more,
    )
