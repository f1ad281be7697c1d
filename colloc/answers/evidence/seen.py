"""What a pair looks like in the text: its forms, its order, its best example lines."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.concordance import finding
from colloc.answers.concordance.choosing import choose
from colloc.answers.concordance.finding import Hits
from colloc.answers.concordance.lines import as_columns, read_lines
from colloc.answers.concordance.matching import Search
from colloc.answers.concordance.passages import PassageReader, StreamReader
from colloc.answers.evidence.occurring import PairOccurrences
from colloc.answers.questions import Question
from colloc.records import NO_TERM, UInt32Array
from colloc.store import vocabulary
from colloc.store.texts import has_text

MOST_FORMS = 12


def examples_and_forms(
    seen: PairOccurrences, first: int, second: int, examples: int, seed: int
) -> tuple[Columns, Columns]:
    """The best lines with the pair (none where no text is kept), and the forms and order in which it is met.

    Forms are counted over occurrences of the first word, each with the nearest second word. Where the store has
    lemmas, all forms of the two lemmas count.
    """
    question, hits = seen.question, seen.hits
    store, spec = question.store, question.spec
    if not has_text(store):
        reader = StreamReader(store)
        shown = []
    else:
        passages = PassageReader(store)
        reader = passages
        chosen = np.empty(0, np.int64)
        if examples and len(hits):
            chosen = choose(store, passages, hits, question.layer, examples, seed)
        shown = read_lines(passages, hits.take(chosen), 0, True)
    lines = as_columns(store, shown, {"found": len(hits), "best": True}, paired=True)
    if "lemma" in vocabulary.layer_names(store) and question.layer not in ("lemma", "lemma_fold"):
        of_type = vocabulary.layer_map(store, question.layer)
        one, two = (_same_lemma(question, of_type == term) for term in (first, second))
        search = _search(one, two)
        hits = finding.find(store, search, left=seen.left, right=seen.right, inside=spec.inside, where=spec.where)
    return lines, _forms(reader, hits, same=first == second)


def _search(first: np.ndarray, second: np.ndarray) -> Search:
    masks: UInt32Array = first.astype(np.uint32) | second.astype(np.uint32) << np.uint32(1)
    return Search(masks, (1, 1))


def _same_lemma(question: Question, types: np.ndarray) -> np.ndarray:
    """All types whose lemma is one of the lemmas of some types."""
    lemma_of = vocabulary.layer_map(question.store, "lemma")
    lemmas = np.unique(lemma_of[types])
    same: np.ndarray = np.isin(lemma_of, lemmas[lemmas != NO_TERM]) | types
    return same


def _forms(reader: StreamReader, hits: Hits, *, same: bool) -> Columns:
    """Rows of forms and order; those of a word with itself stand in the order of the text, whichever is the case."""
    firsts = reader.forms(reader.types_at(hits.places))
    seconds = reader.forms(reader.types_at(hits.partners))
    orders = ["after" if distance > 0 else "before" for distance in hits.distances.tolist()]
    met: Iterable[tuple[str, str, str]] = zip(firsts, seconds, orders, strict=True)
    if same:
        met = ((two, one, "after") if order == "before" else (one, two, order) for one, two, order in met)
    counted = Counter(met)
    rows = sorted(counted.items(), key=lambda entry: (-entry[1], entry[0]))
    shown = rows[:MOST_FORMS]
    rest = sum(count for _, count in rows[MOST_FORMS:])
    if rest:
        shown.append((("(others)", "(others)", "either"), rest))
    return Columns(
        {
            "first_form": [forms[0] for forms, _ in shown],
            "second_form": [forms[1] for forms, _ in shown],
            "order": [forms[2] for forms, _ in shown],
            "count": np.array([count for _, count in shown], np.int64),
        }
    )
