"""Entries made by hand, with whatever texts a test wants in them."""

from __future__ import annotations

from dataclasses import replace

from colloc.answers.judging.entries import Entries, Entry, Line, ScoreFacts, Sense, identifier_of
from colloc.answers.judging.figures import Figures
from colloc.answers.judging.matters import Matter
from colloc.store.decisions import Example, Kind

TABLE = {"first_total": 120, "second_total": 80, "total": 10_000, "expected": 0.96}


def entry(
    words: tuple[str, ...], kind: Kind, senses: tuple[Sense, ...], scores: dict[str, float], layer: str = "fold"
) -> Entry:
    matter = Matter(layer, kind, words)
    table = dict(TABLE) if kind != "expression" else {}
    figures = Figures(12, 5, tuple(range(30, 30 + len(words))), table, scores)
    return Entry(identifier_of(matter.key), matter, figures, senses, (("Anna", "2026-01-01T10:00:00+00:00"),))


def line(document: str, start: int, before: str, words: list[str], between: str, after: str) -> Line:
    """A text with marked words."""
    text, marks = before, []
    for place, word in enumerate(words):
        text += between if place else ""
        marks.append((len(text), len(text) + len(word)))
        text += word
    return Line(Example(document, start, text + after, tuple(marks)), {"author": "A. Keeper", "year": 1881, "no": None})


def sample(text: str = "a thick one") -> Entries:
    """A pair with two senses, a directed pair, an expression, and one with an open place."""
    fog = Sense(
        text or "-",
        (text or "-", "at sea"),
        (text or "-",),
        (line(f"log {text}", 7, f"The {text}", ["thick", "fog"], " ", f" came {text}"),),
    )
    other = Sense("another", (), (), ())
    bare = Sense("", (), (), (line("log-2", 0, "", ["strong", "wind"], ", strong ", "."),))
    phrase = Sense("on the whole", ("adverb",), (), (line("log-3", 3, "And ", ["by and large"], "", " so"),))
    entries = (
        entry(("thick", "fog"), "pair", (fog, other), {"pmi": 3.5, "npmi": float("inf")}),
        entry(("strong", "wind"), "directed", (bare,), {"pmi": -0.5, "npmi": 0.25}),
        entry(("by", "and", "large"), "expression", (phrase,), {"specific_correlation": 9.25}),
        entry(("take", "*", "into", "account"), "expression", (Sense("", (), (), ()),), {}),
        entry(("thick", "fog"), "pair", (other,), {"pmi": 1.0}, layer="form"),
    )
    scores = (
        *(ScoreFacts(name, name.upper(), f"log2 {name}", "bits") for name in ("pmi", "npmi")),
        ScoreFacts("specific_correlation", "specific correlation", "log2 p", "bits", kind="expression"),
    )
    return Entries(entries, scores, 10_000, 60, "layer fold; window of 5 words", {"layer": "fold"}, 0)


def without(entries: Entries, *kinds: str) -> Entries:
    return replace(entries, entries=tuple(one for one in entries.entries if one.matter.kind not in kinds))
