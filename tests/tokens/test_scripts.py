"""Words of scripts without spaces, hashtags and marks.

The dictionaries are ICU's: what is tested is that its words come back at their
places, and that everything else stays as it is without them.
"""

from __future__ import annotations

import random
import sys
from typing import Any

import pytest
from icu4py.breakers import WordBreaker

from colloc.errors import MissingExtraError
from colloc.settings import SegmentSettings
from colloc.tokens.segmenter import Segmenter

pytestmark = pytest.mark.usefixtures("both_ways")


def words(text: str, **options: Any) -> list[str]:
    segments = Segmenter(SegmentSettings(**options)).segment(text)
    return [text[start:end] for start, end in zip(segments.starts.tolist(), segments.ends.tolist(), strict=True)]


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("東京の灯台は美しい。", "東京 の 灯台 は 美しい"),
        ("我们在港口喝浓茶，吃新鲜的面包。", "我们 在 港口 喝 浓 茶 吃 新鲜 的 面包"),
        ("ฉันดื่มชาที่ท่าเรือ", "ฉัน ดื่ม ชา ที่ ท่าเรือ"),
        ("ខ្ញុំផឹកតែនៅកំពង់ផែ", "ខ្ញុំ ផឹក តែ នៅ កំពង់ផែ"),
        ("ຂ້ອຍດື່ມຊາຢູ່ທ່າເຮືອ", "ຂ້ອຍ ດື່ມ ຊາ ຢູ່ ທ່າເຮືອ"),
        ("2014年にLinuxカーネルを😀東京で", "2014 年 に Linux カーネル を 東京 で"),
        ("か\u3099 tea-time http://港.jp/茶 お茶", "か\u3099 tea-time http://港.jp/茶 お茶"),
    ],
)
def test_words_by_dictionary(text: str, expected: str) -> None:
    """Word divisions of simple sentences, as speakers of the languages write them in dictionaries (from memory)."""
    assert words(text, scripts="dictionary") == expected.split(" ")


def test_without_dictionaries_characters_are_words() -> None:
    """UAX #29 as it stands: ideographs and hiragana by themselves, katakana together."""
    assert words("東京のカーネル") == ["東", "京", "の", "カーネル"]


RUNS = ("東京の灯台", "ภาษาไทยง่าย", "私はお茶を飲む", "面包和茶", "ພາສາລາວ", "カタカナ")
OTHERS = ("tea", " ", ", ", "—", "2014", "😀", "well-kept", "\n", "שלום", "#", "é\u0301", "x_", "。")


def test_whatever_stands_between_runs_stays() -> None:
    """Brute force: ICU asked for each run by itself, the default rules for everything else."""
    chance = random.Random(6)
    for _ in range(300):
        parts: list[tuple[str, bool]] = []
        for _ in range(chance.randrange(1, 12)):
            run = chance.random() < 0.5 and not (parts and parts[-1][1])
            parts.append((chance.choice(RUNS if run else OTHERS), run))
        text = "".join(part for part, _ in parts)
        expected = []
        plain = ""
        for part, run in [*parts, ("", True)]:
            if run:
                # A run divides what stands on its two sides.
                expected += words(plain)
                expected += [word for word in WordBreaker(part, "en") if any(map(str.isalnum, word))] if part else []
                plain = ""
            else:
                plain += part
        assert words(text, scripts="dictionary") == expected, text


def test_sentences_and_offsets_stay() -> None:
    text = "東京へ行く。お茶を飲む。"
    segments = Segmenter(SegmentSettings(scripts="dictionary")).segment(text)
    assert [text[segments.starts[token] : segments.ends[token]] for token in segments.sentences] == ["東京", "お茶"]


def test_without_the_library(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "icu4py.breakers", None)
    with pytest.raises(MissingExtraError, match=r"pip install 'colloc\[scripts\]'"):
        Segmenter(SegmentSettings(scripts="dictionary"))


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("Strong #tea_time (@keeper), #1 and C#.", "Strong #tea_time @keeper 1 and C"),
        ("#灯台 ＃灯台 ##tea @", "#灯台 ＃灯台 #tea"),
        ("a@b.org http://x.y/#tea a#b #well-kept", "a@b.org http://x.y/#tea a b #well kept"),
        ("#été2014 @x", "#été2014 @x"),
    ],
)
def test_hashtags_and_names(text: str, expected: str) -> None:
    assert words(text, hashtags="keep") == expected.split(" ")
    assert "#" not in "".join(words(text.replace("http://x.y/#tea", ""), hashtags="split"))


def test_marks_as_tokens() -> None:
    text = 'He said: "no"... 3 € (well-kept) 👍👍!?'
    kept = words(text, punctuation="keep")
    assert kept == ["He", "said", ":", '"', "no", '"', "...", "3", "€", "(", "well-kept", ")", "👍👍", "!", "?"]
    assert [word for word in kept if any(map(str.isalnum, word))] == words(text)


def test_options_that_came_later_leave_older_stores_as_they_were() -> None:
    """Settings are compared as text: what is not chosen is not written."""
    assert not {"scripts", "hashtags", "punctuation", "folding", "lemma"} & set(SegmentSettings().to_json().split('"'))
    chosen = SegmentSettings(scripts="dictionary", folding=("width",), lemma="en")
    assert SegmentSettings.from_json(chosen.to_json()) == chosen
