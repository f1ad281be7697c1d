"""Every error a user can cause, each with the exit code the command line gives it.

The tree (exit codes follow ``sysexits.h`` where it has a number for the case)::

    CollocError                 1   a check found problems
    ├── NotSeenError            1   the word or pair never occurs
    ├── UsageError              2   a wrong option, value or combination
    ├── DataError              65   input that cannot be read as what it claims to be
    │   └── StoreDamagedError  65   a store whose pages or tables do not verify
    ├── NoInputError           66   a file or folder that is missing or holds no text
    ├── MissingExtraError      69   an optional library is not installed
    ├── CannotCreateError      73   an output that cannot be created
    ├── InputOutputError       74   the disk is full, a read failed
    └── LockedError            75   another process is writing; try again

Messages are one line: what is wrong, where (file and line), and what to do.
"""

from __future__ import annotations


class CollocError(Exception):
    """Base of all errors that ``colloc`` raises on purpose."""

    exit_code = 1


class NotSeenError(CollocError):
    """A word or pair that the store has never seen."""


class UsageError(CollocError):
    """A wrong option, value or combination of options."""

    exit_code = 2


class DataError(CollocError):
    """Input that cannot be read as what it claims to be."""

    exit_code = 65


class StoreDamagedError(DataError):
    """A store whose pages, tables or sizes do not verify."""


class NoInputError(CollocError):
    """A file or folder that is missing or holds no text."""

    exit_code = 66


class MissingExtraError(CollocError):
    """An optional library that the request needs is not installed."""

    exit_code = 69


class CannotCreateError(CollocError):
    """An output file or store that cannot be created."""

    exit_code = 73


class InputOutputError(CollocError):
    """The operating system refused to read or write (disk full, I/O error)."""

    exit_code = 74


class LockedError(CollocError):
    """Another process is writing to the store."""

    exit_code = 75
