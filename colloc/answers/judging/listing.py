"""Decisions as tables: the history, what counts of it, and how far judges agree."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import combinations
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.errors import MissingExtraError, NotSeenError
from colloc.store.connection import Store
from colloc.store.decisions import Decision, Key, iterate, newest

CATEGORIES = ("accept", "reject", "unsure")
LEAST_SHARED = 10
"""Matters that both judges decided from which on their kappa is told: a project-defined limit, as the variance of
kappa is one of large samples (Fleiss, Cohen & Everitt 1969)."""


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
        (95 %, asymptotic): Cohen's (1960) over accept, reject and unsure; says, why there is no kappa (nan: fewer than
        ``LEAST_SHARED`` matters, or both gave one and the same verdict throughout) or no interval of it (one of the
        judges gave one verdict throughout: kappa is 0 whatever the other did).

    Raises
    ------
    NotSeenError
        Fewer than two judges have decided anything.
    MissingExtraError
        Where statsmodels is not installed.
    """
    try:
        from statsmodels.stats.inter_rater import cohens_kappa
    except ImportError as error:
        raise MissingExtraError("agreement needs statsmodels: pip install 'colloc[judging]'") from error
    matters = _by_matter(store)
    judges = sorted({judge for decisions in matters.values() for judge in decisions})
    if len(judges) < 2:
        who = f"only one judge, {judges[0]}, has" if judges else "nobody has"
        raise NotSeenError(f"{store.path}: {who} decided anything that counts; agreement needs two judges")
    rows: list[tuple[str, str, int, int, float, float, float, str]] = []
    for one, other in combinations(judges, 2):
        table = np.zeros((len(CATEGORIES), len(CATEGORIES)), np.int64)
        for decisions in matters.values():
            if one in decisions and other in decisions:
                table[CATEGORIES.index(decisions[one].verdict), CATEGORIES.index(decisions[other].verdict)] += 1
        both, same = int(table.sum()), int(np.trace(table))
        kappa = low = high = float("nan")
        says = ""
        used = [int(np.count_nonzero(table.sum(axis=axis))) for axis in (0, 1)]
        if both < LEAST_SHARED:
            says = f"too few: {both} in common, kappa needs {LEAST_SHARED}"
        elif used == [1, 1] and same == both:
            says = "one and the same verdict throughout: nothing to compare"
        elif 1 in used:
            # Chance agreement is then all there is: kappa is 0 by its definition, and its variance degenerates.
            kappa, says = 0.0, "one of them gave one verdict throughout: no interval"
        else:
            found = cohens_kappa(table)
            kappa, low, high = float(found.kappa), float(found.kappa_low), float(found.kappa_upp)
        rows.append((one, other, both, same, kappa, low, high, says))
    columns = list(zip(*rows, strict=True))
    kinds = (object, object, np.int64, np.int64, np.float64, np.float64, np.float64, object)
    names = ("judge", "other", "both", "same", "kappa", "kappa_low", "kappa_high", "says")
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
