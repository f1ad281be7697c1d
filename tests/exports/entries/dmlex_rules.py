"""The rules of the DMLex 1.0 JSON form that our files touch, as a JSON Schema (draft 2020-12).

Source: OASIS DMLex 1.0, schemas/JSON/dmlex_no-crosslingual.schema.json: required names, texts that must not be empty,
no unknown names, members of a relation at least two. Written out for the objects that are used here.
"""

from __future__ import annotations

from typing import Any

TEXT = {"type": "string", "minLength": 1}
ANY_TEXT = {"type": "string"}
INDEX = {"type": "integer", "minimum": 0}


def _object(required: list[str], **properties: Any) -> dict[str, Any]:
    return {"type": "object", "required": required, "properties": properties, "additionalProperties": False}


def _list(items: dict[str, Any], **more: Any) -> dict[str, Any]:
    return {"type": "array", "items": items, **more}


LABELS = _list(TEXT, uniqueItems=True)
MARKER = _object(["startIndex", "endIndex"], startIndex=INDEX, endIndex=INDEX)
COLLOCATE = _object(
    ["startIndex", "endIndex"], startIndex=INDEX, endIndex=INDEX, lemma=TEXT, labels=LABELS, id=ANY_TEXT
)
EXAMPLE = _object(
    ["text"],
    text=TEXT,
    sourceIdentity=ANY_TEXT,
    sourceElaboration=TEXT,
    soundFile=ANY_TEXT,
    labels=LABELS,
    headwordMarkers=_list(MARKER),
    collocateMarkers=_list(COLLOCATE),
)
DEFINITION = _object(["text"], text=TEXT, definitionType=ANY_TEXT)
SENSE = _object(
    [], id=ANY_TEXT, indicator=ANY_TEXT, labels=LABELS, definitions=_list(DEFINITION), examples=_list(EXAMPLE)
)
ENTRY = _object(
    ["headword"],
    id=ANY_TEXT,
    headword=TEXT,
    homographNumber=ANY_TEXT,
    labels=LABELS,
    senses=_list(SENSE),
    placeholderMarkers=_list(MARKER),
)
TAG = _object(["tag"], tag=TEXT, description=TEXT)
MEMBER = _object(["ref"], ref=ANY_TEXT, role=TEXT, obverseListingOrder={"type": "integer"})
RELATION = _object(["type"], type=TEXT, description=TEXT, members=_list(MEMBER, minItems=2))
MEMBER_TYPE = _object(["type"], role=ANY_TEXT, type={"enum": ["sense", "entry", "collocate"]})
RELATION_TYPE = _object(["type"], type=TEXT, description=TEXT, memberTypes=_list(MEMBER_TYPE))
RESOURCE = _object(
    ["langCode"],
    title=TEXT,
    uri=ANY_TEXT,
    langCode=ANY_TEXT,
    entries=_list(ENTRY),
    labelTags=_list(TAG),
    sourceIdentityTags=_list(TAG),
    relations=_list(RELATION),
    relationTypes=_list(RELATION_TYPE),
)


def identifiers(resource: dict[str, Any]) -> list[str]:
    """Identifiers of entries and senses: unique, and all that relations may refer to."""
    entries = resource["entries"]
    return [entry["id"] for entry in entries] + [one["id"] for entry in entries for one in entry.get("senses", [])]
