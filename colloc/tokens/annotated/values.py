"""Fields of words as numbers: types by (form, lemma, UPOS), other columns by the different fields they have."""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence

import numpy as np

from colloc.records import Int64Array, UInt32Array
from colloc.tokens.annotated.buffer import Buffer, Slices, gather
from colloc.tokens.annotated.lines import NOTHING, Lines
from colloc.tokens.annotated.slicetable import Growing, SliceTable

TYPE_COLUMNS = ("form", "lemma", "upos")
VALUE_COLUMNS = ("deprel", "xpos", "feats")
_BYTES_A_STRING = 160
"""A short string, its number and its share of a dict, roughly."""

Triple = tuple[str, str, str]
Changed = tuple[int, str, str]
"""Word, column, and the field as it was read."""


class FieldNumberer:
    """Local numbers of types, in order of first appearance, and of fields, over many batches.

    Columns that stand side by side are looked up together, as one slice of a line.
    """

    def __init__(self) -> None:
        self.reset()

    def reset(self) -> None:
        """Forget everything: numbers begin again at 0."""
        self._types: dict[Triple, int] = {}
        self._new: list[Triple] = []
        self._fields: dict[str, dict[str, int]] = {name: {} for name in VALUE_COLUMNS}
        self._bundles: dict[tuple[str, ...], _Bundle] = {}

    @property
    def nbytes(self) -> int:
        """Memory taken, about."""
        strings = 3 * len(self._types) + sum(map(len, self._fields.values()))
        return _BYTES_A_STRING * strings + sum(bundle.nbytes for bundle in self._bundles.values())

    def take_new(self) -> list[Triple]:
        """Types first seen since the last call, in the order of their numbers."""
        taken, self._new = self._new, []
        return taken

    def number(self, lines: Lines) -> tuple[UInt32Array, dict[str, UInt32Array], list[Changed]]:
        """Numbers of words and fields.

        Returns
        -------
        types : uint32 array, shape (n_words,)
        fields : dict of uint32 arrays, shape (n_words,)
            By column, for those of `VALUE_COLUMNS` that there are; :meth:`texts` tells what the numbers stand for.
        changed : list of (word, column, field)
            Fields that their types do not give back: those that were not NFC.
        """
        types: UInt32Array = np.zeros(0, np.uint32)
        fields: dict[str, UInt32Array] = {}
        changed: list[Changed] = []
        for names in _bundled(lines.columns):
            bundle = self._bundles.setdefault(names, _Bundle(names))
            buffer, slices = _slices(lines, names)
            numbers, fresh = bundle.table.number(buffer, slices)
            self._learn(bundle, buffer, slices.only(fresh), fresh)
            fields |= {name: array.values[numbers] for name, array in bundle.fields.items()}
            if "form" in names:
                types = bundle.types.values[numbers]
                changed = bundle.changed_words(numbers)
        return types, fields, changed

    def texts(self, name: str) -> Sequence[str]:
        """The fields of a column, by number."""
        return [*self._fields[name]]

    def _learn(self, bundle: _Bundle, buffer: Buffer, slices: Slices, fresh: Int64Array) -> None:
        """Read what is in a bundle's new slices, which are those of the words ``fresh``."""
        if not len(fresh):
            return
        read = dict(zip(bundle.names, zip(*_divided(buffer, slices), strict=True), strict=True))
        first = len(bundle.table) - len(fresh)
        for name, array in bundle.fields.items():
            known = self._fields[name]
            array.extend(np.array([known.setdefault(text, len(known)) for text in read[name]], np.uint32))
        if "form" in read:
            nothing = [NOTHING] * len(fresh)
            triples = [*zip(*(read.get(name, nothing) for name in TYPE_COLUMNS), strict=True)]
            types = np.zeros(len(fresh), np.uint32)
            # Types have their numbers by the order of the text, slices by their length too.
            for at in np.argsort(fresh).tolist():
                types[at] = self._type(bundle, triples[at], first + at)
            bundle.types.extend(types)

    def _type(self, bundle: _Bundle, read: Triple, slice_number: int) -> int:
        """The number of a type that may be new."""
        form, lemma, upos = normal = tuple(unicodedata.normalize("NFC", text) for text in read)
        # A word that is an underscore has the lemma that it shows.
        triple = form, "" if lemma == NOTHING != form else lemma, "" if upos == NOTHING else upos
        if triple not in self._types:
            self._types[triple] = len(self._types)
            self._new.append(triple)
        if normal != read:
            pairs = zip(TYPE_COLUMNS, read, normal, strict=True)
            bundle.changed[slice_number] = [(name, text) for name, text, kept in pairs if text != kept]
        return self._types[triple]


class _Bundle:
    """Columns that are looked up together; arrays by the number of the slice."""

    def __init__(self, names: tuple[str, ...]) -> None:
        self.names = names
        self.table = SliceTable()
        self.types = Growing(np.uint32)
        self.fields = {name: Growing(np.uint32) for name in names if name in VALUE_COLUMNS}
        self.changed: dict[int, list[tuple[str, str]]] = {}

    @property
    def nbytes(self) -> int:
        """Memory taken, about."""
        arrays = (self.types, *self.fields.values())
        changed = 2 * _BYTES_A_STRING * len(self.changed)
        return self.table.nbytes + sum(array.nbytes for array in arrays) + changed

    def changed_words(self, numbers: UInt32Array) -> list[Changed]:
        """The words whose slices hold fields that were changed."""
        if not self.changed:
            return []
        odd = np.zeros(len(self.table), bool)
        odd[[*self.changed]] = True
        words = np.flatnonzero(odd[numbers])
        pairs = zip(words.tolist(), numbers[words].tolist(), strict=True)
        return [(word, *change) for word, number in pairs for change in self.changed[number]]


def _bundled(columns: dict[str, Slices]) -> list[tuple[str, ...]]:
    """Which columns are looked up together: those of the type with XPOS and features, and the relation by itself."""
    together = tuple(name for name in columns if name in (*TYPE_COLUMNS, "xpos", "feats"))
    return [together, ("deprel",)] if "deprel" in columns else [together]


def _slices(lines: Lines, names: tuple[str, ...]) -> tuple[Buffer, Slices]:
    """The columns of a bundle as slices: of the lines where they stand side by side, else of a copy."""
    order = [*lines.columns]
    first, last = lines.columns[names[0]], lines.columns[names[-1]]
    if order.index(names[-1]) - order.index(names[0]) == len(names) - 1:
        return lines.buffer, first.through(last)
    columns = [lines.columns[name] for name in names]
    starts = np.stack([column.starts for column in columns], axis=1).ravel()
    lengths = np.stack([column.lengths + 1 for column in columns], axis=1).ravel()
    copied, begins = gather(lines.buffer.bytes, Slices(starts, lengths))
    # The last may have ended a line in some file and a field in another.
    copied[begins + lengths - 1] = ord("\t")
    begins = begins[:: len(names)].copy()
    return Buffer(copied.tobytes()), Slices(begins, np.diff(begins, append=len(copied)) - 1)


def _divided(buffer: Buffer, slices: Slices) -> list[list[str]]:
    """The fields of each slice."""
    starts, stops = slices.starts.tolist(), (slices.starts + slices.lengths).tolist()
    return [buffer.text(start, stop).split("\t") for start, stop in zip(starts, stops, strict=True)]


def by_appearance(numbers: UInt32Array, texts: Sequence[str]) -> tuple[UInt32Array, list[str]]:
    """The same fields numbered anew: only those that occur, in order of first appearance.

    Returns
    -------
    numbers : uint32 array
        Into the list beside it.
    texts : list of str
    """
    first = np.full(len(texts), -1)
    # Written backwards, so that the first place is written last and stays.
    first[numbers[::-1]] = np.arange(len(numbers))[::-1]
    present = np.flatnonzero(first >= 0)
    order = present[np.argsort(first[present])]
    renumbered = np.zeros(len(texts), np.uint32)
    renumbered[order] = np.arange(len(order))
    return renumbered[numbers], [texts[number] for number in order.tolist()]
