"""Documents from Python: any iterable, read once, as it comes."""

from __future__ import annotations

import datetime
import hashlib
import json
import math
from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import Any, overload

from colloc.errors import DataError
from colloc.records import Document, MetaValue, SourceInfo
from colloc.settings import ReadSettings
from colloc.text.lines import MOST_COLUMNS, pieces

ITERABLE = "iterable"
"""What the provenance calls such an input; later ones are numbered."""
_LARGEST_INTEGER = 2**63 - 1


class PythonDocuments(Sequence[str]):
    """An iterable of documents in the place of a list of inputs: as a sequence, its own name.

    A document is a text; ``(identifier, text)`` or ``(identifier, text,
    metadata)``; or a mapping with the text column, perhaps the identifier
    column, and metadata beside them.
    """

    def __init__(self, documents: Iterable[Any], name: str = ITERABLE) -> None:
        self.documents = documents
        self.name = name

    def __len__(self) -> int:
        return 1

    @overload
    def __getitem__(self, index: int) -> str: ...
    @overload
    def __getitem__(self, index: slice) -> list[str]: ...
    def __getitem__(self, index: int | slice) -> str | list[str]:
        return [self.name][index]

    def named_apart(self, taken: Iterable[str]) -> PythonDocuments:
        """The same documents under a name that no other input has."""
        names = set(taken)
        number = 1
        name = self.name
        while name in names:
            number += 1
            name = f"{ITERABLE} {number}"
        return PythonDocuments(self.documents, name)


def cannot_be_resumed(inputs: Sequence[str]) -> bool:
    """Whether these inputs, or the names that a store keeps of them, are an iterable's."""
    return any(name == ITERABLE or name.startswith(f"{ITERABLE} ") for name in inputs)


class IterableSource:
    """The one source that an iterable is: see :class:`colloc.text.sources.Source`."""

    replaced = 0
    detected = None

    def __init__(self, inputs: PythonDocuments, settings: ReadSettings) -> None:
        self.info = SourceInfo(inputs.name, -1, 0.0)
        self.position = 0.0
        self._documents = inputs.documents
        self._settings = settings
        self._hash = hashlib.blake2b(digest_size=16)

    def digest(self) -> str:
        """BLAKE2b-128 in hexadecimal of identifiers, texts and metadata, valid once they have been read."""
        return self._hash.hexdigest()

    def documents(self, skip: int = 0) -> Iterator[Document]:
        """The documents from number ``skip`` on.

        Raises
        ------
        DataError
            ``iterable, document n: ...`` for a value that is no document.
        """
        for record, value in enumerate(self._documents):
            identifier, text, metadata = self._parts(record, value)
            self._hash.update(json.dumps([identifier, text, metadata], sort_keys=True).encode())
            if record >= skip:
                yield Document(identifier, metadata, pieces(text), record)
        self.position = 1.0

    def _parts(self, record: int, value: Any) -> tuple[str, str, dict[str, MetaValue]]:
        settings = self._settings
        identifier: Any = None
        metadata: Mapping[Any, Any] = {}
        if isinstance(value, str):
            text: Any = value
        elif isinstance(value, Mapping):
            columns = dict(value)
            if settings.text_column not in columns:
                raise self._wrong(record, f"no {settings.text_column!r}; name the text column, or give it one")
            text = columns.pop(settings.text_column)
            identifier = columns.pop(settings.id_column or "id", None)
            metadata = columns
        elif isinstance(value, tuple) and len(value) in (2, 3):
            identifier, text = value[:2]
            metadata = value[2] if len(value) == 3 else {}
        else:
            kind = type(value).__name__
            raise self._wrong(record, f"{kind} is no document: give a text, (identifier, text) or a mapping")
        if not isinstance(text, str):
            raise self._wrong(record, f"its text is {type(text).__name__}, not str")
        if not text.isascii() and any("\ud800" <= character <= "\udfff" for character in text):
            raise self._wrong(record, "half a surrogate pair, which is no character, in its text")
        if not isinstance(metadata, Mapping):
            raise self._wrong(record, f"its metadata is {type(metadata).__name__}, not a mapping")
        if len(metadata) > MOST_COLUMNS:
            raise self._wrong(record, f"{len(metadata):,} keys of metadata, more than {MOST_COLUMNS:,}: leave some out")
        kept = {str(key): self._value(record, str(key), item) for key, item in metadata.items()}
        if identifier is None or identifier == "":
            return f"{self.info.name}:{record + 1}", text, kept
        return str(identifier), text, kept

    def _value(self, record: int, key: str, value: Any) -> MetaValue:
        if value is None or isinstance(value, str | bool):
            return value
        if isinstance(value, datetime.date):
            return value.isoformat()
        if hasattr(value, "item") and not isinstance(value, int | float):
            value = value.item()  # a number of numpy's
        if isinstance(value, int):
            return value if abs(value) <= _LARGEST_INTEGER else str(value)
        if isinstance(value, float) and math.isfinite(value):
            return value
        try:
            return json.dumps(value, ensure_ascii=False, allow_nan=False)
        except (TypeError, ValueError, RecursionError) as error:
            raise self._wrong(record, f"metadata {key!r} cannot be kept: {error}") from error

    def _wrong(self, record: int, message: str) -> DataError:
        return DataError(f"{self.info.name}, document {record + 1}: {message}")
