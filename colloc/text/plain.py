"""Plain text: one document a file, streamed."""

from __future__ import annotations

from collections.abc import Iterator

from colloc.records import Document
from colloc.text.opening import Opened


def read(opened: Opened, skip: int) -> Iterator[Document]:
    """The file's one document, unless it is to be skipped."""
    if skip == 0:
        # An `id` that the path or a side table gives is the identifier, as it is in records.
        metadata = dict(opened.metadata)
        identifier = metadata.pop("id", None)
        name = opened.identifier if identifier is None else str(identifier)
        yield Document(name, metadata, opened.text(), 0)
