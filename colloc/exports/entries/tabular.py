"""Entries as tables: CSV files with a Data Package description (version 2), and the same tables for a workbook."""

from __future__ import annotations

import csv
import hashlib
import io
import json
from collections.abc import Mapping
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.expressions.measures import SHOWN
from colloc.answers.judging.entries import Entries
from colloc.exports.entries.wording import source_in_words
from colloc.exports.spreadsheets import defuse
from colloc.exports.workbooks import Table, workbook

PROFILE = "https://datapackage.org/profiles/2.0/datapackage.json"
TABLE_PROFILE = "https://datapackage.org/profiles/2.0/tableschema.json"

TITLES: Mapping[str, str] = {
    "entry": "Checksum of layer, kind and words",
    "words": "The words; a JSON array where a word holds a space",
    "kind": "pair: in any order; directed: the second after the first; expression: in a row",
    "layer": "Layer of the words",
    "sense": "Meaning, as the judges wrote it",
    "labels": "Labels as a JSON array",
    "notes": "Notes as a JSON array",
    "joint": "How often the words meet, or the expression stands",
    "documents": "Documents that hold it",
    "word_counts": "Frequency of each word as a JSON array; 0 for an open place",
    "first_total": "Margin of the first word",
    "second_total": "Margin of the second word",
    "total": "Sum of the table",
    "expected": "Joint count expected if the words were independent",
    "judges": "Who accepted it and when, as a JSON array of [judge, time]",
    "document": "Identifier of the document",
    "start": "Where the text begins in the document, in code points from 0",
    "text": "Verbatim text",
    "marks": "Start and end of each marked word in the text, in code points, as a JSON array",
    "source": "Metadata of the document",
}


def entry_tables(entries: Entries) -> dict[str, Columns]:
    """``entries`` (a row for each sense of each entry) and ``examples`` (a row for each example line)."""
    rows: list[dict[str, Any]] = []
    examples: list[dict[str, Any]] = []
    for entry in entries.entries:
        figures = entry.figures
        for number, sense in enumerate(entry.senses, 1):
            rows.append(
                {
                    "entry": entry.identifier,
                    "sense_number": number,
                    "words": json.dumps(entry.matter.words, ensure_ascii=False)
                    if any(character.isspace() for word in entry.matter.words for character in word)
                    else entry.matter.text,
                    "kind": entry.matter.kind,
                    "layer": entry.matter.layer,
                    "sense": sense.text,
                    "labels": _json(sense.labels),
                    "notes": _json(sense.notes),
                    "joint": figures.joint,
                    "documents": figures.documents,
                    "word_counts": _json(figures.word_counts),
                    **{name: figures.table.get(name) for name in ("first_total", "second_total", "total", "expected")},
                    **{score.name: figures.scores.get(score.name) for score in entries.scores},
                    "judges": _json(entry.judges),
                }
            )
            examples += [
                {
                    "entry": entry.identifier,
                    "sense_number": number,
                    "document": line.example.document,
                    "start": line.example.start,
                    "text": line.example.text,
                    "marks": _json(line.example.marks),
                    "source": source_in_words(line),
                }
                for line in sense.lines
            ]
    names = ["entry", "sense_number", *list(TITLES)[1:14], *(score.name for score in entries.scores), "judges"]
    example_names = ["entry", "sense_number", "document", "start", "text", "marks", "source"]
    whole = {"sense_number", "joint", "documents", "start"}
    broken = {"first_total", "second_total", "total", "expected", *(score.name for score in entries.scores)}
    return {
        "entries": _columns(rows, names, whole, broken),
        "examples": _columns(examples, example_names, whole, broken),
    }


def _json(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False)


def _columns(rows: list[dict[str, Any]], names: list[str], whole: set[str], broken: set[str]) -> Columns:
    columns: dict[str, Any] = {}
    for name in names:
        values = [row[name] for row in rows]
        if name in whole:
            columns[name] = np.array(values, np.int64)
        elif name in broken:
            columns[name] = np.array([np.nan if value is None else value for value in values], np.float64)
        else:
            columns[name] = values
    return Columns(columns)


def data_package(entries: Entries, created: str) -> dict[str, bytes]:
    """The files of a Data Package by name: entries.csv, examples.csv and datapackage.json."""
    tables = entry_tables(entries)
    files = {f"{name}.csv": csv_bytes(table) for name, table in tables.items()}
    titles = {**TITLES, **{score.name: f"{score.title}: {score.formula}" for score in entries.scores}}
    resources = []
    for name, table in tables.items():
        data = files[f"{name}.csv"]
        key: dict[str, Any] = {"primaryKey": ["entry", "sense_number"]}
        if name == "examples":
            same = ["entry", "sense_number"]
            key = {"foreignKeys": [{"fields": same, "reference": {"resource": "entries", "fields": same}}]}
        resources.append(
            {
                "name": name,
                "type": "table",
                "path": f"{name}.csv",
                "format": "csv",
                "mediatype": "text/csv",
                "encoding": "utf-8",
                "bytes": len(data),
                "hash": f"sha256:{hashlib.sha256(data).hexdigest()}",
                "dialect": {
                    "delimiter": ",",
                    "lineTerminator": "\r\n",
                    "quoteChar": '"',
                    "doubleQuote": True,
                    "header": True,
                },
                "schema": {
                    "$schema": TABLE_PROFILE,
                    "fields": [_field(column, table, titles) for column in table.names],
                    "missingValues": [""],
                    **key,
                },
            }
        )
    package = {
        "$schema": PROFILE,
        "name": "accepted-entries",
        "title": "Accepted word combinations",
        "description": f"{entries.tokens} tokens in {entries.documents} documents; pairs: {entries.counting}",
        "created": created,
        "resources": resources,
        # Text cells that a spreadsheet would run have an apostrophe before them.
        "colloc:formula_safe": True,
        "colloc:settings": dict(entries.settings),
    }
    files["datapackage.json"] = (json.dumps(package, ensure_ascii=False, indent=2) + "\n").encode()
    return files


def _field(name: str, table: Columns, titles: Mapping[str, str]) -> dict[str, str]:
    kinds = {"i": "integer", "f": "number"}
    field = {"name": name, "type": kinds.get(table[name].dtype.kind, "string")}
    return field | ({"title": titles[name]} if name in titles else {})


def csv_bytes(table: Columns) -> bytes:
    """RFC 4180 with its line ends, UTF-8, formulas defused; what is no number is an empty cell."""
    stream = io.StringIO(newline="")
    writer = csv.writer(stream, lineterminator="\r\n")
    writer.writerow(table.names)
    for row in table:
        writer.writerow([_cell(value) for value in row.values()])
    return stream.getvalue().encode()


def _cell(value: Any) -> str:
    if value is None or value != value:
        return ""
    if isinstance(value, float):
        # The spellings of Table Schema.
        return {float("inf"): "INF", float("-inf"): "-INF"}.get(value, repr(value))
    return defuse(value) if isinstance(value, str) else str(value)


def entry_workbook(entries: Entries) -> bytes:
    """The tables as worksheets that print: the words first, long texts wrapped; minor columns are not printed."""
    tables = entry_tables(entries)
    minor = [score.name for score in entries.scores if score.kind == "expression" and score.name not in SHOWN]
    main = [score.name for score in entries.scores if score.name not in minor]
    printed = ["words", "sense", "labels", "notes", "joint", "documents", *main]
    order = [*printed, *minor, "kind", "layer", "word_counts", "expected", "judges", "entry", "sense_number"]
    whole = tables["entries"].select(order)
    return workbook(
        [
            Table(
                "entries",
                whole,
                {},
                hidden=("kind", "layer", "word_counts", "judges", "entry"),
                printed=len(printed),
            ),
            Table(
                "examples",
                tables["examples"].select(["text", "document", "source", "start", "marks", "entry", "sense_number"]),
                {},
            ),
        ]
    )
