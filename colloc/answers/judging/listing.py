"""Decisions as tables: the history, what counts of it, and how far judges agree."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import combinations
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.errors import MissingExtraError
from colloc.store.connection import Store
from colloc.store.decisions import Decision, Key, iterate, newest

CATEGORIES = ("accept", "reject", "unsure")


def standing(store: Store, judge: str | None = None) -> list[Decision]:
    """The decisions that count, oldest first: of each judge the newest on each matter, unless it was withdrawn."""
    kept = [(number, one) for number, one in newest(store).values() if one.verdict != "withdrawn"]
    return [one for _, one in sorted(kept, key=lambda row: row[0]) if judge is None or one.judge == judge]


def listed(store: Store, *, judge: str | None = None, history: bool = False) -> Columns:
    """Decisions, oldest first.

    Parameters
    ----------
    history : bool
        Everything that was ever decided, not only what counts.

    Returns
    -------
    Columns
        words, verdict, sense, note, labels, examples, judge, decided, layer, kind. Words, labels and examples are
        lists, so that as JSON Lines the rows can be taken into another store.
    """
    chosen = (
        [one for _, one in iterate(store) if judge is None or one.judge == judge] if history else standing(store, judge)
    )
    names = ("words", "verdict", "sense", "note", "labels", "examples", "judge", "decided", "layer", "kind")
    rows = [one.to_dict() for one in chosen]
    return Columns(
        {name: _objects(row[name] for row in rows) for name in names},
        {"store": str(store.path), "judge": judge, "history": history},
    )


def _objects(values: Iterable[Any]) -> np.ndarray:
    rows = list(values)
    array = np.empty(len(rows), dtype=object)
    for place, value in enumerate(rows):
        array[place] = value
    return array


def _by_matter(store: Store) -> dict[Key, dict[str, Decision]]:
    found: dict[Key, dict[str, Decision]] = {}
    for one in standing(store):
        found.setdefault(one.key, {})[one.judge] = one
    return found


def agreement(store: Store) -> Columns:
    """How far each two judges agree on what both decided.

    Returns
    -------
    Columns
        judge, other, both (matters), same (how many of them have the same verdict), kappa and kappa_low, kappa_high
        (95 %, asymptotic): Cohen's (1960) over accept, reject and unsure; nan where both gave one and the same verdict
        throughout.

    Raises
    ------
    MissingExtraError
        Where statsmodels is not installed.
    """
    try:
        from statsmodels.stats.inter_rater import cohens_kappa
    except ImportError as error:
        raise MissingExtraError("agreement needs statsmodels: pip install 'colloc[judging]'") from error
    matters = _by_matter(store)
    judges = sorted({judge for decisions in matters.values() for judge in decisions})
    rows: list[tuple[str, str, int, int, float, float, float]] = []
    for one, other in combinations(judges, 2):
        table = np.zeros((len(CATEGORIES), len(CATEGORIES)), np.int64)
        for decisions in matters.values():
            if one in decisions and other in decisions:
                table[CATEGORIES.index(decisions[one].verdict), CATEGORIES.index(decisions[other].verdict)] += 1
        both, same = int(table.sum()), int(np.trace(table))
        kappa = low = high = float("nan")
        by_chance = float((table.sum(axis=0) * table.sum(axis=1)).sum())
        if both and by_chance < both**2:
            # Where one judge gave one verdict throughout, the variance can come out a rounding error below 0.
            with np.errstate(invalid="ignore"):
                found = cohens_kappa(table)
            kappa, low, high = float(found.kappa), float(found.kappa_low), float(found.kappa_upp)
        rows.append((one, other, both, same, kappa, low, high))
    columns = list(zip(*rows, strict=True)) or [()] * 7
    kinds = (object, object, np.int64, np.int64, np.float64, np.float64, np.float64)
    names = ("judge", "other", "both", "same", "kappa", "kappa_low", "kappa_high")
    arrays = {name: np.array(values, kind) for name, values, kind in zip(names, columns, kinds, strict=True)}
    return Columns(arrays, {"store": str(store.path), "categories": list(CATEGORIES)})


def disagreements(store: Store) -> Columns:
    """Matters on which judges do not agree, a row for each judge.

    Returns
    -------
    Columns
        As :func:`listed`.
    """
    differing = [
        one
        for decisions in _by_matter(store).values()
        if len({decision.verdict for decision in decisions.values()}) > 1
        for one in decisions.values()
    ]
    names = ("words", "judge", "verdict", "sense", "note", "labels", "decided", "layer", "kind")
    rows = [one.to_dict() for one in differing]
    return Columns({name: _objects(row[name] for row in rows) for name in names}, {"store": str(store.path)})
