"""Plain text out of marked-up text: white space as a page shows it, paragraphs divided by blank lines."""

from __future__ import annotations

import re

_SPACES = re.compile(r"[ \t\n\r\f]{2,}|[\t\n\r\f]")
"""White space that is not one space already."""
PARAGRAPH_END = "\n\n"
"""Ends a paragraph in every setting of the segmenter."""
SOFT_HYPHEN = "\u00ad"
"""Says where a word may be divided; no part of the word."""


class Flow:
    """Collects text as it comes; a run of white space is one space, and none at the ends of a paragraph."""

    def __init__(self) -> None:
        self._parts: list[str] = []
        self._space = False
        """A space is due if more text of the paragraph comes."""
        self._inside = False
        """Whether the paragraph has text yet."""
        self._begun = False
        """Whether anything was written yet."""

    def text(self, data: str) -> None:
        """Text of the paragraph that is going on."""
        data = data.replace(SOFT_HYPHEN, "")
        plain = _SPACES.sub(" ", data)
        if not plain:
            return
        if plain == " ":
            self._space = True
            return
        self._lead(plain[0] == " ")
        self._parts.append(plain.strip(" "))
        self._space = plain[-1] == " "

    def verbatim(self, data: str) -> None:
        """Text whose spaces and line ends stay."""
        data = data.replace(SOFT_HYPHEN, "").replace("\r\n", "\n")
        if data:
            self._lead(False)
            self._parts.append(data)

    def _lead(self, space: bool) -> None:
        if self._inside:
            if self._space or space:
                self._parts.append(" ")
        elif self._begun:
            self._parts.append(PARAGRAPH_END)
        self._inside = self._begun = True
        self._space = False

    def space(self) -> None:
        """What parts words without ending the paragraph."""
        self._space = True

    def end_paragraph(self) -> None:
        """The paragraph ends here, if it has begun."""
        self._inside = self._space = False

    def take(self) -> str:
        """What has been collected since the last call."""
        taken = "".join(self._parts)
        self._parts.clear()
        return taken
