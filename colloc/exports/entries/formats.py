"""The formats that accepted entries can be written in: a new one is one row here and one module."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path

from colloc.answers.judging.entries import Entries
from colloc.errors import CannotCreateError, UsageError
from colloc.exports.entries import dmlex, jsonlines, network, ontolex, rdf, tabular, tei
from colloc.exports.replacing import replacing


@dataclass(frozen=True, slots=True)
class Wishes:
    """What the user says about the files.

    Parameters
    ----------
    language : str
        Of the words: a BCP 47 tag.
    title : str
    created : str
        Time of writing, RFC 3339.
    base_iri : str
        Where the names of an RDF file begin.
    """

    language: str
    title: str
    created: str
    base_iri: str


@dataclass(frozen=True, slots=True)
class Format:
    """One format: what it is, the ending of its files, and how its one file is made (None: a folder of files)."""

    about: str
    ending: str
    write: Callable[[Entries, Wishes], bytes] | None


FORMATS: Mapping[str, Format] = {
    "csv": Format("CSV files with a Data Package description, in a folder", "", None),
    "xlsx": Format("a workbook that prints", ".xlsx", lambda entries, _: tabular.entry_workbook(entries)),
    "jsonl": Format("JSON Lines", ".jsonl", lambda entries, _: jsonlines.json_lines(entries)),
    "dmlex-json": Format(
        "OASIS DMLex 1.0, JSON", ".json", lambda entries, wish: dmlex.dmlex_json(entries, wish.language, wish.title)
    ),
    "dmlex-xml": Format(
        "OASIS DMLex 1.0, XML", ".xml", lambda entries, wish: dmlex.dmlex_xml(entries, wish.language, wish.title)
    ),
    "tei": Format("TEI Lex-0", ".tei", lambda entries, wish: tei.tei_lex(entries, wish.language, wish.title)),
    "turtle": Format(
        "OntoLex-Lemon with FrAC, Turtle", ".ttl", lambda entries, wish: rdf.turtle(_triples(entries, wish))
    ),
    "jsonld": Format(
        "OntoLex-Lemon with FrAC, JSON-LD", ".jsonld", lambda entries, wish: rdf.json_ld(_triples(entries, wish))
    ),
    "graphml": Format("the network of words, GraphML", ".graphml", lambda entries, _: network.graphml(entries)),
}


def _triples(entries: Entries, wishes: Wishes) -> Iterator[ontolex.Triple]:
    return ontolex.triples(entries, wishes.language, wishes.title, wishes.base_iri)


def find_format(name: str) -> Format:
    """The format of that name.

    Raises
    ------
    UsageError
        There is none; the message lists those there are.
    """
    if name not in FORMATS:
        raise UsageError(f"unknown format {name!r}: choose from {', '.join(FORMATS)}")
    return FORMATS[name]


def write_entries(entries: Entries, name: str, path: Path, wishes: Wishes) -> list[Path]:
    """Write the file, or the files of the folder, whole or not at all; returns their paths.

    Raises
    ------
    CannotCreateError
        Where one of them cannot be written.
    DataError
        For text that the format cannot hold.
    """
    write = find_format(name).write
    if write is not None:
        data = write(entries, wishes)
        with replacing(path) as stream:
            stream.write(data)
        return [path]
    files = tabular.data_package(entries, wishes.created)
    try:
        path.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise CannotCreateError(f"cannot make the folder {path}: {error.strerror}; name another one") from error
    for file, data in files.items():
        with replacing(path / file) as stream:
            stream.write(data)
    return [path / file for file in files]
