"""The formats and their readers: one row and one module each.

A reader is a module with ``read(opened: Opened, skip: int) -> Iterator[Document]``;
it is imported when a file of its format is read. It takes its input from
``opened.text()`` (decoded) or ``opened.chunks()`` (unpacked bytes) and names
places by ``opened.error(message, line)``.
"""

from __future__ import annotations

import importlib
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import PurePosixPath

from colloc.errors import UsageError
from colloc.records import Document
from colloc.text.compression import without_packing
from colloc.text.opening import Opened

Read = Callable[[Opened, int], Iterator[Document]]


@dataclass(frozen=True, slots=True)
class Format:
    """A format: the file names it goes by and the module that reads it."""

    name: str
    extensions: tuple[str, ...]
    module: str

    def reader(self) -> Read:
        """The function that reads this format."""
        read: Read = importlib.import_module(self.module).read
        return read


PLAIN = Format("txt", (".txt",), "colloc.text.plain")
FORMATS = {
    format.name: format
    for format in (
        PLAIN,
        Format("jsonl", (".jsonl", ".ndjson"), "colloc.text.jsonlines"),
        Format("csv", (".csv",), "colloc.text.delimited"),
        Format("tsv", (".tsv",), "colloc.text.delimited"),
        Format("conllu", (".conllu", ".conllup", ".cupt"), "colloc.text.conllu"),
        Format("tokens", (".tokens",), "colloc.text.conllu"),
        Format("tei", (".xml", ".tei"), "colloc.text.markup.tei"),
        Format("html", (".html", ".htm", ".xhtml"), "colloc.text.markup.html"),
        Format("epub", (".epub",), "colloc.text.markup.epub"),
        Format("parquet", (".parquet", ".pq"), "colloc.text.columnar"),
        Format("arrow", (".arrow", ".feather", ".ipc", ".arrows"), "colloc.text.columnar"),
    )
}


def checked_format(name: str) -> Format | None:
    """The format of that name; None for ``auto``. Raises `UsageError` for an unknown one."""
    if name == "auto":
        return None
    if name not in FORMATS:
        raise UsageError(f"unknown format {name!r}: choose auto, {', '.join(FORMATS)}")
    return FORMATS[name]


def format_by_name(name: str) -> Format | None:
    """The format that a file's name tells, packed or not; None where it tells none."""
    suffix = PurePosixPath(without_packing(name)).suffix.lower()
    return next((format for format in FORMATS.values() if suffix in format.extensions), None)
