"""Folding and its additions.

Sources: the Unicode Character Database as Python's ``unicodedata`` and
``str.casefold`` have it; words beside their folded forms are common spellings
of the languages, from memory.
"""

from __future__ import annotations

import unicodedata

import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.errors import UsageError
from colloc.tokens.folding import fold, folder
from colloc.tokens.folding.additions import ADDITIONS

SPELLINGS = [
    ("apostrophes", "Don’t don't O‘Clock м\u02bcята ‛tis", "don't don't o'clock м'ята 'tis"),
    ("arabic", "مُحَمَّدٌ", "محمد"),
    ("arabic", "الإســـلام", "الاسلام"),
    ("arabic", "آثار أثر ٱلله", "اثار اثر الله"),
    ("arabic", "مدرسة على", "مدرسه علي"),
    ("arabic", "مؤمن شئ", "مؤمن شئ"),
    ("hebrew", "שָׁלוֹם", "שלום"),
    ("hebrew", "צה״ל צ׳ק", "צה\"ל צ'ק"),
    ("hebrew", "\ufb2a", "ש"),
    ("indic", "चाँद क़लम", "चांद कलम"),
    ("indic", "क्\u200dष", "क्ष"),
    ("lithuanian", "i\u0307\u0300 Ì", "ì ì"),
    ("persian", "كتاب علي", "کتاب علی"),
    ("persian", "می\u200cرود", "میرود"),
    ("russian", "Ёлка за́мок чай йод", "елка замок чай йод"),
    ("sharp-s", "Maße MASSE STRAẞE ẞ", "maße masse straße ß"),
    ("turkish", "IŞIK İstanbul DIŞ i ı", "ışık istanbul dış i ı"),
    ("vietnamese", "hòa hoà HÒA thúy khỏe", "hòa hoà hòa thúy khoẻ"),
    ("width", "ＡＢＣ ｶﾞｷﾞ ﾡ １２", "abc ガギ ㄱ 12"),
]


@pytest.mark.parametrize(("name", "text", "folded"), SPELLINGS)
def test_spellings(name: str, text: str, folded: str) -> None:
    # Word by word, as types are folded; Vietnamese tones move at the end of a word only.
    words = [folder((name,))(word) for word in text.split(" ")]
    if name == "vietnamese":
        assert words == ["hoà", "hoà", "hoà", "thuý", "khoẻ"]
    else:
        assert " ".join(words) == unicodedata.normalize("NFC", folded)


def test_vietnamese_leaves_other_syllables() -> None:
    unmoved = ["hoàng", "quý", "của", "mía", "toán", "thuế"]
    assert [folder(("vietnamese",))(word) for word in unmoved] == unmoved


def test_none_is_plain_folding() -> None:
    assert folder(()) is fold
    assert fold("STRASSE Straße ΣΊΣΥΦΟΣ") == "strasse strasse σίσυφοσ"


def test_several_together() -> None:
    both = folder(("width", "turkish"))
    assert both("ＩŞIK") == "ışık"
    assert both is folder(("width", "turkish"))


def test_unknown_name() -> None:
    with pytest.raises(UsageError, match="unknown folding 'klingon': choose from apostrophes, arabic, hebrew"):
        folder(("klingon",))


LETTERS = "".join(text + folded for _, text, folded in SPELLINGS)
texts = st.text(st.sampled_from(LETTERS + "\u0300\u0301\u0307\u0323ßẞéÅ") | st.characters(exclude_categories=["Cs"]))


@given(st.sampled_from(sorted(ADDITIONS)), texts)
def test_canonically_equivalent_texts_fold_alike(name: str, text: str) -> None:
    folds = folder((name,))
    folded = folds(text)
    assert folds(unicodedata.normalize("NFD", text)) == folds(unicodedata.normalize("NFC", text)) == folded
    assert unicodedata.is_normalized("NFC", folded)


@given(texts)
def test_width_is_compatibility_normalisation_within_its_blocks(text: str) -> None:
    wide = "".join(
        unicodedata.normalize("NFKC", character)
        if "\uff00" <= character <= "\uffef" or character == "\u3000"
        else character
        for character in text
    )
    # NFKC goes one step further for halfwidth jamo: from the compatibility letter to the conjoining one.
    assert unicodedata.normalize("NFKC", folder(("width",))(text)) == unicodedata.normalize("NFKC", fold(wide))


def test_turkish_is_the_t_mapping_of_case_folding() -> None:
    """CaseFolding.txt has exactly two lines of status T: 0049 -> 0131, 0130 -> 0069."""
    turkish = folder(("turkish",))
    for code in range(0x41, 0x2000):
        character = chr(code)
        expected = {"I": "ı", "İ": "i"}.get(character, fold(character))
        assert turkish(character) == expected
