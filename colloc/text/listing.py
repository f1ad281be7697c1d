"""Which files the inputs mean: files, folders, globs and standard input."""

from __future__ import annotations

import glob
import os
import stat
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import PurePath

from colloc.errors import DataError, NoInputError
from colloc.records import MetaValue
from colloc.settings import ReadSettings
from colloc.text.opening import STANDARD_INPUT, Opened, reading, shown
from colloc.text.readers import PLAIN, Format, checked_format, format_by_name

_Identity = tuple[int, int]
"""Device and inode."""


@dataclass(frozen=True, slots=True)
class InputFile:
    """One file to read."""

    path: str
    """What the operating system opens; ``-`` is standard input."""
    name: str
    """The path as given, fit for UTF-8."""
    identifier: str
    """Path below the folder that was given; of a file named itself, the path as given or its last part."""
    format: Format
    size: int
    """Bytes on disk, -1 where unknown."""
    modified: float

    def open(self, settings: ReadSettings, metadata: Mapping[str, MetaValue]) -> Opened:
        """The file ready to be read; nothing is touched before its bytes are asked for."""
        return Opened(
            self.path,
            settings,
            name=self.name,
            identifier=self.identifier,
            format=self.format.name,
            metadata=metadata,
        )


@dataclass(frozen=True, slots=True)
class Listing:
    """The files of all inputs: in order, each once however often it was named."""

    files: tuple[InputFile, ...]
    ignored: int
    """Files in folders that were passed over: their names tell of no known format, or are hidden."""


def list_inputs(inputs: Sequence[str], format: str = "auto", apart: str | None = None) -> Listing:
    """Find the files that ``inputs`` mean, without opening them.

    A folder is walked in sorted order, links followed; taken are the files
    with an extension of ``format`` (of any format for ``auto``). A file named
    itself or by a glob is taken whatever it is called, as plain text where its
    name tells of no format. The file ``apart`` (a table of metadata, which
    may lie in the same folder) is left out.

    Raises
    ------
    NoInputError
        A missing input, a folder or glob without files to read, or nothing but empty files.
    DataError
        A link that leads back to a folder above it.
    """
    chosen = checked_format(format)
    if not inputs:
        raise NoInputError("no input: name files, folders, globs, or - for standard input")
    left_out = None if apart is None else os.path.realpath(apart)
    files: dict[str, InputFile] = {}
    ignored = 0
    for given in inputs:
        found = False
        for path, folder in _found(given):
            real = path if path == STANDARD_INPUT else os.path.realpath(path)
            if real == left_out:
                continue
            format_ = format_by_name(path)
            if folder and (_is_hidden(path) or format_ is None or chosen not in (None, format_)):
                ignored += 1
                continue
            found = True
            if real not in files:
                files[real] = _input_file(path, folder, chosen or format_ or PLAIN)
        if not found:
            endings = " ".join((chosen or PLAIN).extensions)
            raise NoInputError(
                f"{shown(_printable(given))}: no file to read in it: from folders those of known formats are taken "
                f"(such as {endings}), others must be named"
            )
    listed = list(files.values())
    if all(file.size == 0 for file in listed):
        others = " like all other inputs" if len(listed) > 1 else ""
        raise NoInputError(f"{shown(listed[0].name)}: empty{others}; name a file with text in it")
    return Listing(tuple(_distinct(listed)), ignored)


def _found(given: str) -> Iterator[tuple[str, str]]:
    """Paths that one input means, each with the folder it was found in (empty for a file named itself)."""
    if given == STANDARD_INPUT:
        yield given, ""
    elif os.path.lexists(given) or not glob.has_magic(given):
        with reading(_printable(given)):
            is_folder = stat.S_ISDIR(os.stat(given).st_mode)
        if is_folder:
            for path in _walk(given):
                yield path, given
        else:
            yield given, ""
    else:
        matches = sorted(glob.glob(given, recursive=True))
        if not matches:
            raise NoInputError(f"{shown(_printable(given))}: nothing matches")
        for match in matches:
            if not os.path.isdir(match):
                yield match, ""
            elif "**" not in given:
                for path in _walk(match):
                    yield path, match


def _walk(folder: str) -> Iterator[str]:
    """Regular files below a folder in sorted order, each folder once even where several links lead to it."""
    walked: set[_Identity] = set()
    # From the folder down to where the walk is: what each folder is, and its entries still to be visited.
    levels: list[tuple[_Identity | None, Iterator[str]]] = [(None, iter((folder,)))]
    while levels:
        path = next(levels[-1][1], None)
        if path is None:
            levels.pop()
            continue
        with reading(_printable(path)):
            status = os.stat(path)
            if stat.S_ISREG(status.st_mode):
                yield path
            if not stat.S_ISDIR(status.st_mode) or (len(levels) > 1 and _is_hidden(path)):
                continue
            identity = (status.st_dev, status.st_ino)
            if any(identity == above for above, _ in levels):
                raise DataError(
                    f"{shown(_printable(path))}: a link back to a folder above it: "
                    "remove the link, or name the folders to read"
                )
            if identity not in walked:
                walked.add(identity)
                levels.append((identity, iter([os.path.join(path, entry) for entry in sorted(os.listdir(path))])))


def _is_hidden(path: str) -> bool:
    return os.path.basename(path).startswith(".")


def _input_file(path: str, folder: str, format: Format) -> InputFile:
    if path == STANDARD_INPUT:
        return InputFile(path, path, path, format, -1, 0.0)
    name = _printable(path)
    with reading(name):
        status = os.stat(path)
    if folder:
        identifier = _printable(os.path.relpath(path, folder))
    else:
        parts = PurePath(name)
        identifier = parts.name if parts.is_absolute() or ".." in parts.parts else str(parts)
    size = status.st_size if stat.S_ISREG(status.st_mode) else -1
    return InputFile(path, name, identifier.replace(os.sep, "/"), format, size, status.st_mtime)


def _distinct(files: list[InputFile]) -> Iterator[InputFile]:
    """Files whose short identifiers are alike go by the path as given."""
    times = Counter(file.identifier for file in files)
    for file in files:
        yield replace(file, identifier=file.name) if times[file.identifier] > 1 else file


def _printable(path: str) -> str:
    """A path as text that UTF-8 can hold: what Python puts for bytes that are no UTF-8 is written as escapes."""
    return path.encode("utf-8", "backslashreplace").decode("utf-8")
