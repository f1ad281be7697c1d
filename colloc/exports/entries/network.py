"""The accepted entries as a network of words: GraphML."""

from __future__ import annotations

import math

from colloc.answers.judging.entries import Entries, Entry
from colloc.answers.judging.matters import OPEN
from colloc.exports.entries.markup import document, element, text
from colloc.exports.entries.wording import words_of

NAMESPACE = "http://graphml.graphdrawing.org/xmlns"


def graphml(entries: Entries) -> bytes:
    """Words and expressions are nodes; a pair is an edge, and an expression has one to each of its words.

    The graph is undirected unless every pair is directed.

    Raises
    ------
    DataError
        For a character that XML does not have.
    """
    kinds = [entry.matter.kind for entry in entries.entries]
    directed = "directed" in kinds and "pair" not in kinds
    scores = [score.name for score in entries.scores]
    keys = [
        *(("node", name, kind) for name, kind in (("label", "string"), ("layer", "string"), ("kind", "string"))),
        ("node", "count", "long"),
        *(("edge", name, kind) for name, kind in (("entry", "string"), ("kind", "string"), ("sense", "string"))),
        *(("edge", name, "long") for name in ("joint", "documents")),
        *(("edge", name, "double") for name in scores),
    ]
    content = [
        element("key", attributes={"id": f"{place}-{name}", "for": place, "attr.name": name, "attr.type": kind})
        for place, name, kind in keys
    ]
    names: dict[tuple[str, str], str] = {}
    nodes: list[str] = []
    for (layer, word), count in sorted(words_of(entries).items()):
        names[layer, word] = f"n{len(nodes)}"
        nodes.append(_node(names[layer, word], word, layer, "word", count))
    edges: list[str] = []
    for entry in entries.entries:
        matter = entry.matter
        if matter.kind != "expression":
            edges.append(_edge(entry, [names[matter.layer, word] for word in matter.words], scores))
            continue
        name = f"n{len(nodes)}"
        nodes.append(_node(name, matter.text, matter.layer, "expression", entry.figures.joint))
        words = [word for word in dict.fromkeys(matter.words) if word != OPEN]
        edges += [_edge(entry, [name, names[matter.layer, word]], scores) for word in words]
    kind = "directed" if directed else "undirected"
    graph = element("graph", [f"\n{part}" for part in (*nodes, *edges)], {"id": "g", "edgedefault": kind})
    return document(element("graphml", [*(f"\n{part}" for part in content), "\n", graph], {"xmlns": NAMESPACE}))


def _node(name: str, label: str, layer: str, kind: str, count: int) -> str:
    values = (("label", label), ("layer", layer), ("kind", kind), ("count", str(count)))
    return element("node", [_data("node", key, value) for key, value in values], {"id": name})


def _edge(entry: Entry, ends: list[str], scores: list[str]) -> str:
    figures = entry.figures
    sense = "; ".join(sense.text for sense in entry.senses if sense.text)
    values = [("entry", entry.identifier), ("kind", entry.matter.kind)]
    values += [("sense", sense)] if sense else []
    values += [("joint", str(figures.joint)), ("documents", str(figures.documents))]
    # Infinite scores are left out: readers of the format differ about them.
    values += [
        (name, repr(figures.scores[name])) for name in scores if math.isfinite(figures.scores.get(name, math.nan))
    ]
    content = [_data("edge", key, value) for key, value in values]
    return element("edge", content, {"source": ends[0], "target": ends[1]})


def _data(place: str, key: str, value: str) -> str:
    return element("data", text(value), {"key": f"{place}-{key}"})
