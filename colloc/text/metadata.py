"""Metadata of whole files: from their paths, and from a side table keyed by file name."""

from __future__ import annotations

import functools
import math
import os
import re
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from colloc.errors import DataError, UsageError
from colloc.records import MetaValue
from colloc.settings import ReadSettings
from colloc.text.compression import without_packing
from colloc.text.listing import InputFile, list_inputs
from colloc.text.opening import shown

_FIELD = re.compile(r"\{([^{}]*)\}")
_LARGEST_INTEGER = 2**63 - 1
_NUMBER_STARTS = "-0123456789"
_LONGEST_NUMBER = 24
"""Characters of the longest canonical float, -2.2250738585072014e-308."""


def typed(text: str) -> MetaValue:
    """An int or float where the whole string is the canonical way to write it, else the string.

    ``1990`` is a number; ``007``, ``1.50``, ``+1`` and ``nan`` stay text, so nothing is lost.
    """
    if text[:1] not in _NUMBER_STARTS or len(text) > _LONGEST_NUMBER:
        return text
    return _number(text)


@functools.lru_cache(maxsize=4096)
def _number(text: str) -> MetaValue:
    for kind in (int, float):
        try:
            value = kind(text)
        except ValueError:
            continue
        if repr(value) == text and (abs(value) <= _LARGEST_INTEGER if kind is int else math.isfinite(value)):
            return value
    return text


@dataclass(frozen=True, slots=True)
class _Part:
    """One part of a path pattern: ``literals[0] {fields[0]} literals[1] ...``."""

    fields: tuple[str, ...]
    literals: tuple[str, ...]

    def match(self, text: str) -> dict[str, str] | None:
        """Values of the fields, each at least one character and as short as can be; None where it does not match.

        Looking for each literal from left to right finds a match wherever there is one, in linear time.
        """
        first, last = self.literals[0], self.literals[-1]
        if not self.fields:
            return {} if text == first else None
        if not text.startswith(first) or not text.endswith(last):
            return None
        end = len(text) - len(last)
        values = {}
        position = len(first)
        for field, literal in zip(self.fields[:-1], self.literals[1:-1], strict=True):
            found = text.find(literal, position + 1, end)
            if found < 0:
                return None
            values[field] = text[position:found]
            position = found + len(literal)
        if position >= end:
            return None
        values[self.fields[-1]] = text[position:end]
        return values


class PathPattern:
    """A pattern such as ``{genre}/{year}-{id}.txt``, matched against the end of a path.

    A field is one or more characters without ``/``.

    Raises
    ------
    UsageError
        For a pattern without fields, with a field named twice, two fields side by side, or a stray brace.
    """

    def __init__(self, pattern: str) -> None:
        self.pattern = pattern
        names = _FIELD.findall(pattern)
        repeated = [name for name, times in Counter(names).items() if times > 1]
        if not names:
            raise self._wrong("it has no field such as {genre}")
        if repeated:
            raise self._wrong(f"field {{{repeated[0]}}} occurs twice")
        if any(not name.isidentifier() for name in names):
            raise self._wrong("a field's name is made of letters, digits and _ and does not begin with a digit")
        if "}{" in pattern:
            raise self._wrong("two fields stand side by side; put a character between them")
        if set("{}") & set(_FIELD.sub("", pattern)):
            raise self._wrong("a brace stands alone")
        self._parts = [self._part(part) for part in pattern.strip("/").split("/")]

    def _wrong(self, why: str) -> UsageError:
        return UsageError(f"the path pattern {self.pattern!r} is wrong: {why}")

    def _part(self, part: str) -> _Part:
        if part in ("", ".", ".."):
            raise self._wrong(f"it has {part or 'an empty part'!r} between slashes")
        pieces = _FIELD.split(part)
        return _Part(tuple(pieces[1::2]), tuple(pieces[::2]))

    def match(self, path: str) -> dict[str, MetaValue]:
        """The fields' values in ``path`` (numbers where canonical); the ending of a packed file may be left out.

        Raises
        ------
        DataError
            For a path that does not match.
        """
        for name in (path, without_packing(path)):
            tail = name.split("/")[-len(self._parts) :]
            if len(tail) == len(self._parts):
                found = [part.match(text) for part, text in zip(self._parts, tail, strict=True)]
                if None not in found:
                    return {field: typed(value) for values in found if values for field, value in values.items()}
        raise DataError(
            f"{shown(path)}: the path does not end as the pattern {self.pattern!r} says: correct the pattern, "
            "or leave the file out"
        )


class _Table:
    """A side table: one row of metadata for each file, keyed by the first column."""

    def __init__(self, path: str, settings: ReadSettings) -> None:
        from colloc.text.tables import read_rows

        file = list_inputs([path]).files[0]
        self._name = shown(file.name)
        self._rows: dict[str, Mapping[str, MetaValue]] = {}
        opened = file.open(replace(settings, errors="strict"), {})
        for line, key, row in read_rows(opened):
            if key in self._rows:
                raise opened.error(f"a second row for {key!r}; keep one", line)
            self._rows[key] = row

    def check(self, files: Sequence[InputFile]) -> None:
        """Refuse a bare file name that stands for several files of different folders."""
        times = Counter(os.path.basename(file.identifier) for file in files if file.identifier not in self._rows)
        for name, count in times.items():
            if count > 1 and name in self._rows:
                raise DataError(f"{self._name}: {name!r} stands for {count} files; key their rows by path")

    def row(self, file: InputFile) -> Mapping[str, MetaValue]:
        for key in (file.identifier, os.path.basename(file.identifier)):
            if key in self._rows:
                return self._rows[key]
        raise DataError(f"{self._name}: no row for {shown(file.identifier)!r}; add one (first column: file name)")


class FileMetadata:
    """What the settings say of each input file."""

    def __init__(self, settings: ReadSettings, files: Sequence[InputFile]) -> None:
        self._pattern = PathPattern(settings.meta_from_path) if settings.meta_from_path is not None else None
        self._table = _Table(settings.meta_table, settings) if settings.meta_table is not None else None
        if self._table:
            self._table.check(files)

    def of(self, file: InputFile) -> dict[str, MetaValue]:
        """Metadata of one file; the side table goes before the path."""
        values: dict[str, MetaValue] = {}
        if self._pattern:
            values.update(self._pattern.match(os.path.abspath(file.name).replace(os.sep, "/")))
        if self._table:
            values.update(self._table.row(file))
        return values
