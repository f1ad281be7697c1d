"""Directories: the key range of every page of one order of one run, in one checksummed blob.

An answer reads the directory first. Since it names each page's own checksum, a
page that was lost, exchanged or altered is noticed, never passed over.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.errors import StoreDamagedError
from colloc.records import UInt64Array
from colloc.store.database import packing
from colloc.store.pages import PAGE_PAIRS, PageHead

_FIELDS = 4


class Directory:
    """The heads of the pages of one order, as columns.

    Attributes
    ----------
    n, checksums : int64 arrays, shape (pages,)
    first, last : uint64 arrays, shape (pages,)
        Keys, major << 32 | minor; ascending from page to page.
    """

    def __init__(self, columns: NDArray[np.int64]) -> None:
        self.n = columns[0]
        self.first: UInt64Array = columns[1].view(np.uint64)
        self.last: UInt64Array = columns[2].view(np.uint64)
        self.checksums = columns[3]

    def __len__(self) -> int:
        return len(self.n)

    def head(self, page: int) -> PageHead:
        """The head of one page."""
        return PageHead(int(self.n[page]), int(self.first[page]), int(self.last[page]), int(self.checksums[page]))

    def pages_between(self, first: int, last: int) -> range:
        """Pages that may hold keys first..last, both included."""
        start = int(np.searchsorted(self.last, np.uint64(first)))
        stop = int(np.searchsorted(self.first, np.uint64(last), side="right"))
        return range(start, stop)


def pack_directory(heads: Sequence[PageHead]) -> bytes:
    """The heads of all pages, in order, as bytes."""
    columns = np.array(
        [
            [head.n for head in heads],
            *([getattr(head, name) for head in heads] for name in ("first", "last", "checksum")),
        ],
        dtype=np.uint64,
    ).view(np.int64)
    return packing.pack(columns.reshape(-1), compress=True)


def unpack_directory(data: Any, what: str) -> Directory:
    """The directory; StoreDamagedError where it does not verify or its keys do not ascend."""
    values = packing.unpack_as(data, np.int64, what)
    if len(values) % _FIELDS:
        raise StoreDamagedError(f"{what}: has {len(values)} fields")
    directory = Directory(values.reshape(_FIELDS, -1))
    n, first, last = directory.n, directory.first, directory.last
    if ((n < 1) | (n > PAGE_PAIRS)).any() or (first > last).any() or (first[1:] <= last[:-1]).any():
        raise StoreDamagedError(f"{what}: its pages overlap or have impossible sizes")
    return directory
