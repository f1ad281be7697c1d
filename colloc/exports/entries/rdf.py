"""Triples written as Turtle and as JSON-LD."""

from __future__ import annotations

import json
import re
from collections.abc import Iterable
from itertools import groupby
from typing import Any

from colloc.exports.entries.ontolex import PREFIXES, Name, Term, Triple

_PLAIN_LOCAL = re.compile(r"[A-Za-z_][A-Za-z0-9_-]*")
_ESCAPES = {"\\": "\\\\", '"': '\\"', "\n": "\\n", "\r": "\\r", "\t": "\\t", "\b": "\\b", "\f": "\\f"}
_TO_ESCAPE = re.compile('[\\\\"\\x00-\\x1f\\x7f]')


def turtle(triples: Iterable[Triple]) -> bytes:
    """Turtle 1.1, the triples of a subject together."""
    lines = [f"@prefix {prefix}: <{iri}> ." for prefix, iri in PREFIXES.items()]
    for subject, group in groupby(triples, key=lambda triple: triple[0]):
        said = ";\n    ".join(f"{_turtle(predicate)} {_turtle(value)} " for _, predicate, value in group)
        lines.append(f"\n{_turtle(subject)} {said}.")
    return ("\n".join(lines) + "\n").encode()


def _turtle(term: Term) -> str:
    if isinstance(term, Name):
        if term.prefix and _PLAIN_LOCAL.fullmatch(term.local):
            return f"{term.prefix}:{term.local}"
        return f"<{full_iri(term)}>"
    quoted = '"' + _TO_ESCAPE.sub(_escaped, term.value) + '"'
    if term.language:
        return f"{quoted}@{term.language}"
    return quoted if term.datatype == "string" else f"{quoted}^^xsd:{term.datatype}"


def _escaped(match: re.Match[str]) -> str:
    return _ESCAPES.get(match[0], f"\\u{ord(match[0]):04X}")


def full_iri(name: Name) -> str:
    """The whole IRI of a name."""
    return PREFIXES[name.prefix] + name.local if name.prefix else name.local


def json_ld(triples: Iterable[Triple]) -> bytes:
    """JSON-LD 1.1: a context of prefixes, and one object a subject."""
    nodes: dict[str, dict[str, Any]] = {}
    for subject, predicate, value in triples:
        node = nodes.setdefault(full_iri(subject), {"@id": full_iri(subject)})
        if predicate == Name("rdf", "type") and isinstance(value, Name):
            node.setdefault("@type", []).append(_short(value))
        else:
            node.setdefault(_short(predicate), []).append(_value(value))
    whole = {"@context": dict(PREFIXES), "@graph": list(nodes.values())}
    return (json.dumps(whole, ensure_ascii=False, allow_nan=False, indent=1) + "\n").encode()


def _short(name: Name) -> str:
    return f"{name.prefix}:{name.local}" if name.prefix else name.local


def _value(term: Term) -> dict[str, str]:
    if isinstance(term, Name):
        return {"@id": _short(term)}
    if term.language:
        return {"@value": term.value, "@language": term.language}
    return {"@value": term.value} | ({} if term.datatype == "string" else {"@type": f"xsd:{term.datatype}"})
