"""Inputs as streams of documents."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from colloc.records import Document, MetaValue, SourceInfo
from colloc.settings import ReadSettings
from colloc.text.decoding import checked_encoding
from colloc.text.iterables import IterableSource, PythonDocuments
from colloc.text.listing import InputFile, list_inputs
from colloc.text.metadata import FileMetadata
from colloc.text.opening import Opened


class Source:
    """One input file: a stream of documents, opened when they are asked for.

    Attributes
    ----------
    info : SourceInfo
        Name, size and time of the file as they were when it was listed.
    """

    def __init__(self, file: InputFile, metadata: Mapping[str, MetaValue], settings: ReadSettings) -> None:
        self.info = SourceInfo(file.name, file.size, file.modified)
        self._file = file
        self._metadata = metadata
        self._settings = settings
        self._opened: Opened | None = None

    @property
    def replaced(self) -> int:
        """Undecodable bytes replaced so far (``errors="replace"``)."""
        return self._opened.replaced if self._opened else 0

    @property
    def detected(self) -> str | None:
        """The encoding that ``encoding="detect"`` chose for this file, once it was opened."""
        return self._opened.detected if self._opened else None

    @property
    def position(self) -> float:
        """Share of the file read so far, 0..1; 0 until the end where its size is unknown."""
        return self._opened.position if self._opened else 0.0

    def digest(self) -> str:
        """BLAKE2b-128 of the raw bytes in hexadecimal, valid once `documents` is exhausted."""
        if self._opened is None:
            raise RuntimeError(f"{self.info.name} has not been read")
        return self._opened.digest()

    def documents(self, skip: int = 0) -> Iterator[Document]:
        """The documents from record ``skip`` on, each to be consumed before the next is asked for.

        Raises
        ------
        DataError
            Input that cannot be read as what it is said to be, naming file and line or byte.
        NoInputError, InputOutputError
            A file that has gone, may not be read, or whose reading fails.
        """
        file = self._file
        opened = file.open(self._settings, self._metadata)
        self._opened = opened
        try:
            yield from file.format.reader()(opened, skip)
            opened.drain()
        finally:
            opened.close()


def open_sources(inputs: Sequence[str], settings: ReadSettings) -> Iterator[Source | IterableSource]:
    """The sources that ``inputs`` mean: as given, folders walked in sorted order, each file once.

    `PythonDocuments` in their place are one source.

    Everything that can be known without opening the inputs is checked first.

    Raises
    ------
    NoInputError
        When an input is missing or a folder has no text.
    UsageError
        For an unknown format or encoding, or a wrong metadata pattern.
    DataError
        For a link loop, a wrong metadata table, or a path that does not match the pattern.
    """
    if isinstance(inputs, PythonDocuments):
        return iter([IterableSource(inputs, settings)])
    checked_encoding(settings.encoding)
    files = list_inputs(inputs, settings.format, apart=settings.meta_table).files
    metadata = FileMetadata(settings, files)
    return iter([Source(file, metadata.of(file), settings) for file in files])
