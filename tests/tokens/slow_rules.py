"""UAX #29 word and sentence boundaries straight from the rules, one position at a time.

Slow on purpose and independent of ``colloc``: the properties come from the `regex`
package, the rules from UAX #29 (Unicode 17.0), sections 4.1.1 and 5.1.
"""

from __future__ import annotations

import re
from functools import cache
from itertools import pairwise

import regex

WORD_BREAK = [
    *["CR", "LF", "Newline", "Extend", "ZWJ", "Format", "Regional_Indicator", "Katakana", "Hebrew_Letter", "ALetter"],
    *["Single_Quote", "Double_Quote", "MidNumLet", "MidLetter", "MidNum", "Numeric", "ExtendNumLet", "WSegSpace"],
]
# One letter for each Sentence_Break value, so that the rules can be written as patterns of letters.
SENTENCE_BREAK = dict(
    zip(
        "CR LF Sep Extend Format Sp Lower Upper OLetter Numeric ATerm SContinue STerm Close".split(),  # noqa: SIM905
        "rnpxf_lUONA,S)",
        strict=True,
    )
)
NEWLINES = ("CR", "LF", "Newline")
ATTACHED = ("Extend", "Format", "ZWJ")


@cache
def word_class(character: str) -> str:
    return next((name for name in WORD_BREAK if regex.match(rf"\p{{WB={name}}}", character)), "Other")


@cache
def sentence_class(character: str) -> str:
    found = (letter for name, letter in SENTENCE_BREAK.items() if regex.match(rf"\p{{SB={name}}}", character))
    return next(found, "o")


def base(classes: list[str], position: int) -> int:
    """WB4: the character that the one at `position` attaches to (itself where it attaches to none)."""
    while position > 0 and classes[position] in ATTACHED and classes[position - 1] not in NEWLINES:
        position -= 1
    return position


def _breaks_between(text: str, wb: list[str], i: int) -> bool:
    left, right = wb[i - 1], wb[i]
    if left == "CR" and right == "LF":  # WB3
        return False
    if left in NEWLINES or right in NEWLINES:  # WB3a, WB3b
        return True
    if left == "ZWJ" and regex.match(r"\p{Extended_Pictographic}", text[i]):  # WB3c
        return False
    if left == right == "WSegSpace":  # WB3d
        return False
    if right in ATTACHED:  # WB4
        return False
    before = base(wb, i - 1)
    left = wb[before]
    left2 = wb[base(wb, before - 1)] if before > 0 else ""
    after = i + 1
    while after < len(wb) and wb[after] in ATTACHED:
        after += 1
    right2 = wb[after] if after < len(wb) else ""
    letters = ("ALetter", "Hebrew_Letter")
    middle_letter = ("MidLetter", "MidNumLet", "Single_Quote")
    middle_number = ("MidNum", "MidNumLet", "Single_Quote")
    no_break = [
        left in letters and right in letters,  # WB5
        left in letters and right in middle_letter and right2 in letters,  # WB6
        left2 in letters and left in middle_letter and right in letters,  # WB7
        left == "Hebrew_Letter" and right == "Single_Quote",  # WB7a
        left == "Hebrew_Letter" and right == "Double_Quote" and right2 == "Hebrew_Letter",  # WB7b
        left2 == "Hebrew_Letter" and left == "Double_Quote" and right == "Hebrew_Letter",  # WB7c
        left == "Numeric" and right == "Numeric",  # WB8
        left in letters and right == "Numeric",  # WB9
        left == "Numeric" and right in letters,  # WB10
        left2 == "Numeric" and left in middle_number and right == "Numeric",  # WB11
        left == "Numeric" and right in middle_number and right2 == "Numeric",  # WB12
        left == "Katakana" and right == "Katakana",  # WB13
        left in (*letters, "Numeric", "Katakana", "ExtendNumLet") and right == "ExtendNumLet",  # WB13a
        left == "ExtendNumLet" and right in (*letters, "Numeric", "Katakana"),  # WB13b
    ]
    if any(no_break):
        return False
    if left == right == "Regional_Indicator":  # WB15, WB16
        run = 0
        while before >= 0 and wb[before] == "Regional_Indicator":
            run += 1
            before = base(wb, before - 1) if before > 0 else -1
        return run % 2 == 0
    return True  # WB999


def word_boundaries(text: str) -> list[int]:
    if not text:
        return []
    wb = [word_class(character) for character in text]
    return [0, *(i for i in range(1, len(text)) if _breaks_between(text, wb, i)), len(text)]


def sentence_boundaries(text: str) -> list[int]:
    if not text:
        return []
    sb = "".join(sentence_class(character) for character in text)
    result = [0]
    for i in range(1, len(text)):
        if sb[i - 1] == "r" and sb[i] == "n":  # SB3
            continue
        if sb[i - 1] in "rnp":  # SB4
            result.append(i)
            continue
        if sb[i] in "xf":  # SB5
            continue
        # SB5: what attaches to a character is passed over; after a separator it stands for itself.
        before = re.sub(r"(?<=[^rnp])[xf]+|(?<=[rnp][xf])[xf]+", "", sb[:i])
        after = re.sub(r"(?<=[^rnp])[xf]+|(?<=[rnp][xf])[xf]+", "", sb[i:])
        no_break = [
            re.search(r"A$", before) and re.match(r"N", after),  # SB6
            re.search(r"[Ul]A$", before) and re.match(r"U", after),  # SB7
            re.search(r"A\)*_*$", before) and re.match(r"[^OUlrnpSA]*l", after),  # SB8
            re.search(r"[SA]\)*_*$", before) and re.match(r"[,SA]", after),  # SB8a
            re.search(r"[SA]\)*$", before) and re.match(r"[)_rnp]", after),  # SB9
            re.search(r"[SA]\)*_*$", before) and re.match(r"[_rnp]", after),  # SB10
        ]
        if not any(no_break) and re.search(r"[SA]\)*_*[rnp]?$", before):  # SB11
            result.append(i)
    return [*result, len(text)]


def words(text: str, hyphens: bool = False) -> list[tuple[int, int]]:
    """Segments that hold a letter or digit; with `hyphens`, single ones between letters or digits join."""
    bounds = word_boundaries(text)
    if hyphens:
        wb = [word_class(character) for character in text]
        kept = [i for i in range(len(text)) if base(wb, i) == i]
        for left, middle, right in zip(kept, kept[1:], kept[2:], strict=False):
            if text[middle] in "-\u2010\u2011" and regex.match(r"[\p{L}\p{N}]{2}", text[left] + text[right]):
                bounds = [bound for bound in bounds if bound not in (middle, right)]
    spans = pairwise(bounds)
    return [(start, end) for start, end in spans if regex.search(r"[\p{L}\p{N}]", text[start:end])]


LINE_END = r"(?:\r\n|[\n\r\x85\u2028\u2029])"


def unwrapped(text: str) -> str:
    """The text with each line end that ends no paragraph made a space (CR LF: two spaces)."""
    single = rf"(?!\u2029){LINE_END}(?!\p{{SB=Sp}}*[\n\r\x85\u2028\u2029])"
    return regex.sub(rf"(?<!\r(?=\n)){single}", lambda found: " " * len(found[0]), text)


def first_tokens(starts: list[int], breaks: list[int]) -> list[int]:
    """Numbers of the tokens that come first at or after each break."""
    found = {next((number for number, start in enumerate(starts) if start >= place), len(starts)) for place in breaks}
    return sorted(found - {len(starts)})
