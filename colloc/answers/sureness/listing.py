"""The chance floors of a store as a table."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.questions import PairOptions, ask
from colloc.answers.sureness.floors import SHUFFLES, floor_measures, floor_summary, obtain_floors
from colloc.settings import DEFAULT_MEMORY
from colloc.store.connection import Store


def listed_floors(
    store: Store,
    options: PairOptions,
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Callable[[float, int, str], None] | None = None,
) -> Columns:
    """Both floors of one way to count, made where the store does not have them.

    Returns
    -------
    Columns
        shuffle, expected_from (where the band begins), pairs and met (pairs of words in the band, and how many of
        them met, on average over the rounds of shuffling), and for each measure its floor, nan where fewer than
        1 % of the pairs met.
    """
    question = ask(store, options, jobs=jobs, memory=memory, progress=progress)
    parts = []
    settings = question.settings(measures=list(floor_measures(question)))
    for shuffle in SHUFFLES:
        floors = obtain_floors(question, shuffle, jobs=jobs, memory=memory, progress=progress)
        summary = floor_summary(floors)
        parts.append(Columns({"shuffle": [shuffle] * len(floors.edges), **summary}))
        settings |= {"seed": floors.seed, "rounds": floors.rounds}
    return Columns({name: np.concatenate([part[name] for part in parts]) for name in parts[0].names}, settings)
