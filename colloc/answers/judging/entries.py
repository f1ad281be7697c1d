"""What was accepted, with everything a dictionary wants beside it: the entries that are handed on."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass
from typing import Any, Literal

from colloc.answers.expressions.measures import MEASURES as EXPRESSION_MEASURES
from colloc.answers.expressions.measures import SCORES
from colloc.answers.judging.figures import Figures, figures
from colloc.answers.judging.listing import standing
from colloc.answers.judging.matters import Matter, matter_of
from colloc.answers.questions import PairOptions, measure_names, resolve_spec
from colloc.measures.catalogue import MEASURES
from colloc.records import MetaValue
from colloc.settings import DEFAULT_MEMORY
from colloc.store import documents, vocabulary
from colloc.store.connection import Store
from colloc.store.decisions import Decision, Example, Key


@dataclass(frozen=True, slots=True)
class Line:
    """An example with the metadata of its document; empty where the document has left the store."""

    example: Example
    metadata: Mapping[str, MetaValue]


@dataclass(frozen=True, slots=True)
class Sense:
    """One meaning: ``text`` as its judges wrote it, empty where they wrote none."""

    text: str
    labels: tuple[str, ...]
    notes: tuple[str, ...]
    lines: tuple[Line, ...]


@dataclass(frozen=True, slots=True)
class Entry:
    """One accepted pair or expression.

    Attributes
    ----------
    identifier : str
        A letter and a checksum of what the entry is about: the same in every store and every format.
    senses : tuple of Sense
        At least one.
    judges : tuple of (str, str)
        Who accepted it and when.
    """

    identifier: str
    matter: Matter
    figures: Figures
    senses: tuple[Sense, ...]
    judges: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class ScoreFacts:
    """What a score is: for people and for the formats that describe their properties.

    Attributes
    ----------
    kind : {"pair", "expression"}
        What has it.
    bond : bool
        Whether it says how well the words hold together, as a score of collocation does.
    """

    name: str
    title: str
    formula: str
    unit: str
    kind: Literal["pair", "expression"] = "pair"
    bond: bool = True


@dataclass(frozen=True, slots=True)
class Entries:
    """Accepted entries and the corpus they come from.

    Attributes
    ----------
    entries : tuple of Entry
        By text.
    scores : tuple of ScoreFacts
        In the order in which they are shown; the first is the main one.
    tokens, documents : int
        Size of the corpus.
    counting : str
        How pairs were counted, in words.
    settings : mapping
        The same as JSON values.
    disputed : int
        Matters left out because a judge accepted and another rejected them.
    """

    entries: tuple[Entry, ...]
    scores: tuple[ScoreFacts, ...]
    tokens: int
    documents: int
    counting: str
    settings: Mapping[str, Any]
    disputed: int


def accepted_entries(
    store: Store,
    *,
    judge: str | None = None,
    measures: Sequence[str] | None = None,
    options: PairOptions | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Entries:
    """Everything that one judge accepted, or that somebody accepted and nobody rejected.

    Parameters
    ----------
    measures : sequence of str
        Scores of pairs; those shown by default when not given. Expressions have scores of their own, all of them.
    options : PairOptions
        How pairs are counted for the numbers beside them.
    """
    options = options or PairOptions()
    spec, margins = resolve_spec(store, options)
    names = measure_names(None, None, margins)[1] if measures is None else tuple(dict.fromkeys(measures))
    accepted, disputed = _accepted(standing(store, judge))
    matters = [matter_of(decisions[0]) for decisions in accepted]
    numbers = figures(store, matters, names, options, jobs=jobs, memory=memory, progress=progress)
    known: dict[str, Mapping[str, MetaValue]] = {}
    entries = [
        Entry(
            identifier_of(matter.key),
            matter,
            figure,
            _senses(store, decisions, known),
            tuple((one.judge, one.decided) for one in decisions),
        )
        for matter, figure, decisions in zip(matters, numbers, accepted, strict=True)
    ]
    entries.sort(key=lambda entry: (entry.matter.text, entry.matter.kind, entry.matter.layer))
    shown = [name for name in names if any(name in entry.figures.scores for entry in entries)]
    facts = [ScoreFacts(name, MEASURES[name].title, MEASURES[name].formula, MEASURES[name].unit) for name in shown]
    whole = [entry.figures.scores for entry in entries if entry.matter.kind == "expression"]
    for name in SCORES:
        if any(name in scores for scores in whole):
            one = EXPRESSION_MEASURES[name]
            facts.append(ScoreFacts(name, one.title, one.formula, one.unit, kind="expression", bond=one.bond))
    return Entries(
        tuple(entries),
        tuple(facts),
        int(vocabulary.word_counts(store, "form").tokens.sum()),
        documents.document_count(store),
        counting_in_words(asdict(spec), margins),
        {"store": store.path.name, **asdict(spec), "margins": margins, "measures": list(names), "judge": judge},
        disputed,
    )


def identifier_of(key: Key) -> str:
    """A name for a matter that XML, IRIs and spreadsheets all take."""
    data = json.dumps(key, ensure_ascii=False).encode("utf-8", "surrogatepass")
    return "e" + hashlib.blake2b(data, digest_size=8).hexdigest()


def counting_in_words(spec: Mapping[str, Any], margins: str) -> str:
    """How pairs are counted, for people."""
    inside = f"inside one {spec['inside']}"
    reach = {
        "window": f"window of {spec['right']} words on either side, {inside}",
        "unit": f"together in one {spec['inside']}",
        "relation": f"syntactic relation {spec['relation'] or '(any)'}",
    }.get(spec["kind"], f"window of {spec['left']} words to the left and {spec['right']} to the right, {inside}")
    where = f"; documents where {spec['where']}" if spec["where"] else ""
    return f"layer {spec['layer']}; {reach}; margins of {margins}{where}"


def _accepted(decisions: Sequence[Decision]) -> tuple[list[list[Decision]], int]:
    matters: dict[Key, list[Decision]] = {}
    for one in decisions:
        matters.setdefault(one.key, []).append(one)
    accepted, disputed = [], 0
    for group in matters.values():
        verdicts = {one.verdict for one in group}
        if {"accept", "reject"} <= verdicts:
            disputed += 1
        elif "accept" in verdicts:
            accepted.append([one for one in group if one.verdict == "accept"])
    return accepted, disputed


def _senses(
    store: Store, decisions: Sequence[Decision], known: dict[str, Mapping[str, MetaValue]]
) -> tuple[Sense, ...]:
    """Judges who wrote the same sense share it; those who wrote none add to the first."""
    texts = list(dict.fromkeys(one.sense for one in decisions if one.sense)) or [""]
    senses = []
    for place, text in enumerate(texts):
        group = [one for one in decisions if one.sense == text or (not one.sense and place == 0)]
        examples = {(one.place, one.text): one for decision in group for one in decision.examples}
        senses.append(
            Sense(
                text,
                tuple(dict.fromkeys(label for one in group for label in one.labels)),
                tuple(dict.fromkeys(one.note for one in group if one.note)),
                tuple(Line(example, _metadata(store, example.document, known)) for example in examples.values()),
            )
        )
    return tuple(senses)


def _metadata(store: Store, identifier: str, known: dict[str, Mapping[str, MetaValue]]) -> Mapping[str, MetaValue]:
    if identifier not in known:
        number = documents.find_document(store, identifier)
        known[identifier] = documents.document(store, number).metadata if number is not None else {}
    return known[identifier]
