"""Exact repeats of documents or paragraphs, found by content hash.

Hashes that were stored are in the store; what has been read but not yet
committed is in a scratch database beside it, so that a build that is killed
never takes a document for a repeat of itself, and memory stays bounded.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import Literal, Protocol

from colloc.errors import DataError
from colloc.store.inputs.repeats import SeenHashes

SHORTEST_PARAGRAPH = 80
"""Code points; shorter paragraphs ("Yes.", "Chapter I") repeat in honest text and are kept."""

LONGEST_PARAGRAPH = 16 * 2**20


@dataclass(frozen=True, slots=True)
class Met:
    """New hashes, and repeats dropped."""

    digests: tuple[bytes, ...] = ()
    documents: int = 0
    paragraphs: int = 0


NOTHING_MET = Met()


class Fingerprint(Protocol):
    """What a document's text, as such or in UTF-8, is hashed with."""

    def update(self, text: str | bytes) -> None: ...


class _NoFingerprint:
    def update(self, text: str | bytes) -> None:
        """Nothing is asked of the text."""


class _TextFingerprint:
    def __init__(self) -> None:
        self._hash = hashlib.blake2b(digest_size=16)

    def update(self, text: str | bytes) -> None:
        self._hash.update(text.encode("utf-8", "surrogatepass") if isinstance(text, str) else text)

    def digest(self) -> bytes:
        return self._hash.digest()


class Repeats:
    """Decides what is a repeat, and counts what was dropped.

    Parameters
    ----------
    mode : {"none", "document", "paragraph"}
    seen : SeenHashes or None
        Needed unless the mode is "none".
    """

    def __init__(self, mode: Literal["none", "document", "paragraph"], seen: SeenHashes | None = None) -> None:
        self.mode = mode
        self._seen = seen
        self._new: list[bytes] = []
        self._told = (0, 0)
        self.documents = 0
        self.paragraphs = 0

    def fingerprint(self) -> Fingerprint:
        """A hash to be fed the whole text of a document."""
        return _TextFingerprint() if self.mode == "document" else _NoFingerprint()

    def is_repeat(self, fingerprint: Fingerprint) -> bool:
        """Whether a document with this text was met before; remembers it."""
        if not isinstance(fingerprint, _TextFingerprint):
            return False
        repeat = self._known(fingerprint.digest())
        self.documents += repeat
        return repeat

    def without_paragraphs(self, pieces: Iterable[str]) -> Iterator[str]:
        """The pieces, in paragraph mode cut at line ends and without the repeated ones."""
        if self.mode != "paragraph":
            yield from pieces
            return
        waiting = ""
        for piece in pieces:
            waiting += piece
            *whole, waiting = waiting.splitlines(keepends=True) or [""]
            if waiting.endswith(("\n", "\u2029")):
                whole, waiting = [*whole, waiting], ""
            yield from filter(self._wanted, whole)
            if len(waiting) > LONGEST_PARAGRAPH:
                raise DataError(
                    f"a paragraph is longer than {LONGEST_PARAGRAPH} code points: "
                    "build without --skip-duplicates paragraph"
                )
        if waiting and self._wanted(waiting):
            yield waiting

    def _wanted(self, paragraph: str) -> bool:
        stripped = paragraph.strip()
        if len(stripped) < SHORTEST_PARAGRAPH:
            return True
        repeat = self._known(hashlib.blake2b(stripped.encode("utf-8", "surrogatepass"), digest_size=16).digest())
        self.paragraphs += repeat
        return not repeat

    def _known(self, digest: bytes) -> bool:
        if self._seen is None:
            raise DataError("no place to remember content hashes in")
        if not self._seen.add(digest):
            return True
        self._new.append(digest)
        return False

    def take_new(self) -> Met:
        """What was met since the last call, to be stored with the document that follows it."""
        met = Met(tuple(self._new), self.documents - self._told[0], self.paragraphs - self._told[1])
        self._new, self._told = [], (self.documents, self.paragraphs)
        return met
