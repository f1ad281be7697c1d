"""Plain text: one document a file, streamed."""

from __future__ import annotations

from collections.abc import Iterator

from colloc.records import Document
from colloc.text.opening import Opened


def read(opened: Opened, skip: int) -> Iterator[Document]:
    """The file's one document, unless it is to be skipped."""
    if skip == 0:
        yield Document(opened.identifier, opened.metadata, opened.text(), 0)
