"""Annotated documents written out again, as CoNLL-U or CoNLL-U Plus."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.errors import NotSeenError, StoreDamagedError, UsageError
from colloc.exports.replacing import replacing
from colloc.records import CONLLU_COLUMNS, NO_TERM, DocumentRow, Int64Array, UInt32Array
from colloc.store import documents, slices, stream, texts, vocabulary
from colloc.store.annotation import HEAD, NOTHING, RELATION, VALUED, Rest, read_rests, values_of
from colloc.store.connection import Store

_SOURCES = {"deprel": RELATION, "xpos": "xpos", "feats": "feats"}
"""Columns of the file that the store keeps as numbers, with their names there."""
_KEYS_AT_ONCE = 65_536


@dataclass(slots=True)
class Written:
    """How many documents were written so far."""

    documents: int = 0


def write_conllu(store: Store, path: Path, where: str = "") -> int:
    """Write the annotated documents of a slice into a file; how many they were.

    Raises
    ------
    UsageError, NotSeenError
        As `conllu_text`.
    CannotCreateError
        Where the file cannot be written.
    """
    written = Written()
    with replacing(path) as file:
        for piece in conllu_text(store, where, written):
            file.write(piece.encode("utf-8", "surrogatepass"))
    return written.documents


def conllu_text(store: Store, where: str = "", written: Written | None = None) -> Iterator[str]:
    """The annotated documents of a slice as text, a bounded piece of whole sentences at a time.

    Forms, lemmas, tags, features, heads, relations, comments, multiword tokens, empty nodes and all other columns
    are as they were read; only line ends (LF) and blank lines (one behind each sentence) are the format's own.
    Documents of plain text are passed over. A first line ``# global.columns`` names columns other than CoNLL-U's.

    Raises
    ------
    UsageError
        The store keeps no text, or its documents have different columns.
    NotSeenError
        No document of the slice is annotated.
    """
    if not texts.has_text(store):
        raise UsageError(f"{store.path}: was built without its text (--no-text), so there is nothing to write out")
    writer = _Writer(store)
    columns: tuple[str, ...] | None = None
    for number in slices.select(store, where).tolist():
        row = documents.document(store, number)
        annotated = False
        for block, rest in read_rests(store, number):
            annotated = True
            if columns is None:
                columns = rest.columns
                if columns != CONLLU_COLUMNS:
                    yield f"# global.columns = {' '.join(columns).upper()}\n"
            elif columns != rest.columns:
                raise UsageError(
                    f"{store.path}: document {row.identifier!r} has other columns than those before it: "
                    "write them apart, with --where"
                )
            yield writer.sentences(row, block, rest)
        if written is not None:
            written.documents += annotated
    if columns is None:
        raise NotSeenError(f"{store.path}: no annotated document to write; texts were read without annotation")


@dataclass(frozen=True, slots=True)
class _OpenBlock:
    block: stream.Block
    columns: dict[str, NDArray[Any]]
    keys: dict[int, tuple[str, str, str]]


class _Writer:
    """Sentences of one store, rebuilt from its types and columns."""

    def __init__(self, store: Store) -> None:
        self._store = store
        self._values = {name: values_of(store, name) for name in VALUED}
        self._open: _OpenBlock | None = None

    def _block(self, number: int) -> _OpenBlock:
        """A block with its columns and types; the one read last is kept, since documents share blocks."""
        if self._open is None or self._open.block.number != number:
            block = stream.read_block(self._store, number)
            present = set(stream.column_names(self._store, number)) & {HEAD, *VALUED}
            columns = {name: stream.read_column(self._store, number, name) for name in present}
            self._open = _OpenBlock(block, columns, self._keys(block.tokens[block.tokens != NO_TERM]))
        return self._open

    def sentences(self, row: DocumentRow, number: int, rest: Rest) -> str:
        """The part of a document that lies in one block."""
        opened = self._block(number)
        block = opened.block
        begin = max(row.first_token - block.first_token, 0)
        stop = min(row.first_token + row.n_tokens - block.first_token, len(block.tokens))
        n = stop - begin
        starts = block.sentences[(block.sentences >= begin) & (block.sentences < stop)] - begin
        positions = np.arange(n) - np.repeat(starts, np.diff(starts, append=n)) + 1
        fields = self._fields(opened, slice(begin, stop), positions, rest)
        for word, name, text in rest.changed:
            fields[name][word] = text
        for name, column in fields.items():
            if len(column) != n:
                raise StoreDamagedError(f"{self._store.path}: column {name} of {row.identifier!r} has another length")
        return _lines(fields, starts, n, rest)

    def _fields(self, opened: _OpenBlock, part: slice, positions: Int64Array, rest: Rest) -> dict[str, list[str]]:
        forms = [opened.keys[number] for number in opened.block.tokens[part].tolist()]
        values = {name: column[part] for name, column in opened.columns.items()}
        fields: dict[str, list[str]] = {}
        for name in rest.columns:
            if name == "id":
                fields[name] = [*map(str, positions.tolist())]
            elif name in ("form", "lemma", "upos"):
                fields[name] = [key[("form", "lemma", "upos").index(name)] or NOTHING for key in forms]
            elif name == "head":
                fields[name] = self._heads(values[HEAD], positions, values.get(RELATION))
            elif name in _SOURCES:
                known = self._values[_SOURCES[name]]
                fields[name] = [known[value] for value in values[_SOURCES[name]].tolist()]
            else:
                fields[name] = rest.texts[name].split("\n") if name in rest.texts else [NOTHING] * len(forms)
        return fields

    def _heads(self, offsets: NDArray[Any], positions: Int64Array, relations: NDArray[Any] | None) -> list[str]:
        known = self._values[RELATION]
        nothing = known.index(NOTHING) if NOTHING in known else -1
        heads = (positions + offsets).tolist()
        related = np.zeros(len(offsets), bool) if relations is None else relations != nothing
        for word in np.flatnonzero(offsets == 0).tolist():
            heads[word] = 0 if related[word] else NOTHING
        return [*map(str, heads)]

    def _keys(self, types: UInt32Array) -> dict[int, tuple[str, str, str]]:
        """Form, lemma and UPOS by number of the type."""
        different = np.unique(types)
        found: dict[int, tuple[str, str, str]] = {}
        for chunk in np.unique(different // _KEYS_AT_ONCE).tolist():
            first = chunk * _KEYS_AT_ONCE
            keys = vocabulary.type_keys(self._store, first, first + _KEYS_AT_ONCE)
            own = different[(different >= first) & (different < first + _KEYS_AT_ONCE)]
            found.update((number, keys[number - first]) for number in own.tolist())
        return found


def _lines(fields: dict[str, list[str]], starts: Int64Array, n: int, rest: Rest) -> str:
    """The words' lines with all others between them."""
    lines = ["\t".join(row) for row in zip(*fields.values(), strict=True)]
    before, after = defaultdict[int, list[str]](list), defaultdict[int, list[str]](list)
    for word, line in rest.before:
        before[word].append(line)
    for word, line in rest.after:
        after[word].append(line)
    for word, more in before.items():
        if word < n:
            lines[word] = "\n".join([*more, lines[word]])
    for word, more in after.items():
        lines[word] = "\n".join([lines[word], *more])
    edges = [*starts.tolist(), n]
    whole = ["\n".join(lines[begin:stop]) for begin, stop in pairwise(edges)]
    if n in before:
        whole.append("\n".join(before[n]))
    return "".join(f"{sentence}\n\n" for sentence in whole)
