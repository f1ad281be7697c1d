"""The syntactic relations between the two words of a pair, in text that is annotated with heads."""

from __future__ import annotations

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.questions import Question
from colloc.counts.relations import read_dependents
from colloc.counts.selection import slice_selection
from colloc.measures.contingency import expected
from colloc.measures.pmi import npmi
from colloc.records import NO_TERM, Int64Array
from colloc.store import vocabulary
from colloc.store.annotation import RELATION, values_of


def relation_rows(question: Question, first: int, second: int) -> Columns | None:
    """How often one word is the head of the other in each relation, and how strong that is within the relation.

    Every pair of head and dependent of the question's documents is counted, however far apart: no window applies.

    Parameters
    ----------
    first, second : int
        Terms of the question's layer.

    Returns
    -------
    Columns or None
        relation, head, dependent (words), joint, head_total (pairs of the relation with that head), dependent_total
        (with that dependent), total (pairs of the relation), expected, npmi; the most frequent first, only what is
        met. None where the store holds no text with relations.
    """
    names = values_of(question.store, RELATION)
    if not names:
        return None
    ways = [(first, second)] if first == second else [(first, second), (second, first)]
    total, counts = _counted(question, ways, len(names))
    texts = vocabulary.term_texts(question.store, question.layer, [first, second])
    words = [tuple(texts), tuple(reversed(texts))]
    found = [(-int(counts[way, 0, row]), names[row], way, row) for way, row in np.argwhere(counts[:, 0] > 0).tolist()]
    order = [(way, row) for _, _, way, row in sorted(found)]
    joint, heads, dependents = (np.array([counts[way, of, row] for way, row in order], np.int64) for of in range(3))
    totals = total[[row for _, row in order]]
    return Columns(
        {
            "relation": [names[row] for _, row in order],
            "head": [words[way][0] for way, _ in order],
            "dependent": [words[way][1] for way, _ in order],
            "joint": joint,
            "head_total": heads,
            "dependent_total": dependents,
            "total": totals,
            "expected": expected(joint, heads, dependents, totals),
            "npmi": npmi(joint, heads, dependents, totals),
        }
    )


def _counted(question: Question, ways: list[tuple[int, int]], n_relations: int) -> tuple[Int64Array, Int64Array]:
    """Pairs of each relation; and by way, for pairs, heads and dependents, and by relation."""
    store, spec = question.store, question.spec
    total = np.zeros(n_relations, np.int64)
    counts = np.zeros((len(ways), 3, n_relations), np.int64)
    layer = vocabulary.layer_map(store, question.layer)
    for part in read_dependents(store, layer, slice_selection(store, spec.where), ""):
        heads, dependents = part.terms[part.heads], part.terms[part.dependents]
        words = (heads != NO_TERM) & (dependents != NO_TERM)
        total += np.bincount(part.relations[words], minlength=n_relations)
        for way, (head, dependent) in enumerate(ways):
            governs, depends = words & (heads == head), words & (dependents == dependent)
            for row, chosen in enumerate((governs & depends, governs, depends)):
                counts[way, row] += np.bincount(part.relations[chosen], minlength=n_relations)
    return total, counts
