"""Every format is read back by a program that is not ours, and held against the rules of its standard."""

from __future__ import annotations

import csv
import hashlib
import io
import json
from importlib.resources import files
from pathlib import Path
from typing import Any

import jsonschema
import networkx as nx
import openpyxl
import pytest
import rdflib
from hypothesis import given, settings
from hypothesis import strategies as st
from lxml import etree
from pyshacl import validate

from colloc.answers.judging.entries import Entries
from colloc.errors import DataError, UsageError
from colloc.exports.entries import dmlex, jsonlines, network, ontolex, rdf, tabular, tei
from colloc.exports.entries.formats import FORMATS, Wishes, find_format, write_entries
from colloc.exports.spreadsheets import restore

from .dmlex_rules import RESOURCE, identifiers
from .making import sample, without

HERE = Path(__file__).parent
BASE = "https://example.org/lexicon#"
TITLE = "Words & <weather>"
WISHES = Wishes("en", TITLE, "2026-01-01T00:00:00+00:00", BASE)
DMLEX = f"{{{dmlex.NAMESPACE}}}"
TEI = f"{{{tei.NAMESPACE}}}"
FRAC = rdflib.Namespace(ontolex.PREFIXES["frac"])
SKOS = rdflib.Namespace(ontolex.PREFIXES["skos"])

LEGAL = st.text(
    st.one_of(
        st.sampled_from("=+-@\t\r\n'\"<>&;,]\\\u202e\u2066\u2069\u200f\u2028\x85\ufeff\U0001f600{}"),
        st.characters(exclude_categories=["Cs", "Cc"], exclude_characters="\ufffe\uffff"),
    ),
    min_size=1,
    max_size=10,
)
"""What XML 1.0 can hold, with what formats stumble over: markup, line ends, bidi controls, escapes."""
ILLEGAL = ("\x00", "\x0b", "\x1f", "\ufffe")


def triples(entries: Entries) -> Any:
    return ontolex.triples(entries, "en", TITLE, BASE)


def graph(entries: Entries) -> rdflib.Graph:
    return rdflib.Graph().parse(data=rdf.turtle(triples(entries)), format="turtle")


def test_dmlex_json_keeps_the_rules() -> None:
    whole = json.loads(dmlex.dmlex_json(sample(), "en-GB", TITLE))
    jsonschema.Draft202012Validator.check_schema(RESOURCE)
    jsonschema.validate(whole, RESOURCE)
    known = identifiers(whole)
    assert len(set(known)) == len(known)
    assert {member["ref"] for relation in whole["relations"] for member in relation["members"]} <= set(known)
    heads = [(entry["headword"], entry.get("homographNumber")) for entry in whole["entries"]]
    assert len(set(heads)) == len(heads), "headword and homograph number are unique"
    for entry in whole["entries"]:
        indicators = [sense.get("indicator") for sense in entry.get("senses", [])]
        assert len(set(indicators)) == len(indicators)
        for marker in entry.get("placeholderMarkers", []):
            assert entry["headword"][marker["startIndex"] : marker["endIndex"]] == "*"
    thick = next(entry for entry in whole["entries"] if entry["headword"] == "thick")
    example = thick["senses"][0]["examples"][0]
    for marker, word in ((example["headwordMarkers"][0], "thick"), (example["collocateMarkers"][0], "fog")):
        assert example["text"][marker["startIndex"] : marker["endIndex"]] == word
    assert example["sourceElaboration"] == "author: A. Keeper; year: 1881"
    described = {relation["description"] for relation in whole["relations"]}
    assert any("joint 12; documents 5; frequencies thick 30, fog 31; pmi 3.5" in text for text in described)


def test_the_rules_refuse_what_they_should() -> None:
    """A rule that accepts everything would prove nothing."""
    whole = json.loads(dmlex.dmlex_json(sample(), "en", TITLE))
    for change in ({"langCode": None}, {"colour": "red"}, {"entries": [{"id": "x"}]}):
        with pytest.raises(jsonschema.ValidationError):
            jsonschema.validate(
                {name: value for name, value in (whole | change).items() if value is not None}, RESOURCE
            )


@settings(max_examples=30)
@given(text=LEGAL)
def test_dmlex_json_and_xml_say_the_same_and_keep_each_character(text: str) -> None:
    entries = sample(text)
    whole = json.loads(dmlex.dmlex_json(entries, "en", TITLE))
    root = etree.fromstring(dmlex.dmlex_xml(entries, "en", TITLE))
    assert root.tag == f"{DMLEX}lexicographicResource"
    assert (root.get("langCode"), root.get("title")) == ("en", TITLE)
    found = [_entry_of(entry) for entry in root.iterfind(f"{DMLEX}entry")]
    keep = ("id", "headword", "homographNumber", "placeholderMarkers", "senses")
    assert found == [{name: entry[name] for name in keep if name in entry} for entry in whole["entries"]]
    relations = [
        {
            "type": one.get("type"),
            "description": one.findtext(f"{DMLEX}description"),
            "members": [dict(member.attrib) for member in one.iterfind(f"{DMLEX}member")],
        }
        for one in root.iterfind(f"{DMLEX}relation")
    ]
    assert relations == whole["relations"]
    assert [tag.get("tag") for tag in root.iterfind(f"{DMLEX}labelTag")] == [tag["tag"] for tag in whole["labelTags"]]
    thick = next(entry for entry in whole["entries"] if entry["headword"] == "thick")["senses"][0]
    assert thick["definitions"] == [{"text": text}]
    assert thick["labels"] == [text, "at sea"]
    example = entries.entries[0].senses[0].lines[0].example
    assert thick["examples"][0]["text"] == example.text
    assert thick["examples"][0]["sourceIdentity"] == example.document


ORDER = {
    "lexicographicResource": ("entry", "labelTag", "sourceIdentityTag", "relation", "relationType"),
    "entry": ("headword", "label", "sense"),
    "sense": ("indicator", "label", "definition", "example"),
    "example": ("text", "label"),
    "relation": ("description", "member"),
    "relationType": ("memberType",),
}
"""Sequences of the XML schema (schemas/XML/dmlex_no-crosslingual.xsd), cut to what is written."""


def test_dmlex_xml_keeps_order_and_keys() -> None:
    root = etree.fromstring(dmlex.dmlex_xml(sample(), "en", TITLE))
    for element in root.iter():
        name = str(element.tag).removeprefix(DMLEX)
        children = [str(child.tag).removeprefix(DMLEX) for child in element]
        if name in ORDER:
            assert children == sorted(children, key=ORDER[name].index)
    keyed = [one for name in ("entry", "sense", "collocateMarker") for one in root.iter(f"{DMLEX}{name}")]
    keys = [one.get("id") for one in keyed]
    assert None not in keys
    assert len(set(keys)) == len(keys)
    assert {member.get("ref") for member in root.iter(f"{DMLEX}member")} <= set(keys)
    for relation in root.iter(f"{DMLEX}relation"):
        members = [(member.get("ref"), member.get("role")) for member in relation.iter(f"{DMLEX}member")]
        assert len(members) == len(set(members)) >= 2


def _entry_of(element: Any) -> dict[str, Any]:
    """The JSON form of an XML entry, read from the tree alone."""
    headword, places, _ = _marked(element.find(f"{DMLEX}headword"))
    made: dict[str, Any] = {"id": element.get("id"), "headword": headword}
    if element.get("homographNumber"):
        made["homographNumber"] = element.get("homographNumber")
    if places["placeholderMarker"]:
        made["placeholderMarkers"] = places["placeholderMarker"]
    senses = []
    for sense in element.iterfind(f"{DMLEX}sense"):
        one: dict[str, Any] = {"id": sense.get("id"), "indicator": sense.findtext(f"{DMLEX}indicator")}
        one["labels"] = [label.get("tag") for label in sense.iterfind(f"{DMLEX}label")]
        one["definitions"] = [{"text": text.text} for text in sense.iterfind(f"{DMLEX}definition/{DMLEX}text")]
        one["examples"] = []
        for example in sense.iterfind(f"{DMLEX}example"):
            text, places, collocates = _marked(example.find(f"{DMLEX}text"))
            record: dict[str, Any] = {"text": text, **dict(example.attrib), "headwordMarkers": places["headwordMarker"]}
            if collocates:
                record["collocateMarkers"] = collocates
            one["examples"].append(record)
        senses.append({name: value for name, value in one.items() if value})
    return made | ({"senses": senses} if senses else {})


def _marked(element: Any) -> tuple[str, dict[str, list[dict[str, int]]], list[dict[str, Any]]]:
    text = element.text or ""
    places: dict[str, list[dict[str, int]]] = {"headwordMarker": [], "placeholderMarker": []}
    collocates = []
    for marker in element:
        place = {"startIndex": len(text), "endIndex": len(text) + len(marker.text)}
        if marker.tag == f"{DMLEX}collocateMarker":
            collocates.append({**place, **dict(marker.attrib)})
        else:
            places[marker.tag.removeprefix(DMLEX)].append(place)
        text += marker.text + (marker.tail or "")
    return text, places, collocates


@settings(max_examples=30)
@given(text=LEGAL)
def test_tei_is_valid_and_keeps_each_character(text: str) -> None:
    entries = sample(text)
    grammar = etree.RelaxNG(etree.fromstring(files("colloc.exports.entries").joinpath("tei_subset.rng").read_bytes()))
    root = etree.fromstring(tei.tei_lex(entries, "en", TITLE))
    grammar.assertValid(root)
    entry = root.find(f".//{TEI}entry")
    assert entry is not None
    assert entry.findtext(f"{TEI}form/{TEI}orth") == "thick fog"
    sense = entry.find(f"{TEI}sense")
    assert sense is not None
    assert [usg.text for usg in sense.iterfind(f"{TEI}usg")] == [text, "at sea"]
    assert sense.findtext(f"{TEI}def") == sense.findtext(f"{TEI}note") == text
    quote = sense.find(f"{TEI}cit/{TEI}quote")
    assert quote is not None
    example = entries.entries[0].senses[0].lines[0].example
    assert "".join(quote.itertext()) == example.text
    assert [hi.text for hi in quote.iterfind(f"{TEI}hi")] == ["thick", "fog"]
    assert sense.findtext(f"{TEI}cit/{TEI}bibl/{TEI}title") == example.document
    assert {note.get("subtype"): note.text for note in entry.iterfind(f"{TEI}note[@type='score']")} == {"pmi": "3.5"}


def test_the_tei_grammar_refuses_what_it_should() -> None:
    grammar = etree.RelaxNG(etree.fromstring(files("colloc.exports.entries").joinpath("tei_subset.rng").read_bytes()))
    good = tei.tei_lex(sample(), "en", TITLE)
    for old, new in ((b'type="example"', b'type="quotation"'), (b'type="mainEntry"', b""), (b"gramGrp", b"colloc")):
        assert not grammar.validate(etree.fromstring(good.replace(old, new)))


@pytest.mark.filterwarnings("ignore:ConjunctiveGraph is deprecated:DeprecationWarning")  # rdflib's own, inside rdflib
@settings(max_examples=10)
@given(text=st.one_of(LEGAL, st.sampled_from(ILLEGAL)))
def test_turtle_and_json_ld_are_the_same_graph_and_keep_each_character(text: str) -> None:
    entries = sample(text)
    turtle = graph(entries)
    linked = rdflib.Graph().parse(data=rdf.json_ld(triples(entries)).decode(), format="json-ld")
    # No node is blank: the graphs are the same where their triples are.
    assert set(linked) == set(turtle)
    collocation = rdflib.URIRef(BASE + entries.entries[0].identifier)
    assert {str(value) for value in turtle.objects(collocation, SKOS.definition)} == {text, "another"}
    quoted = {str(value) for value in turtle.objects(None, FRAC.quotedText)}
    assert entries.entries[0].senses[0].lines[0].example.text in quoted


def test_rdf_keeps_the_shapes_of_frac() -> None:
    made = graph(sample())
    fine, _, report = validate(made, shacl_graph=rdflib.Graph().parse(HERE / "shapes.ttl"))
    assert fine, report
    broken = graph(sample())
    broken.remove((None, FRAC.observedIn, None))
    assert not validate(broken, shacl_graph=rdflib.Graph().parse(HERE / "shapes.ttl"))[0]


def test_scores_are_found_as_sub_properties_of_the_draft() -> None:
    query = (
        "SELECT ?score ?value WHERE { ?score rdfs:subPropertyOf frac:cScore . ?collocation ?score ?value . "
        "?collocation frac:head ?head . ?head ontolex:canonicalForm/ontolex:writtenRep 'strong'@en }"
    )
    namespaces = {name: rdflib.URIRef(iri) for name, iri in ontolex.PREFIXES.items()}
    rows = {str(row[0]): float(row[1]) for row in graph(sample()).query(query, initNs=namespaces)}  # type: ignore[index, arg-type]
    assert rows == {f"{BASE}measure-pmi": -0.5, f"{BASE}measure-npmi": 0.25}


@settings(max_examples=20)
@given(text=LEGAL)
def test_graphml_is_read_by_a_graph_library(text: str) -> None:
    entries = sample(text)
    read = nx.parse_graphml(network.graphml(entries).decode(), force_multigraph=True)
    labels = nx.get_node_attributes(read, "label")
    assert not read.is_directed()
    assert {"thick", "fog", "by and large", "account", "take * into account"} <= set(labels.values())
    edges = {(labels[one], labels[two]): data for one, two, data in read.edges(data=True) if data.get("joint") == 12}
    senses = {data.get("sense") for _, _, data in read.edges(data=True)}
    assert f"{text}; another" in senses
    assert edges["strong", "wind"]["pmi"] == -0.5
    assert "npmi" not in next(data for _, _, data in read.edges(data=True) if data.get("pmi") == 3.5), "no infinity"
    joined = {frozenset((labels[one], labels[two])) for one, two in read.edges()}
    assert frozenset(("large", "by and large")) in joined
    phrase = next(data for _, data in read.nodes(data=True) if data["label"] == "by and large")
    assert (phrase["count"], phrase["documents"], phrase["specific_correlation"]) == (12, 5, 9.25)
    assert (phrase["sense"], phrase["entry"]) == ("on the whole", entries.entries[2].identifier)


def test_graphml_of_directed_pairs_is_directed() -> None:
    read = nx.parse_graphml(network.graphml(without(sample(), "pair", "expression")).decode())
    assert read.is_directed()
    labels = nx.get_node_attributes(read, "label")
    assert [(labels[one], labels[two]) for one, two in read.edges()] == [("strong", "wind")]


@settings(max_examples=30)
@given(text=st.one_of(LEGAL, st.sampled_from(ILLEGAL)))
def test_data_package_describes_its_files_and_keeps_each_character(text: str) -> None:
    entries = sample(text)
    made = tabular.data_package(entries, "2026-01-01T00:00:00+00:00")
    package = json.loads(made["datapackage.json"])
    for resource in package["resources"]:
        data = made[resource["path"]]
        assert resource["bytes"] == len(data)
        assert resource["hash"] == f"sha256:{hashlib.sha256(data).hexdigest()}"
        rows = list(csv.reader(io.StringIO(data.decode(), newline=""), strict=True))
        assert rows[0] == [field["name"] for field in resource["schema"]["fields"]]
        kinds = {"integer": int, "number": float, "string": str}
        for row in rows[1:]:
            for cell, field in zip(row, resource["schema"]["fields"], strict=True):
                if cell:
                    kinds[field["type"]](cell)
                if field["type"] == "string" and cell:
                    assert cell[0] not in "=+-@\t\r", "defused"
    read = csv.DictReader(io.StringIO(made["entries.csv"].decode(), newline=""))
    first = next(iter(read))
    assert restore(first["sense"]) == text
    assert json.loads(restore(first["labels"])) == [text, "at sea"]
    assert first["npmi"] == "INF"
    example = next(iter(csv.DictReader(io.StringIO(made["examples.csv"].decode(), newline=""))))
    assert restore(example["text"]) == entries.entries[0].senses[0].lines[0].example.text
    assert restore(example["document"]) == f"log {text}"


@settings(max_examples=15)
@given(text=LEGAL.filter(lambda text: "_x" not in text and "\r" not in text))
def test_workbook_is_read_back_without_formulas(text: str) -> None:
    book = openpyxl.load_workbook(io.BytesIO(tabular.entry_workbook(sample(text))))
    sheet = book["entries"]
    rows = list(sheet.iter_rows())
    names = [cell.value for cell in rows[0]]
    assert [row[0].value for row in rows[1:]][:2] == ["thick fog", "thick fog"]
    assert rows[1][names.index("sense")].value == text
    assert not [cell for row in rows for cell in row if cell.data_type == "f"]
    assert rows[1][names.index("joint")].value == 12
    assert rows[1][names.index("npmi")].value == "inf"
    assert sheet.print_title_rows == "$1:$1"
    assert sheet.page_setup.orientation == "landscape"
    assert sheet.freeze_panes == "B2"


@given(text=st.one_of(LEGAL, st.sampled_from(ILLEGAL)))
def test_json_lines_keep_each_character(text: str) -> None:
    entries = sample(text)
    lines = [json.loads(one) for one in jsonlines.json_lines(entries).decode().split("\n")[:-1]]
    assert len(lines) == len(entries.entries)
    sense = lines[0]["senses"][0]
    assert (sense["sense"], sense["labels"], sense["notes"]) == (text, [text, "at sea"], [text])
    assert sense["examples"][0]["text"] == entries.entries[0].senses[0].lines[0].example.text
    assert lines[0]["scores"] == {"pmi": 3.5, "npmi": None}


@pytest.mark.parametrize("character", ILLEGAL)
@pytest.mark.parametrize("name", ["dmlex-xml", "tei", "graphml"])
def test_what_xml_cannot_hold_is_refused_by_name(tmp_path: Path, name: str, character: str) -> None:
    with pytest.raises(DataError, match=rf"no character U\+{ord(character):04X}.*JSON Lines"):
        write_entries(sample(f"a{character}b"), name, tmp_path / "out", WISHES)
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize("name", FORMATS)
def test_no_entries_at_all(tmp_path: Path, name: str) -> None:
    empty = Entries((), (), 0, 0, "", {}, 0)
    paths = write_entries(empty, name, tmp_path / "out", WISHES)
    assert all(path.stat().st_size > 0 or name == "jsonl" for path in paths)


@pytest.mark.parametrize(
    ("change", "message"),
    [(("english!", BASE), "language tag"), (("en", "no iri"), "cannot begin an IRI"), (("en", "<urn:x>"), "IRI")],
)
def test_wishes_that_make_no_sense(tmp_path: Path, change: tuple[str, str], message: str) -> None:
    with pytest.raises(UsageError, match=message):
        write_entries(sample(), "turtle", tmp_path / "out", Wishes(change[0], TITLE, "", change[1]))


@pytest.mark.parametrize(
    "tag", ["en", "en-GB", "sr-Latn", "zh-Hant-TW", "sl-rozaj-biske", "und", "x-mine", "de-CH-1996"]
)
def test_language_tags_of_the_standard(tag: str) -> None:
    # Examples of RFC 5646, appendix A, and the private use form.
    assert json.loads(dmlex.dmlex_json(sample(), tag, TITLE))["langCode"] == tag


def test_unknown_format() -> None:
    with pytest.raises(UsageError, match="unknown format 'pdf'"):
        find_format("pdf")
