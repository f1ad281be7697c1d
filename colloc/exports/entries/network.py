"""The accepted entries as a network of words: GraphML."""

from __future__ import annotations

from colloc.answers.judging.entries import Entries, Entry
from colloc.answers.judging.matters import OPEN
from colloc.exports.entries.markup import document, element, text
from colloc.exports.entries.wording import finite_scores, words_of

NAMESPACE = "http://graphml.graphdrawing.org/xmlns"
Values = list[tuple[str, str]]


def graphml(entries: Entries) -> bytes:
    """Words and expressions are nodes; a pair is an edge, and an expression has one to each of its words.

    The numbers of a pair are on its edge, those of an expression on its node.

    The graph is undirected unless every pair is directed.

    Raises
    ------
    DataError
        For a character that XML does not have.
    """
    kinds = [entry.matter.kind for entry in entries.entries]
    directed = "directed" in kinds and "pair" not in kinds
    keys = [
        *(("node", name, "string") for name in ("label", "layer", "kind", "entry", "sense")),
        *(("node", name, "long") for name in ("count", "documents")),
        *(("edge", name, "string") for name in ("entry", "kind", "sense")),
        *(("edge", name, "long") for name in ("joint", "documents")),
        *(("node" if score.kind == "expression" else "edge", score.name, "double") for score in entries.scores),
    ]
    content = [
        element("key", attributes={"id": f"{place}-{name}", "for": place, "attr.name": name, "attr.type": kind})
        for place, name, kind in keys
    ]
    names: dict[tuple[str, str], str] = {}
    nodes: list[str] = []
    for (layer, word), count in sorted(words_of(entries).items()):
        names[layer, word] = f"n{len(nodes)}"
        nodes.append(_node(names[layer, word], word, layer, "word", [("count", str(count))]))
    edges: list[str] = []
    for entry in entries.entries:
        matter, figures = entry.matter, entry.figures
        if matter.kind != "expression":
            numbers = [("joint", str(figures.joint)), *_numbers(entry)]
            edges.append(_edge(entry, [names[matter.layer, word] for word in matter.words], numbers))
            continue
        name = f"n{len(nodes)}"
        told = [("entry", entry.identifier), *_sense(entry), ("count", str(figures.joint)), *_numbers(entry)]
        nodes.append(_node(name, matter.text, matter.layer, "expression", told))
        words = [word for word in dict.fromkeys(matter.words) if word != OPEN]
        edges += [_edge(entry, [name, names[matter.layer, word]], []) for word in words]
    kind = "directed" if directed else "undirected"
    graph = element("graph", [f"\n{part}" for part in (*nodes, *edges)], {"id": "g", "edgedefault": kind})
    return document(element("graphml", [*(f"\n{part}" for part in content), "\n", graph], {"xmlns": NAMESPACE}))


def _node(name: str, label: str, layer: str, kind: str, more: Values) -> str:
    values = [("label", label), ("layer", layer), ("kind", kind), *more]
    return element("node", [_data("node", key, value) for key, value in values], {"id": name})


def _edge(entry: Entry, ends: list[str], more: Values) -> str:
    values = [("entry", entry.identifier), ("kind", entry.matter.kind), *_sense(entry), *more]
    content = [_data("edge", key, value) for key, value in values]
    return element("edge", content, {"source": ends[0], "target": ends[1]})


def _sense(entry: Entry) -> Values:
    sense = "; ".join(sense.text for sense in entry.senses if sense.text)
    return [("sense", sense)] if sense else []


def _numbers(entry: Entry) -> Values:
    """Documents and scores; infinite scores are left out: readers of the format differ about them."""
    scores = [(name, repr(value)) for name, value in finite_scores(entry)]
    return [("documents", str(entry.figures.documents)), *scores]


def _data(place: str, key: str, value: str) -> str:
    return element("data", text(value), {"key": f"{place}-{key}"})
