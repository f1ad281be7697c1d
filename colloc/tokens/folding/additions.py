"""Additions to case folding for single languages and scripts, each an option.

Sources: Unicode Character Database (CaseFolding.txt, status T; SpecialCasing.txt,
lt; names and decompositions of the characters). The letters that are taken for
one another in Arabic follow Larkey, Ballesteros and Connell, "Improving
stemming for Arabic information retrieval" (SIGIR 2002), those of Hindi Larkey,
Connell and Abduljaleel, "Hindi CLIR in thirty days" (TALIP 2003), both from
memory; Persian, Hebrew, Russian and Vietnamese follow common practice of their
spelling, no single source.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cache

Change = Callable[[str], str]


@dataclass(frozen=True, slots=True)
class Addition:
    """One addition: what it does, and how. A text comes in NFC."""

    says: str
    before: Change | None = None
    """Before case folding."""
    after: Change | None = None
    """After it."""
    apart: str = ""
    """Letters whose case is folded by hand: the first one stands for all of them."""


def _translation(letters: Mapping[str, str], dropped: str = "") -> Change:
    """Letters put for others; ``dropped`` lists characters and ranges (``a-b``) that go."""
    table: dict[int, str | None] = {ord(letter): other for letter, other in letters.items()}
    for part in dropped.split():
        first, _, last = part.partition("-")
        table.update(dict.fromkeys(range(int(first, 16), int(last or first, 16) + 1)))
    return lambda text: text.translate(table)


_VOWEL_SIGNS = "0610-061A 064B-065F 0670 06D6-06DC 06DF-06E4 06E7-06E8 06EA-06ED 08D3-08FF 0640"
"""Arabic: signs above and below letters, and the stroke that stretches words."""
_JOINERS = "200C 200D"


@cache
def _width_table() -> dict[int, str]:
    # Full- and halfwidth forms lie in two blocks, the ideographic space apart: UCD, decomposition <wide>, <narrow>.
    found = {}
    for code in (0x3000, *range(0xFF00, 0xFFF0)):
        decomposition = unicodedata.decomposition(chr(code))
        if decomposition.startswith(("<wide>", "<narrow>")):
            found[code] = chr(int(decomposition.split()[1], 16))
    return found


_SPACING_TONES = "\u0300\u0301\u0303\u0309\u0323"
_OLD_PLACEMENT = re.compile(rf"(o)([{_SPACING_TONES}])([ae])$|(?<!q)(u)([{_SPACING_TONES}])(y)$", re.IGNORECASE)
_LITHUANIAN_DOT = re.compile("([ij\u012f])\u0307(?=[\u0300\u0301\u0303])")


def _vietnamese(text: str) -> str:
    """hòa as hoà: the tone mark over the second vowel of an open syllable."""
    moved = _OLD_PLACEMENT.sub(
        lambda found: "".join(filter(None, (found[1] or found[4], found[3] or found[6], found[2] or found[5]))),
        unicodedata.normalize("NFD", text),
    )
    return unicodedata.normalize("NFC", moved)


def _lithuanian(text: str) -> str:
    """The dot that stays over i below an accent (i̇́) goes."""
    return _LITHUANIAN_DOT.sub(r"\1", unicodedata.normalize("NFD", text).replace("i\u0328\u0307", "i\u0307\u0328"))


_STRESS = re.compile("(?<=[аеиоуыэюя])[\u0300\u0301]+")


def _russian(text: str) -> str:
    return _STRESS.sub("", unicodedata.normalize("NFD", text.replace("\u0451", "\u0435")))


_INDIC = _translation(
    {chr(block + 1): chr(block + 2) for block in range(0x0900, 0x0D00, 0x80)},
    f"{_JOINERS} 093C 09BC 0A3C 0ABC 0B3C 0CBC",
)
"""The blocks of the Indic scripts are laid out alike: candrabindu comes first, anusvara second."""


ADDITIONS: Mapping[str, Addition] = {
    "width": Addition(
        "fullwidth and halfwidth forms are the ordinary ones (ＡＢＣ, ｶﾀｶﾅ, ﾡ)",
        before=lambda text: unicodedata.normalize("NFC", text.translate(_width_table())),
    ),
    "apostrophes": Addition(
        "curly apostrophes and the letter apostrophe are straight ones: don’t is don't",
        after=_translation(dict.fromkeys("\u2018\u2019\u201b\u02bc", "'")),
    ),
    "arabic": Addition(
        "vowel signs and tatweel go; alef with hamza or madda is alef, alef maksura is yeh, teh marbuta is heh",
        after=_translation(
            {"\u0622": "\u0627", "\u0623": "\u0627", "\u0625": "\u0627", "\u0671": "\u0627"}
            | {"\u0649": "\u064a", "\u0629": "\u0647"},
            _VOWEL_SIGNS,
        ),
    ),
    "hebrew": Addition(
        "points and cantillation marks go; geresh is an apostrophe, gershayim a quotation mark; ligatures are letters",
        after=_translation(
            {"\u05f3": "'", "\u05f4": '"', "\u2019": "'", "\u05f0": "וו", "\u05f1": "וי", "\u05f2": "יי"},
            "0591-05BD 05BF 05C1-05C2 05C4-05C5 05C7",
        ),
    ),
    "indic": Addition(
        "joiners and nukta go, candrabindu is anusvara",
        after=lambda text: _INDIC(unicodedata.normalize("NFD", text)),
    ),
    "lithuanian": Addition("the dot of i and j below an accent goes", before=_lithuanian),
    "persian": Addition(
        "vowel signs, tatweel and the zero-width non-joiner go; Arabic yeh and kaf are the Persian ones, heh with yeh "
        "is heh",
        after=_translation(
            {"\u064a": "\u06cc", "\u0649": "\u06cc", "\u0643": "\u06a9", "\u06c0": "\u0647", "\u0629": "\u0647"},
            f"{_VOWEL_SIGNS} {_JOINERS}",
        ),
    ),
    "russian": Addition("ё is е; stress marks go", after=_russian),
    "sharp-s": Addition("ß stays apart from ss (ẞ is ß)", apart="ßẞ"),
    "turkish": Addition(
        "I is the capital of ı, İ that of i (Turkish, Azerbaijani)",
        before=_translation({"I": "ı", "İ": "i"}),
    ),
    "vietnamese": Addition(
        "tone marks stand where the newer spelling has them: hòa is hoà, thúy is thuý", after=_vietnamese
    ),
}
"""By name, as the option and the store have it; several act in this order."""
