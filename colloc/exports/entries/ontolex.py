"""OntoLex-Lemon with FrAC (frequency, attestation and corpus information), as triples.

Terms are those of the FrAC draft of June 2026. A pair is a ``frac:Collocation`` whose
members are words; an expression is an ``ontolex:MultiWordExpression`` and the
``frac:Collocation`` of its components. The score names of the draft exist in no
published ontology, so each score is a property of our own with its formula as a
comment, below ``frac:cScore`` where it says how well the words hold together (not how
they are spread); the first score is the ``rdf:value`` too.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from urllib.parse import quote

from colloc.answers.judging.entries import Entries, Entry, Line, identifier_of
from colloc.answers.judging.matters import OPEN
from colloc.errors import UsageError
from colloc.exports.entries.wording import check_language, finite_scores, source_in_words, words_of

PREFIXES = {
    "dct": "http://purl.org/dc/terms/",
    "decomp": "http://www.w3.org/ns/lemon/decomp#",
    "frac": "http://www.w3.org/ns/lemon/frac#",
    "lexinfo": "http://www.lexinfo.net/ontology/3.0/lexinfo#",
    "lime": "http://www.w3.org/ns/lemon/lime#",
    "ontolex": "http://www.w3.org/ns/lemon/ontolex#",
    "rdf": "http://www.w3.org/1999/02/22-rdf-syntax-ns#",
    "rdfs": "http://www.w3.org/2000/01/rdf-schema#",
    "skos": "http://www.w3.org/2004/02/skos/core#",
    "xsd": "http://www.w3.org/2001/XMLSchema#",
}
_IRI = re.compile(r"[A-Za-z][A-Za-z0-9+.-]*:[^\x00-\x20<>\"{}|^`\\]*")


@dataclass(frozen=True, slots=True)
class Name:
    """An IRI: ``prefix:local`` of `PREFIXES`, or whole where the prefix is empty."""

    prefix: str
    local: str


@dataclass(frozen=True, slots=True)
class Literal:
    """A text with a language, or a value of a type of XML Schema."""

    value: str
    datatype: str = "string"
    language: str = ""


Term = Name | Literal
Triple = tuple[Name, Name, Term]


def n(text: str) -> Name:
    """``prefix:local`` as a name."""
    prefix, _, local = text.partition(":")
    return Name(prefix, local)


A = n("rdf:type")


def check_base(base: str) -> None:
    """Raise UsageError for what cannot begin an IRI."""
    if not _IRI.fullmatch(base):
        raise UsageError(f"{base!r} cannot begin an IRI: write https://example.org/lexicon# or urn:...")


def triples(entries: Entries, language: str, title: str, base: str) -> Iterator[Triple]:
    """The whole graph, subject by subject."""
    check_language(language)
    check_base(base)
    return _Graph(entries, language, title, base).triples()


class _Graph:
    def __init__(self, entries: Entries, language: str, title: str, base: str) -> None:
        self._entries, self._language, self._title, self._base = entries, language, title, base
        self._corpus = self._own("corpus")

    def _own(self, local: str) -> Name:
        return Name("", self._base + local)

    def _said(self, text: str) -> Literal:
        return Literal(text, language=self._language)

    def triples(self) -> Iterator[Triple]:
        for score in self._entries.scores:
            measure = self._own(f"measure-{score.name}")
            yield measure, A, n("rdf:Property")
            if score.bond:
                yield measure, n("rdfs:subPropertyOf"), n("frac:cScore")
            yield measure, n("rdfs:label"), Literal(score.title, language="en")
            yield measure, n("rdfs:comment"), Literal(f"{score.formula} ({score.unit})", language="en")
        documents = self._own("measure-documents")
        yield documents, A, n("rdf:Property")
        yield documents, n("rdfs:label"), Literal("documents", language="en")
        yield documents, n("rdfs:comment"), Literal("how many documents hold it", language="en")
        yield from self._frame()
        for (layer, word), count in sorted(words_of(self._entries).items()):
            name = self._word(layer, word)
            yield name, A, n("ontolex:Word")
            yield from self._form(name, word)
            yield from self._counted(name, count)
        for entry in self._entries.entries:
            yield from self._entry(entry)

    def _frame(self) -> Iterator[Triple]:
        total, lexicon = self._own("corpus-total"), self._own("lexicon")
        yield self._corpus, A, n("dct:Collection")
        yield self._corpus, n("frac:total"), total
        yield total, A, n("frac:Frequency")
        yield total, n("rdf:value"), Literal(str(self._entries.tokens), "integer")
        yield total, n("frac:unit"), n("lexinfo:tokens")
        yield total, n("frac:observedIn"), self._corpus
        yield total, n("dct:description"), Literal("all tokens", language="en")
        yield lexicon, A, n("lime:Lexicon")
        yield lexicon, n("lime:language"), Literal(self._language)
        yield lexicon, n("dct:title"), self._said(self._title)
        for layer, word in sorted(words_of(self._entries)):
            yield lexicon, n("lime:entry"), self._word(layer, word)
        for entry in self._entries.entries:
            if entry.matter.kind == "expression":
                yield lexicon, n("lime:entry"), self._own(entry.identifier)

    def _word(self, layer: str, word: str) -> Name:
        return self._own("w" + identifier_of((layer, "word", (word,)))[1:])

    def _form(self, name: Name, written: str) -> Iterator[Triple]:
        form = Name("", f"{name.local}-form")
        yield name, n("ontolex:canonicalForm"), form
        yield form, A, n("ontolex:Form")
        yield form, n("ontolex:writtenRep"), self._said(written)

    def _counted(self, name: Name, count: int) -> Iterator[Triple]:
        frequency = Name("", f"{name.local}-frequency")
        yield name, n("frac:frequency"), frequency
        yield frequency, A, n("frac:Frequency")
        yield frequency, n("rdf:value"), Literal(str(count), "integer")
        yield frequency, n("frac:unit"), n("lexinfo:tokens")
        yield frequency, n("frac:observedIn"), self._corpus
        yield frequency, n("dct:description"), Literal("occurrences", language="en")

    def _entry(self, entry: Entry) -> Iterator[Triple]:
        collocation = self._own(entry.identifier)
        whole = entry.matter.kind == "expression"
        if whole:
            yield collocation, A, n("ontolex:MultiWordExpression")
            yield from self._form(collocation, entry.matter.text)
            collocation = self._own(f"{entry.identifier}-collocation")
            yield from self._components(entry)
        yield collocation, A, n("frac:Collocation")
        yield collocation, A, n("rdf:Bag" if entry.matter.kind == "pair" else "rdf:Seq")
        yield from self._members(entry, collocation)
        yield collocation, n("frac:observedIn"), self._corpus
        yield collocation, n("dct:description"), Literal(self._description(entry), language="en")
        scores = list(finite_scores(entry))
        for name, value in scores:
            yield collocation, self._own(f"measure-{name}"), Literal(repr(value), "double")
        yield collocation, self._own("measure-documents"), Literal(str(entry.figures.documents), "integer")
        main = Literal(repr(scores[0][1]), "double") if scores else Literal(str(entry.figures.joint), "integer")
        yield collocation, n("rdf:value"), main
        yield from self._counted(collocation, entry.figures.joint)
        for number, sense in enumerate(entry.senses, 1):
            if sense.text:
                yield collocation, n("skos:definition"), self._said(sense.text)
            for label in sense.labels:
                yield collocation, n("dct:type"), self._said(label)
            for place, line in enumerate(sense.lines, 1):
                yield from self._attestation(collocation, f"{entry.identifier}-{number}-{place}", line)

    def _description(self, entry: Entry) -> str:
        words = {"pair": "in any order", "directed": "in this order", "expression": "in a row"}[entry.matter.kind]
        counted = f"; {self._entries.counting}" if entry.matter.kind != "expression" else ""
        return f"{entry.matter.text}: words {words}{counted}"

    def _components(self, entry: Entry) -> Iterator[Triple]:
        expression = self._own(entry.identifier)
        for place, word in enumerate(entry.matter.words, 1):
            component = self._own(f"{entry.identifier}-component-{place}")
            yield expression, n("decomp:constituent"), component
            yield expression, n(f"rdf:_{place}"), component
            yield component, A, n("decomp:Component")
            if word != OPEN:
                yield component, n("decomp:correspondsTo"), self._word(entry.matter.layer, word)

    def _members(self, entry: Entry, collocation: Name) -> Iterator[Triple]:
        words = [word for word in entry.matter.words if word != OPEN]
        names = [self._word(entry.matter.layer, word) for word in words]
        for name in dict.fromkeys(names):
            yield collocation, n("rdfs:member"), name
        for place, name in enumerate(names, 1):
            yield collocation, n(f"rdf:_{place}"), name
        if entry.matter.kind == "directed":
            yield collocation, n("frac:head"), names[0]
        if entry.matter.kind == "expression":
            yield collocation, n("rdfs:member"), self._own(entry.identifier)

    def _attestation(self, collocation: Name, local: str, line: Line) -> Iterator[Triple]:
        example, attestation = line.example, self._own(f"{local}-attestation")
        # Without the fragment that a base may end with: the place in the text is a fragment of the document.
        document = Name("", self._base.replace("#", "/") + "document-" + quote(example.document, safe=""))
        begin, end = example.start, example.start + len(example.text)
        yield collocation, n("frac:attestation"), attestation
        yield attestation, A, n("frac:Attestation")
        yield attestation, n("frac:quotedText"), self._said(example.text)
        yield attestation, n("rdf:value"), self._said(example.text)
        yield attestation, n("frac:observedIn"), self._corpus
        yield attestation, n("dct:source"), document
        # RFC 5147: positions between characters, from 0.
        yield attestation, n("frac:locus"), Name("", f"{document.local}#char={begin},{end}")
        yield attestation, n("dct:description"), Literal(source_in_words(line) or example.document)
        yield document, n("dct:identifier"), Literal(example.document)
