"""Texts, packers and one way of reading everything, shared by the tests of this folder and the fuzzers."""

from __future__ import annotations

import bz2
import gzip
import json
import lzma
import random
from collections.abc import Callable
from dataclasses import replace
from functools import partial
from pathlib import Path

import zstandard

from colloc.records import Document
from colloc.settings import ReadSettings
from colloc.text.sources import open_sources

HOSTILE = (
    "",
    "\n",
    "a\r\nb\rc\n\x0b\x0c\x85\u2028\u2029d",
    "e\u0301\u0301" + "\u0300" * 500,
    "\U0010ffff\ufffe\uffff\ufdd0",
    "\u202eright to left\u202c \u200d\u200b\ufeff",
    "👩‍👩‍👧‍👦🏳️‍🌈" * 50,
    "כתוב \u05d0\u05b8 العربية ไทย 한국어 中文",
    '"quoted", \t\'and\' {"json": [1]} \\ \\u00e9',
    "\x01\x02\x1b[31mred\x7f",
)
"""Texts that trip readers: line ends of all kinds, marks, noncharacters, joiners, quotes, controls (no NUL)."""

PACKERS: dict[str, Callable[[bytes], bytes]] = {
    "": bytes,
    ".gz": partial(gzip.compress, compresslevel=1),
    ".bz2": bz2.compress,
    ".xz": partial(lzma.compress, preset=0),
    ".zst": zstandard.ZstdCompressor().compress,
}


def prose(seed: int, size: int) -> str:
    """About ``size`` characters of invented prose in several scripts."""
    chance = random.Random(seed)
    words = ["harbour", "größe", "île", "Ångström", "море", "灯台", "λιμήν", "wind", "the", "of", "well-kept", "👍"]
    ends = [" ", " ", " ", ", ", ". ", ".\n", "\n\n"]
    parts: list[str] = []
    length = 0
    while length < size:
        parts.append(chance.choice(words) + chance.choice(ends))
        length += len(parts[-1])
    return "".join(parts)


def json_line(**columns: object) -> str:
    return json.dumps(columns, ensure_ascii=False) + "\n"


def read_documents(path: Path | str, settings: ReadSettings | None = None, skip: int = 0) -> list[Document]:
    """Every document of one input, its pieces read."""
    return [
        replace(document, pieces=tuple(document.pieces), sentences=tuple(document.sentences))
        for source in open_sources([str(path)], settings or ReadSettings())
        for document in source.documents(skip)
    ]


def read_texts(path: Path | str, settings: ReadSettings | None = None) -> list[str]:
    """The text of every document of one input."""
    return ["".join(document.pieces) for document in read_documents(path, settings)]


def count_characters(path: Path | str, settings: ReadSettings | None = None) -> int:
    """Read one input without keeping it."""
    total = 0
    for source in open_sources([str(path)], settings or ReadSettings()):
        for document in source.documents():
            for piece in document.pieces:
                total += len(piece)
    return total
