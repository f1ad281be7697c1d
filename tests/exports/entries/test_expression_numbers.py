"""Every number of an accepted expression, read back from every format by a reader that knows nothing of colloc."""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Callable
from pathlib import Path

import networkx as nx
import openpyxl
import pytest
import rdflib
from lxml import etree

import colloc
from colloc.answers.expressions.measures import SCORES

TEXT, FRAME = "by and large", "took * * into account"
Read = Callable[[Path], dict[str, float]]


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Thirty documents in which an expression stands, and one with open places."""
    folder = tmp_path_factory.mktemp("numbers")
    lines = []
    for number in range(30):
        own = "By and large the fog stayed till noon" if number % 3 else "Now and then the fog rose"
        other = ("We went by and large home", "It held by and large", "They, by and large, ran")[number % 3]
        text = f"{own}. She took the tide into account. {other}. A net fell."
        lines.append(json.dumps({"id": f"d{number}", "text": text + (" The crab ran." * (number % 5))}))
    source = folder / "t.jsonl"
    source.write_text("\n".join(lines), encoding="utf-8")
    path = folder / "t.colloc"
    colloc.build(path, [str(source)], jobs=1)
    for words in (TEXT, FRAME):
        colloc.judge(path, words, "accept", by="Anna")
    colloc.judge(path, ["the", "tide"], "accept", by="Anna")
    return path


def csv_numbers(path: Path) -> dict[str, float]:
    rows = list(csv.DictReader(io.StringIO((path / "entries.csv").read_text(encoding="utf-8"), newline="")))
    package = json.loads((path / "datapackage.json").read_text(encoding="utf-8"))
    fields = {field["name"]: field for field in package["resources"][0]["schema"]["fields"]}
    assert all(fields[name]["type"] == "number" and fields[name]["title"] for name in SCORES)
    return _cells(next(row for row in rows if row["words"] == TEXT))


def _cells(row: dict[str, str]) -> dict[str, float]:
    found = {name: float(row[name]) for name in SCORES if row[name] not in ("", None)}
    return found | {"count": float(row["joint"]), "documents": float(row["documents"])}


def xlsx_numbers(path: Path) -> dict[str, float]:
    sheet = openpyxl.load_workbook(path)["entries"]
    rows = list(sheet.values)
    printed = list(sheet[sheet.print_area.split("!")[-1]])
    assert len(printed) == len(rows)
    names = [cell.value for cell in printed[0]]
    assert {"words", "joint", "documents", "pmi", "strength", "weakest_split", "c_value"} <= set(names)
    assert not {"split_low", "completeness", "c_value_length", "entry"} & set(names)
    return _cells(next(dict(zip(rows[0], row, strict=True)) for row in rows[1:] if row[0] == TEXT))


def json_lines_numbers(path: Path) -> dict[str, float]:
    records = [json.loads(line) for line in path.read_text(encoding="utf-8").splitlines()]
    [record] = [record for record in records if record["words"] == TEXT.split()]
    return record["scores"] | {"count": record["joint"], "documents": record["documents"]}


def _described(text: str) -> dict[str, float]:
    said = dict(
        part.rsplit(" ", 1) for part in text.split("; ") if part.split(" ")[0] in {*SCORES, "joint", "documents"}
    )
    return {("count" if name == "joint" else name): float(value) for name, value in said.items()}


def dmlex_json_numbers(path: Path) -> dict[str, float]:
    whole = json.loads(path.read_text(encoding="utf-8"))
    identifier = next(entry["id"] for entry in whole["entries"] if entry["headword"] == TEXT)
    [text] = [one["description"] for one in whole["relations"] if one["members"][0]["ref"] == identifier]
    return _described(text)


def dmlex_xml_numbers(path: Path) -> dict[str, float]:
    name = "{http://docs.oasis-open.org/lexidma/ns/dmlex-1.0}"
    root = etree.parse(path).getroot()
    [entry] = [one for one in root.iter(f"{name}entry") if one.findtext(f"{name}headword") == TEXT]
    described = {
        one.find(f"{name}member").get("ref"): one.findtext(f"{name}description") for one in root.iter(f"{name}relation")
    }  # type: ignore[union-attr]
    return _described(str(described[entry.get("id")]))


def tei_numbers(path: Path) -> dict[str, float]:
    name = "{http://www.tei-c.org/ns/1.0}"
    [entry] = [one for one in etree.parse(path).iter(f"{name}entry") if one.findtext(f"{name}form/{name}orth") == TEXT]
    notes = [note for note in entry.findall(f"{name}note") if note.get("subtype") != "word"]
    return {str(note.get("subtype")).replace("joint", "count"): float(str(note.text)) for note in notes}


def graph_numbers(path: Path) -> dict[str, float]:
    read = rdflib.Graph().parse(path, format="json-ld" if path.suffix == ".jsonld" else "turtle")
    query = """
        PREFIX ontolex: <http://www.w3.org/ns/lemon/ontolex#> PREFIX frac: <http://www.w3.org/ns/lemon/frac#>
        SELECT ?property ?value ?count WHERE {
          ?entry a ontolex:MultiWordExpression ; ontolex:canonicalForm/ontolex:writtenRep "by and large"@en .
          ?collocation a frac:Collocation ; rdfs:member ?entry ; ?property ?value ;
            frac:frequency/rdf:value ?count . ?property a rdf:Property ; rdfs:comment ?formula }"""
    rows = list(read.query(query))
    found = {str(row[0]).split("measure-")[1]: float(row[1]) for row in rows}  # type: ignore[index, arg-type]
    below = {str(one).split("measure-")[1] for one in read.subjects(rdflib.RDFS.subPropertyOf, None)}
    assert {"dp_norm", "completeness", "any_order"}.isdisjoint(below)
    assert {"strength", "c_value"} <= below
    return found | {"count": float(rows[0][2])}  # type: ignore[index, arg-type]


def graphml_numbers(path: Path) -> dict[str, float]:
    read = nx.read_graphml(path, force_multigraph=True)
    [node] = [data for _, data in read.nodes(data=True) if data["label"] == TEXT]
    return {name: float(node[name]) for name in (*SCORES, "count", "documents") if name in node}


READERS: dict[str, Read] = {
    "folder": csv_numbers,
    "e.xlsx": xlsx_numbers,
    "e.jsonl": json_lines_numbers,
    "e.json": dmlex_json_numbers,
    "e.xml": dmlex_xml_numbers,
    "e.tei": tei_numbers,
    "e.ttl": graph_numbers,
    "e.jsonld": graph_numbers,
    "e.graphml": graphml_numbers,
}
FORMATS = {"folder": "csv", "e.json": "dmlex-json", "e.xml": "dmlex-xml", "e.ttl": "turtle"}


@pytest.mark.filterwarnings("ignore:ConjunctiveGraph is deprecated:DeprecationWarning")  # rdflib's own, inside rdflib
@pytest.mark.parametrize("name", READERS)
def test_every_number_comes_back(store: Path, tmp_path: Path, name: str) -> None:
    ranking = colloc.expressions(store, fragments="keep", common="keep", names="keep", show="all", limit=0)
    [row] = [row for row in ranking if row["expression"] == TEXT]
    colloc.export(store, tmp_path / name, FORMATS.get(name) or name.removeprefix("e."), language="en")
    found = READERS[name](tmp_path / name)
    assert set(found) == {*SCORES, "count", "documents"}
    for measure, value in found.items():
        if measure == "strength":
            continue  # takes over that of folded fragments, which this ranking keeps
        exact = 0.0 if name != "e.xlsx" else 1e-14  # a workbook has sixteen digits
        assert value == pytest.approx(row[measure], rel=exact, abs=exact), measure
    folded = {
        one["expression"]: one["strength"] for one in colloc.expressions(store, common="keep", names="keep", limit=0)
    }
    assert found["strength"] == pytest.approx(folded[TEXT])


def test_expressions_with_open_places_have_the_numbers_that_frames_have(store: Path, tmp_path: Path) -> None:
    colloc.export(store, tmp_path / "e.jsonl", "jsonl")
    records = [json.loads(line) for line in (tmp_path / "e.jsonl").read_text(encoding="utf-8").splitlines()]
    [record] = [record for record in records if record["words"] == FRAME.split()]
    assert (record["joint"], record["documents"]) == (30, 30)
    assert set(record["scores"]) == set(SCORES) - {"strength", "c_value", "c_value_length", "any_order"}
    tokens = colloc.info(store)["tokens"]
    # "took", "into" and "account" stand nowhere else: each cut is log2(n N / n^2)
    assert record["scores"]["weakest_split"] == pytest.approx(math.log2(tokens / 30))
