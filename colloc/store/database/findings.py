"""What a check reports."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass

from colloc.errors import CollocError


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing that is wrong.

    Attributes
    ----------
    place : str
        Which part of the store.
    problem : str
        What is wrong with it.
    remedy : str
        What can be saved, and how.
    """

    place: str
    problem: str
    remedy: str

    def __str__(self) -> str:
        return f"{self.place}: {self.problem}; {self.remedy}"


@contextmanager
def noting(findings: list[Finding], place: str, remedy: str) -> Iterator[None]:
    """What cannot be read becomes a finding, so that the check goes on behind it."""
    try:
        yield
    except CollocError as error:
        findings.append(Finding(place, str(error), remedy))
