"""Fields of words as numbers: types by (form, lemma, UPOS), other columns by small tables of their own."""

from __future__ import annotations

import unicodedata
from typing import cast

import numpy as np

from colloc.records import UInt32Array
from colloc.tokens.annotated.lines import Lines

NOTHING = "_"
"""CoNLL-U's word for a field that is not specified."""
LONGEST = 2**16
"""Code points of one field."""
_BYTES_A_TYPE = 500
"""Of a key as read and its strings, about."""

_COLUMNS = ("form", "lemma", "upos")
Triple = tuple[str, str, str]
Changed = tuple[int, str, str]
"""Word, column, and the field as it was read."""


class TripleNumberer:
    """Local numbers of types, in order of first appearance, over many batches."""

    def __init__(self) -> None:
        self.reset()

    def reset(self) -> None:
        """Forget everything: numbers begin again at 0."""
        self._known: dict[Triple, int] = {}
        self._types: dict[Triple, int] = {}
        self._new: list[Triple] = []
        self._changed: dict[Triple, list[tuple[str, str]]] = {}

    @property
    def nbytes(self) -> int:
        """Memory taken, about."""
        return _BYTES_A_TYPE * len(self._known)

    def take_new(self) -> list[Triple]:
        """Types first seen since the last call, in the order of their numbers."""
        taken, self._new = self._new, []
        return taken

    def number(self, lines: Lines) -> tuple[UInt32Array, list[Changed]]:
        """Local type number of each word, and the fields that their types do not give back.

        Returns
        -------
        numbers : uint32 array, shape (n_words,)
        changed : list of (word, column, field)
            Fields that were not NFC.

        Raises
        ------
        DataError
            An empty field, or one of more than ``LONGEST`` code points.
        """
        columns = lines.columns
        absent = (NOTHING,) * len(lines)
        keys: list[Triple] = [
            *zip(columns["form"], columns.get("lemma", absent), columns.get("upos", absent), strict=True)
        ]
        numbers = [*map(self._known.get, keys)]
        if None in numbers:
            for offset in [offset for offset, number in enumerate(numbers) if number is None]:
                numbers[offset] = self._number(lines, keys[offset], offset)
        changed: list[Changed] = []
        if self._changed:
            odd = ((offset, key) for offset, key in enumerate(keys) if key in self._changed)
            changed = [(offset, *change) for offset, key in odd for change in self._changed[key]]
        return np.array(cast(list[int], numbers), np.uint32), changed

    def _number(self, lines: Lines, read: Triple, word: int) -> int:
        """The number of a type that may be new."""
        if read in self._known:
            return self._known[read]
        for name, text in zip(_COLUMNS, read, strict=True):
            check_field(lines, name, text, word)
        form, lemma, upos = normal = tuple(unicodedata.normalize("NFC", text) for text in read)
        # A word that is an underscore has the lemma that it shows.
        triple = form, "" if lemma == NOTHING != form else lemma, "" if upos == NOTHING else upos
        if triple not in self._types:
            self._types[triple] = len(self._types)
            self._new.append(triple)
        if normal != read:
            pairs = zip(_COLUMNS, read, normal, strict=True)
            self._changed[read] = [(name, text) for name, text, kept in pairs if text != kept]
        self._known[read] = self._types[triple]
        return self._types[triple]


class ValueNumberer:
    """Numbers of the different fields of a column, in order of first appearance."""

    def __init__(self, name: str) -> None:
        self._name = name
        self.values: dict[str, int] = {}

    def number(self, lines: Lines) -> UInt32Array:
        """The number of each word's field.

        Raises
        ------
        DataError
            An empty field, or one of more than ``LONGEST`` code points.
        """
        column = lines.columns[self._name]
        for text in dict.fromkeys(column):
            if text not in self.values:
                if not text or len(text) > LONGEST:
                    check_field(lines, self._name, text, column.index(text))
                self.values[text] = len(self.values)
        return np.fromiter(map(self.values.__getitem__, column), np.uint32, len(column))


def check_field(lines: Lines, name: str, text: str, word: int) -> None:
    """Raise DataError for a field that is empty or too long."""
    if not text:
        lines.places.fail(f"{name.upper()} is empty: write {NOTHING} where there is nothing to say", word=word)
    if len(text) > LONGEST:
        lines.places.fail(f"{name.upper()} has {len(text):,} characters, more than {LONGEST:,}", word=word)
