"""Writes ``unicode_classes.json``, the table of Unicode properties that segmentation reads.

Run it when the `regex` package brings a newer Unicode::

    python -m colloc.tokens.make_classes

Every code point gets one *kind*: its combination of Word_Break, Sentence_Break,
Extended_Pictographic and general category (L, N or other). The file lists the
kinds and the runs of code points that share one.
"""

from __future__ import annotations

import json
from pathlib import Path

import regex

# fmt: off
WORD_BREAK = [
    "Other", "CR", "LF", "Newline", "Extend", "ZWJ",
    "Format", "Regional_Indicator", "Katakana", "Hebrew_Letter", "ALetter", "Single_Quote",
    "Double_Quote", "MidNumLet", "MidLetter", "MidNum", "Numeric", "ExtendNumLet",
    "WSegSpace",
]
SENTENCE_BREAK = [
    "Other", "CR", "LF", "Extend", "Sep", "Format", "Sp", "Lower", "Upper",
    "OLetter", "Numeric", "ATerm", "SContinue", "STerm", "Close",
]
# fmt: on
UNICODE_VERSION = "17.0.0"
"""The version of the `regex` release (2026.11.19) that the committed table was made with."""

_CODE_POINTS = 0x110000


def _property(patterns: dict[str, str], everything: str) -> list[str]:
    """The name whose pattern matches, for each code point; "Other" where none does."""
    values = ["Other"] * _CODE_POINTS
    for name, pattern in patterns.items():
        for found in regex.finditer(pattern, everything):
            values[found.start()] = name
    return values


def make_table() -> dict[str, object]:
    """The content of ``unicode_classes.json`` as the installed `regex` package knows it."""
    everything = "".join(map(chr, range(_CODE_POINTS)))
    word = _property({name: rf"\p{{WB={name}}}" for name in WORD_BREAK if name != "Other"}, everything)
    sentence = _property({name: rf"\p{{SB={name}}}" for name in SENTENCE_BREAK if name != "Other"}, everything)
    pictographic = _property({"pictographic": r"\p{Extended_Pictographic}"}, everything)
    category = _property({"L": r"\p{L}", "N": r"\p{N}"}, everything)
    kinds: dict[tuple[str, str, bool, str], int] = {}
    starts: list[int] = []
    runs: list[int] = []
    for point in range(_CODE_POINTS):
        kind = (word[point], sentence[point], pictographic[point] == "pictographic", category[point])
        number = kinds.setdefault(kind, len(kinds))
        if not runs or runs[-1] != number:
            starts.append(point)
            runs.append(number)
    return {"unicode": UNICODE_VERSION, "kinds": [list(kind) for kind in kinds], "starts": starts, "runs": runs}


if __name__ == "__main__":
    target = Path(__file__).with_name("unicode_classes.json")
    target.write_text(json.dumps(make_table(), separators=(",", ":")) + "\n", encoding="utf-8")
