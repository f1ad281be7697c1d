"""OASIS DMLex 1.0 (Data Model for Lexicography), as JSON and as XML.

A pair is a sense of its first word, the second marked as collocate in each example;
an expression is an entry of its own. Relations tie the pairs to the entries of both
words, and expressions to those of their words; their descriptions carry counts and
scores, for which DMLex has no place of its own. Markers count code points from 0,
their ends exclusive.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Sequence
from typing import Any

from colloc.answers.judging.entries import Entries, Entry, Sense, identifier_of
from colloc.answers.judging.matters import OPEN
from colloc.exports.entries.markup import document, element, text
from colloc.exports.entries.wording import check_language, figures_in_words, source_in_words, words_of

NAMESPACE = "http://docs.oasis-open.org/lexidma/ns/dmlex-1.0"
Mark = tuple[int, int, str, dict[str, str]]
COLLOCATION, PART = "collocation", "part of expression"


def resource(entries: Entries, language: str, title: str) -> dict[str, Any]:
    """The lexicographic resource with the names of the JSON form.

    Raises
    ------
    UsageError
        For a language tag that is none.
    """
    check_language(language)
    words = {
        (layer, word): {"id": _word_identifier(layer, word), "headword": word, "senses": []}
        for layer, word in sorted(words_of(entries))
    }
    expressions, relations = [], []
    for entry in entries.entries:
        description = f"{figures_in_words(entry)}; {entries.counting}"
        layer = entry.matter.layer
        if entry.matter.kind == "expression":
            expressions.append(
                {
                    "id": entry.identifier,
                    "headword": entry.matter.text,
                    "placeholderMarkers": _open_places(entry.matter.words),
                    "senses": _senses(entry),
                }
            )
            members = [_member(entry.identifier, "whole")]
            parts = dict.fromkeys(word for word in entry.matter.words if word != OPEN)
            members += [_member(_word_identifier(layer, word), "part") for word in parts]
            relations.append({"type": PART, "description": description, "members": members})
            continue
        first, second = entry.matter.words
        senses = _senses(entry)
        words[layer, first]["senses"] += senses  # type: ignore[operator]
        for sense in senses:
            members = [_member(sense["id"], "base"), _member(_word_identifier(layer, second), "collocate")]
            relations.append({"type": COLLOCATION, "description": description, "members": members})
    made = _numbered([*words.values(), *expressions])
    labels = dict.fromkeys(label for entry in entries.entries for sense in entry.senses for label in sense.labels)
    sources = {line.example.document: source_in_words(line) for line in _lines(entries)}
    whole: dict[str, Any] = {"title": title, "langCode": language, "entries": made}
    if labels:
        whole["labelTags"] = [{"tag": label} for label in labels]
    if sources:
        whole["sourceIdentityTags"] = [
            {"tag": name} | ({"description": words_} if words_ else {}) for name, words_ in sources.items() if name
        ]
    if relations:
        whole["relations"] = relations
        whole["relationTypes"] = _relation_types(relations)
    return whole


def _open_places(words: Sequence[str]) -> list[dict[str, int]]:
    """Where the headword has an open place."""
    found, start = [], 0
    for word in words:
        if word == OPEN:
            found.append({"startIndex": start, "endIndex": start + len(word)})
        start += len(word) + 1
    return found


def _word_identifier(layer: str, word: str) -> str:
    return "w" + identifier_of((layer, "word", (word,)))[1:]


def _member(reference: str, role: str) -> dict[str, str]:
    return {"ref": reference, "role": role}


def _relation_types(relations: Iterable[dict[str, Any]]) -> list[dict[str, Any]]:
    kinds = {
        COLLOCATION: [{"role": "base", "type": "sense"}, {"role": "collocate", "type": "entry"}],
        PART: [{"role": "whole", "type": "entry"}, {"role": "part", "type": "entry"}],
    }
    used = {relation["type"] for relation in relations}
    return [{"type": name, "memberTypes": members} for name, members in kinds.items() if name in used]


def _numbered(made: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """Entries with the same headword (a word in two layers) are told apart by number."""
    seen: dict[str, int] = {}
    for entry in made:
        seen[entry["headword"]] = seen.get(entry["headword"], 0) + 1
        if seen[entry["headword"]] > 1:
            entry["homographNumber"] = str(seen[entry["headword"]])
    return [{name: value for name, value in entry.items() if value != []} for entry in made]


def _lines(entries: Entries) -> Iterable[Any]:
    return (line for entry in entries.entries for sense in entry.senses for line in sense.lines)


def _senses(entry: Entry) -> list[dict[str, Any]]:
    pair = entry.matter.kind != "expression"
    senses = []
    for number, sense in enumerate(entry.senses, 1):
        made: dict[str, Any] = {"id": f"{entry.identifier}-{number}"}
        # A headword has one sense for each of its collocates: the indicator tells them apart.
        indicator = (entry.matter.text if pair else "") + (": " if pair and sense.text else "") + sense.text
        if indicator:
            made["indicator"] = indicator
        if sense.labels:
            made["labels"] = list(sense.labels)
        if sense.text:
            made["definitions"] = [{"text": sense.text}]
        if sense.lines:
            made["examples"] = _examples(sense, made["id"], entry.matter.words[1] if pair else None)
        senses.append(made)
    return senses


def _examples(sense: Sense, identifier: str, collocate: str | None) -> list[dict[str, Any]]:
    """Texts are unique in a sense: a text that stands in two documents is one example."""
    made: dict[str, dict[str, Any]] = {}
    for line in sense.lines:
        example = line.example
        marks = [{"startIndex": begin, "endIndex": end} for begin, end in example.marks]
        record: dict[str, Any] = {"text": example.text}
        if example.document:
            record["sourceIdentity"] = example.document
        if source_in_words(line):
            record["sourceElaboration"] = source_in_words(line)
        record["headwordMarkers"] = marks[:1]
        if collocate is not None:
            # The XML schema has every marker of a collocate named.
            record["collocateMarkers"] = [{**marks[1], "lemma": collocate, "id": f"{identifier}-c{len(made) + 1}"}]
        made.setdefault(example.text, record)
    return list(made.values())


def dmlex_json(entries: Entries, language: str, title: str) -> bytes:
    """One object: the whole resource."""
    whole = resource(entries, language, title)
    return (json.dumps(whole, ensure_ascii=False, allow_nan=False, indent=1) + "\n").encode()


def dmlex_xml(entries: Entries, language: str, title: str) -> bytes:
    """The XML form: markers are elements around the words.

    Raises
    ------
    DataError
        For a character that XML does not have.
    """
    whole = resource(entries, language, title)
    content = [_entry_xml(entry) for entry in whole["entries"]]
    content += [element("labelTag", attributes={"tag": tag["tag"]}) for tag in whole.get("labelTags", [])]
    content += [
        element("sourceIdentityTag", _optional("description", tag), {"tag": tag["tag"]})
        for tag in whole.get("sourceIdentityTags", [])
    ]
    content += [
        element(
            "relation",
            [
                *_optional("description", relation),
                *(element("member", attributes=member) for member in relation["members"]),
            ],
            {"type": relation["type"]},
        )
        for relation in whole.get("relations", [])
    ]
    content += [
        element(
            "relationType",
            [element("memberType", attributes=kind) for kind in one["memberTypes"]],
            {"type": one["type"]},
        )
        for one in whole.get("relationTypes", [])
    ]
    attributes = {"xmlns": NAMESPACE, "title": title, "langCode": language}
    return document(element("lexicographicResource", [f"\n{part}" for part in content], attributes))


def _optional(name: str, record: dict[str, Any]) -> list[str]:
    return [element(name, text(record[name]))] if name in record else []


def _entry_xml(entry: dict[str, Any]) -> str:
    marks: list[Mark] = [
        (one["startIndex"], one["endIndex"], "placeholderMarker", {}) for one in entry.get("placeholderMarkers", [])
    ]
    content = [element("headword", _marked(entry["headword"], marks)), *map(_sense_xml, entry.get("senses", []))]
    return element("entry", content, {"id": entry["id"], "homographNumber": entry.get("homographNumber")})


def _sense_xml(sense: dict[str, Any]) -> str:
    content = [
        *_optional("indicator", sense),
        *(element("label", attributes={"tag": label}) for label in sense.get("labels", [])),
        *(element("definition", element("text", text(one["text"]))) for one in sense.get("definitions", [])),
        *map(_example_xml, sense.get("examples", [])),
    ]
    return element("sense", content, {"id": sense["id"]})


def _example_xml(example: dict[str, Any]) -> str:
    marks: list[Mark] = [
        (one["startIndex"], one["endIndex"], "headwordMarker", {}) for one in example["headwordMarkers"]
    ]
    marks += [
        (one["startIndex"], one["endIndex"], "collocateMarker", {"lemma": one["lemma"], "id": one["id"]})
        for one in example.get("collocateMarkers", [])
    ]
    attributes = {name: example.get(name) for name in ("sourceIdentity", "sourceElaboration")}
    return element("example", element("text", _marked(example["text"], marks)), attributes)


def _marked(whole: str, marks: list[Mark]) -> list[str]:
    """A text with elements around its marks: start, end, name and attributes of the element."""
    content, place = [], 0
    for begin, end, name, attributes in sorted(marks, key=lambda mark: mark[:2]):
        content.append(text(whole[place:begin]))
        content.append(element(name, text(whole[begin:end]), attributes))
        place = end
    return [*content, text(whole[place:])]
