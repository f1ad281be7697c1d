"""What stands around a word in every relation: one long table, the relation a column of it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from colloc.answers.around import Sides, around, headwords
from colloc.answers.columns import Columns
from colloc.answers.questions import PairOptions, measure_names, resolve_spec
from colloc.answers.sureness.wishes import Wishes
from colloc.counts.relations import chosen_relations, relation_names
from colloc.errors import UsageError
from colloc.measures.catalogue import MEASURES
from colloc.settings import DEFAULT_MEMORY
from colloc.store import vocabulary
from colloc.store.connection import Store

ALL_RELATIONS = "all"
"""Asks for every relation apart."""


def around_relations(
    store: Store,
    words: Sequence[str],
    *,
    options: PairOptions,
    side: Sides = "both",
    upos: Sequence[str] = (),
    measure: str | None = None,
    avoid: bool = False,
    wishes: Wishes | None = None,
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
    **more: Any,
) -> Columns:
    """The company of each word in every relation apart, strongest first; ``limit`` rows a word.

    The tables are made within each relation: a verb's objects are held against all objects, not against all words.
    Relations are as they are written; subtypes such as ``nmod:poss`` stand for themselves.

    Parameters
    ----------
    options : PairOptions
        Its relation is ``all``.

    The other parameters are those of `colloc.answers.around.around`.

    Returns
    -------
    Columns
        relation, role (what the word asked for is: ``head`` or ``dependent``), and the columns of ``around``.

    Raises
    ------
    UsageError
        The store holds no text with relations, or with ``avoid`` or ``upos``.
    NotSeenError
        None of the words is in the store.
    """
    if avoid or upos:
        raise UsageError("avoid and upos are asked of one relation: name it")
    chosen_relations(store, "")  # raises where there is none
    spec, margins = resolve_spec(store, replace(options, relation=""))
    terms, _ = headwords(store, spec.layer, words)
    ranking, _ = measure_names(measure, None, margins)
    wishes = wishes or Wishes()
    if wishes.min_docs is None:
        wishes = replace(wishes, min_docs=1)  # else the text would be read once for each relation
    parts = []
    for relation in relation_names(store):
        asked = replace(options, relation=relation)
        part = around(
            store,
            words,
            options=asked,
            side=side,
            measure=ranking,
            wishes=wishes,
            limit=limit,
            jobs=jobs,
            memory=memory,
            progress=progress,
            **more,
        )
        parts.append(Columns({"relation": [relation] * len(part), **part.data}, part.settings))
    together = {name: np.concatenate([part[name] for part in parts]) for name in parts[0].names}
    rows = _ordered(together, vocabulary.term_texts(store, spec.layer, terms), ranking, limit)
    settings = {**parts[0].settings, "relation": ALL_RELATIONS}
    return Columns({name: values[rows] for name, values in together.items()}, settings)


def _ordered(columns: dict[str, np.ndarray], asked: list[str], ranking: str, limit: int) -> list[int]:
    """Rows by word in the order in which words come, then by strength, joint count, word, relation and role."""
    strength = columns[ranking].astype(np.float64)
    if ranking in MEASURES and MEASURES[ranking].strongest == "lowest":
        strength = -strength
    words = {word: place for place, word in enumerate(dict.fromkeys(asked))}
    keys = [
        (words[first], -value, -joint, second, relation, role)
        for first, value, joint, second, relation, role in zip(
            columns["first"].tolist(),
            strength.tolist(),
            columns["joint"].tolist(),
            columns["second"].tolist(),
            columns["relation"].tolist(),
            columns["role"].tolist(),
            strict=True,
        )
    ]
    taken: dict[int, int] = {}
    rows = []
    for row in sorted(range(len(keys)), key=keys.__getitem__):
        word = keys[row][0]
        taken[word] = taken.get(word, 0) + 1
        if not limit or taken[word] <= limit:
            rows.append(row)
    return rows
