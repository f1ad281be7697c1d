"""Text for the tests of this folder: strategies that reach every class, and prose in many scripts."""

from __future__ import annotations

import gzip
import json
import os
from pathlib import Path

from hypothesis import strategies as st

from tests.tokens import slow_rules

# At least one character of each pair of Word_Break and Sentence_Break values, of each
# general category that matters, inside and outside of Latin-1 and of the basic plane.
CHARACTERS = (
    "aZ0 \t\n\r\v\x0b\x0c\x85\u2028\u2029\u3000.?!,;:'\"()-_@/&\u00a0\u00ad\u00b2\u00df\u00e9\u00aa\u00b7"
    "\u2018\u2019\u201c"
    "\u2010\u2011\u2013\u2014\u2024\u2026\u203f\u202f\u200b\u200c\u200d\u200e\u0300\u0308\u0903\u0345\u02c2\u02d7\u037e\u0589"
    "\u05d0\u05d1\u05f3\u05f4\u0600\u0623\u0660\u066b\u066c\u070f\u0e01\u0e31\u1100\uac00\u3042\u30a2\u30a3\u30fc\uff9e\uff9f"
    "\uff71\u3031\u4e00\u3007\u3002\uff0c\uff0e\uff0d\ufe13\ufe14\ufeff\u2060\u2139\u24c2\u24d0\u2160\u2170\u2180\u2701\u2764"
    "\u231a\u203c\u2049\U0001f1e6\U0001f1e7\U0001f468\U0001f6d1\U0001f3fb\U0001f170\U0001d400\U00010400\U0001f6cb"
    "\U00020000\U000e0001\U000e0020\U0001e900\ud800"
)
ASCII = "aaabBC01 .,:;'?!-_()\"\n\r\t"
WORDS = [
    *[
        "the ",
        "The ",
        "ship",
        "Dr. ",
        "e.g. ",
        "No. ",
        "5 ",
        "3.14",
        "it's",
        "x-y",
        " -- ",
        "\n\n",
        "\r\n",
        ". ",
        "? ",
        "etc.) ",
    ],
    *[
        "http://a.b/c.D?e ",
        "www.x.org",
        "me@x.org ",
        "J. R. ",
        "Stop.\u201d ",
        "\u00ad",
        "e\u0301",
        "日本。",
        'שׁ"ל',
        "Ende.\n",
    ],
]

any_class = st.text(st.sampled_from(CHARACTERS), max_size=24)
plain = st.text(st.sampled_from(ASCII), max_size=40)
prose = st.lists(st.sampled_from(WORDS), max_size=14).map("".join)
mixed = st.lists(st.one_of(any_class, plain, prose), max_size=4).map("".join)

# Article 1 of the Universal Declaration of Human Rights in thirteen languages (United Nations, public
# domain), with additions of our own: quotation marks, numbers, emoji.
DECLARATION: dict[str, str] = json.loads(Path(__file__).with_name("declaration.json").read_text(encoding="utf-8"))


def real_texts() -> list[str]:
    """The declaration, and the beginnings of the open data where COLLOC_DATA names their folder."""
    texts = list(DECLARATION.values())
    texts.append("\n".join(texts))
    folder = os.environ.get("COLLOC_DATA")
    if folder:
        for path in sorted(Path(folder).glob("*.jsonl.gz")):
            with gzip.open(path, "rt", encoding="utf-8") as lines:
                texts.append(json.loads(next(lines))["text"][:60_000])
    return texts


def all_classes_are_reached() -> set[str]:
    """What ``CHARACTERS`` leaves out; the empty set when the strategies do their work."""
    words = set(slow_rules.WORD_BREAK) - {slow_rules.word_class(character) for character in CHARACTERS}
    sentences = set(slow_rules.SENTENCE_BREAK.values()) - {slow_rules.sentence_class(c) for c in CHARACTERS}
    return words | sentences
