"""Encoded pages, waiting in a temporary file for the one process that writes the store."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from colloc.counts.runs import Column, write_column
from colloc.errors import InputOutputError
from colloc.records import Int64Array, PairBlock
from colloc.store.pages import PAGE_PAIRS, Order, PageHead, encode_page, head_of


@dataclass(frozen=True, slots=True)
class PageFile:
    """Consecutive pages of one order, with the part of the margins that can be summed from them.

    In the order ``low`` these are the sums over the pairs in which a term is the lower one, in the
    order ``high`` those in which it is the higher one; the diagonal is in the former.

    Attributes
    ----------
    heads : list of (n, first, last, checksum, length in bytes)
    terms, first, second : Column
        Terms ascending, and their parts of the row and column sums.
    """

    order: Order
    path: str
    heads: list[list[int]]
    terms: Column
    first: Column
    second: Column

    def pages(self) -> Iterator[tuple[PageHead, bytes]]:
        """The pages in order."""
        with open(self.path, "rb") as file:
            for n, first, last, checksum, length in self.heads:
                data = file.read(length)
                if len(data) != length:
                    raise InputOutputError(f"{self.path}: a temporary file was cut short; run the same command again")
                yield PageHead(n, first, last, checksum), data


def write_pages(folder: Path, name: str, block: PairBlock, order: Order) -> PageFile:
    """Encode pairs sorted by ``order`` into a new file in ``folder``."""
    heads = []
    pages = []
    for start in range(0, len(block), PAGE_PAIRS):
        part = slice(start, start + PAGE_PAIRS)
        page = PairBlock(block.low[part], block.high[part], block.forward[part], block.backward[part])
        data = encode_page(page, order)
        head = head_of(data, page, order)
        heads.append([head.n, head.first, head.last, head.checksum, len(data)])
        pages.append(data)
    path = write_column(folder / f"{name}.pages", np.frombuffer(b"".join(pages), np.uint8)).path
    terms, first, second = _margins(block, order)
    return PageFile(
        order,
        path,
        heads,
        write_column(folder / f"{name}.terms", terms),
        write_column(folder / f"{name}.first", first),
        write_column(folder / f"{name}.second", second),
    )


def page_file(facts: dict[str, Any]) -> PageFile:
    """A `PageFile` from the dictionary that `dataclasses.asdict` made of it."""
    columns = {name: Column(**facts[name]) for name in ("terms", "first", "second")}
    return PageFile(order=facts["order"], path=facts["path"], heads=facts["heads"], **columns)


def _margins(block: PairBlock, order: Order) -> tuple[Any, Int64Array, Int64Array]:
    major = block.low if order == "low" else block.high
    if not len(block):
        return major, block.forward, block.backward
    starts = np.flatnonzero(np.concatenate([[True], major[1:] != major[:-1]]))
    forward, backward = block.forward, block.backward
    if order == "low":
        # the diagonal cell is in a row and in a column of the same term
        diagonal = np.where(block.low == block.high, forward, 0)
        return major[starts], np.add.reduceat(forward, starts), np.add.reduceat(backward + diagonal, starts)
    forward = np.where(block.low == block.high, 0, forward)
    return major[starts], np.add.reduceat(backward, starts), np.add.reduceat(forward, starts)
