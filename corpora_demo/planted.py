"""What is planted on purpose: words and why, without numbers (those follow from the rules, `corpora_demo.truth`)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Kind = Literal["adjacent", "windowed", "avoided", "company"]


@dataclass(frozen=True)
class PlantedPair:
    """Two words and the way they come to stand together, or not."""

    kind: Kind
    first: str
    second: str
    made_by: str


PAIRS = (
    PlantedPair("adjacent", "thick", "fog", "most of the choices of rule FOG; 'thick' goes with two other nouns"),
    PlantedPair("adjacent", "dense", "fog", "a weaker choice of rule FOG"),
    PlantedPair("adjacent", "heavy", "swell", "most of the choices of rule SWELL; 'heavy' goes with other nouns too"),
    PlantedPair("adjacent", "heavy", "rain", "rule RAIN, a middling choice"),
    PlantedPair("adjacent", "heavy", "luggage", "rule LOAD, of the notices only"),
    PlantedPair("adjacent", "strong", "wind", "rule WIND; 'strong' goes with other nouns too"),
    PlantedPair("adjacent", "strong", "rope", "fixed in two rules of the logbooks"),
    PlantedPair("adjacent", "strong", "tea", "fixed in two rare rules of the logbooks"),
    PlantedPair("adjacent", "steam", "launch", "rule LAUNCH; 'steam' goes with two other nouns"),
    PlantedPair("adjacent", "light", "luggage", "rule LOAD; 'light' is an adjective and a noun"),
    PlantedPair("windowed", "trimmed", "wick", "rule TASK, with 'the', an adjective or 'the whole of' between"),
    PlantedPair("windowed", "polished", "lens", "rule TASK, a middling share of 'polished'"),
    PlantedPair("windowed", "wound", "clockwork", "rule TASK"),
    PlantedPair("windowed", "cleaned", "panes", "rule TASK, one choice of three"),
    PlantedPair("windowed", "horn", "fog", "one rule of the logbooks, three words between"),
    PlantedPair("avoided", "strong", "fog", "both frequent, in one sentence never: fog is 'thick'"),
    PlantedPair("avoided", "heavy", "breeze", "both frequent, in one sentence never: a breeze is 'light' or 'brisk'"),
    PlantedPair("avoided", "heavy", "fog", "rule FOG says it once in a hundred times"),
    PlantedPair("company", "brisk", "breeze", "'brisk' and 'swift' mean much the same"),
    PlantedPair("company", "brisk", "trade", "'brisk' and 'swift' mean much the same"),
    PlantedPair("company", "brisk", "pace", "the one noun that takes either, equally often"),
    PlantedPair("company", "swift", "pace", "the one noun that takes either, equally often"),
    PlantedPair("company", "swift", "tide", "'brisk' and 'swift' mean much the same"),
    PlantedPair("company", "swift", "current", "'brisk' and 'swift' mean much the same"),
    PlantedPair("company", "swift", "passage", "'brisk' and 'swift' mean much the same"),
)

EXPRESSIONS: tuple[tuple[str, str], ...] = (
    ("in the teeth of the gale", "teeth"),
    ("at the turn of the tide", "turn"),
    ("weather and other circumstances permitting", "circumstances"),
    ("with the utmost care and attention", "utmost"),
    ("until further notice", "notice"),
    ("to rights", "rights"),
)
"""Expressions, each with a word whose every occurrence in a sentence is counted as one of the expression.

The word 'notice' also opens notices and stands in 'notice board'; its count is therefore taken as the pair
'further notice'.
"""

DISCONTINUOUS: tuple[tuple[str, str, str], ...] = (
    ("keep ... in good order", "keep", "good"),
    ("kept ... in good order", "kept", "good"),
    ("put ... to rights", "put", "rights"),
)
"""Expression with a gap, its first word, and the first word after the gap that is not a preposition."""

WORD_DRIFTS: tuple[tuple[str, str, str], ...] = (("FUEL", "oil", "paraffin"), ("VESSEL", "packet", "steamer"))
"""Rule, the word that gives way, the word that takes its place."""

PAIR_DRIFTS: tuple[tuple[str, str, str, str], ...] = (
    ("steam", "launch", "second", "rises"),
    ("signal", "flags", "first", "falls"),
    ("signal", "lamps", "first", "rises"),
    ("thick", "fog", "second", "stays"),
)
"""Two adjacent words, the one that the yearly probability is conditional on, and the direction."""

GENRE_WORDS = ("we", "wind", "swell", "passengers", "company", "fog", "light")
GENRE_PAIRS = (("heavy", "swell"), ("heavy", "luggage"), ("light", "breeze"), ("light", "luggage"), ("thick", "fog"))

TOPIC_PAIRS = (
    ("birds", "gannets", "puffins"),
    ("garden", "potatoes", "hens"),
    ("livestock", "cattle", "lambs"),
    ("regatta", "oarsmen", "yachts"),
)
"""Topic and two of its words: they share documents but are drawn independently of each other."""

HABIT_PHRASE, HABIT_WORD = "by the good grace of the tide", "grace"
BURST_WORDS = ("green", "lamp")
"""The pair that the talkative document repeats; elsewhere they meet as any words of rules LOG_ADJ and LOG_NOUN do."""
