"""TEI Lex-0: an entry for each pair or expression, in the subset of ``tei_subset.rng``.

The standard has no element for counts from a corpus; they stand in notes of type
``frequency`` and ``score``, one number each.
"""

from __future__ import annotations

from colloc.answers.judging.entries import Entries, Entry, Line
from colloc.answers.judging.matters import OPEN
from colloc.exports.entries.markup import document, element, text
from colloc.exports.entries.wording import check_language, finite_scores, source_in_words

NAMESPACE = "http://www.tei-c.org/ns/1.0"


def tei_lex(entries: Entries, language: str, title: str) -> bytes:
    """A TEI document.

    Raises
    ------
    UsageError
        For a language tag that is none.
    DataError
        For a character that XML does not have.
    """
    check_language(language)
    size = f"{entries.tokens} tokens in {entries.documents} documents"
    description = element(
        "fileDesc",
        [
            element("titleStmt", element("title", text(title))),
            element("publicationStmt", element("p", text("Written by colloc."))),
            element("sourceDesc", element("p", text(f"{size}; pairs: {entries.counting}"))),
        ],
    )
    body = element("body", [f"\n{_entry(entry, language)}" for entry in entries.entries])
    content = [element("teiHeader", description), element("text", body)]
    return document(element("TEI", content, {"xmlns": NAMESPACE, "xml:lang": language}))


def _entry(entry: Entry, language: str) -> str:
    kind = entry.matter.kind
    grammar = [element("gram", text("collocation" if kind != "expression" else "expression"), {"type": "mwe"})]
    if kind != "expression":
        # Where the order of the words is free, both are each other's company; the second is given as the collocate.
        grammar.append(element("gram", text(entry.matter.words[1]), {"type": "collocate"}))
    elif OPEN in entry.matter.words:
        grammar.append(element("gram", text(entry.matter.text), {"type": "construction"}))
    content = [
        element("form", element("orth", text(entry.matter.text)), {"type": "lemma"}),
        element("gramGrp", grammar),
        *(_sense(entry, number) for number in range(1, len(entry.senses) + 1)),
        *_numbers(entry),
    ]
    return element("entry", content, {"xml:id": entry.identifier, "xml:lang": language, "type": "mainEntry"})


def _sense(entry: Entry, number: int) -> str:
    sense = entry.senses[number - 1]
    content = [
        *(element("usg", text(label), {"type": "hint"}) for label in sense.labels),
        *([element("def", text(sense.text))] if sense.text else []),
        *map(_example, sense.lines),
        *(element("note", text(note), {"type": "editorial"}) for note in sense.notes),
    ]
    return element("sense", content, {"xml:id": f"{entry.identifier}-{number}", "n": str(number)})


def _example(line: Line) -> str:
    example, content, place = line.example, [], 0
    for begin, end in sorted(example.marks):
        content.append(text(example.text[place:begin]))
        content.append(element("hi", text(example.text[begin:end]), {"rend": "word"}))
        place = end
    content.append(text(example.text[place:]))
    source = source_in_words(line)
    cited = [element("title", text(example.document)), *([element("note", text(source))] if source else [])]
    cited.append(element("biblScope", text(str(example.start)), {"unit": "codepoint"}))
    return element("cit", [element("quote", content), element("bibl", cited)], {"type": "example"})


def _numbers(entry: Entry) -> list[str]:
    figures = entry.figures
    counts = [("joint", figures.joint), ("documents", figures.documents)]
    notes = [element("note", text(str(count)), {"type": "frequency", "subtype": name}) for name, count in counts]
    for word, count in zip(entry.matter.words, figures.word_counts, strict=True):
        if word != OPEN:
            notes.append(element("note", text(str(count)), {"type": "frequency", "subtype": "word", "n": word}))
    notes += [
        element("note", text(repr(value)), {"type": "score", "subtype": name}) for name, value in finite_scores(entry)
    ]
    return notes
