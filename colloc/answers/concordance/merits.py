"""What makes a sentence a good example: our own scoring, in points.

A perfect example has about 0 points and every fault takes some away (no single source: common advice of
dictionary makers, weighed by reading real text; a test holds it against judged pairs of sentences).

===============  ==========================================================================================
length           0.12 for each word below 8, 0.05 for each above 20
common words     1.5 times (1 - mean commonness); a word met 1,000 times in a million has commonness 1, one
                 met once 0.1, on a logarithmic scale: log10(1 + rate) / 3; the words searched do not count
backward looks   1.0 where it begins with a word that points back (*he*, *this*, *then*, *but*), and 1.5
                 times the share of such pronouns within; the list is English, other languages lose nothing
fragment         1.5 where it does not begin with a capital (or a letter without case), 1.5 where it does not
                 end with terminal punctuation
open marks       0.7 where a bracket or quotation mark is opened and not closed, or closed and not opened
speech           0.5 where it begins or ends with a quotation mark: a reply needs what it replies to
names            2.0 times the share of words with a capital inside the sentence (all-capital lines lose all)
numbers          1.5 times the share of words that hold a digit
lists            4.0 times the share of commas and semicolons above one for eight words
===============  ==========================================================================================
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from colloc.records import FloatArray

SHORTEST, LONGEST = 8, 20
TERMINALS = frozenset(".!?…。！？．｡؟۔։।॥။።")
"""Marks that end a sentence in scripts in wide use (a selection of Unicode's Sentence_Terminal)."""
_CLOSERS = frozenset("\"'”’»›)]}」』】〉》）」*_")
_QUOTES = frozenset(("'", '"', "‘", "’", "“", "”", "«", "»", "„", "‚", "「", "」", "『", "』", "‹", "›"))
_PAIRS = {"(": ")", "[": "]", "{": "}", "“": "”", "«": "»", "「": "」", "『": "』", "（": "）"}
_STRAIGHT = '"'

POINTING = frozenset(
    (
        "he",
        "she",
        "it",
        "they",
        "him",
        "her",
        "them",
        "his",
        "hers",
        "its",
        "their",
        "theirs",
        "this",
        "that",
        "these",
        "those",
        "such",
        "here",
        "there",
    )
)
"""English words that mostly stand for something said before."""
BACKWARD = POINTING | frozenset(
    (
        "and",
        "but",
        "or",
        "nor",
        "so",
        "then",
        "thus",
        "therefore",
        "hence",
        "however",
        "moreover",
        "besides",
        "otherwise",
        "also",
        "yet",
        "still",
        "too",
    )
)
"""English words that join a sentence to the one before when it begins with them."""


def length_points(n_words: int) -> float:
    """Points lost for a sentence of so many words; 0 or less."""
    return -0.12 * max(SHORTEST - n_words, 0) - 0.05 * max(n_words - LONGEST, 0)


def commonness(per_million: FloatArray) -> FloatArray:
    """0 for a word that is never met, 1 for one met a thousand times in a million, or more often."""
    return np.minimum(np.log10(1.0 + per_million) / 3.0, 1.0)


def common_points(common: FloatArray) -> float:
    """Points lost for rare words; ``common`` are the commonness values of the words around the pair."""
    return -1.5 * (1.0 - float(common.mean())) if len(common) else -1.5


def backward_points(words: Sequence[str]) -> float:
    """Points lost for words that point back; ``words`` are folded."""
    if not words:
        return 0.0
    pointing = sum(word in POINTING for word in words[1:])
    return -1.0 * (words[0] in BACKWARD) - 1.5 * pointing / len(words)


def text_points(text: str, words: Sequence[str]) -> float:
    """Points lost for what only the text shows: fragments, open marks, names, numbers, lists.

    Parameters
    ----------
    text : str
        The sentence with its marks.
    words : sequence of str
        Its tokens as they are written.
    """
    stripped = text.strip()
    letters = [character for character in stripped if character.isalpha()]
    points = 0.0
    if not letters or letters[0].islower() or _begins_inside(stripped):
        points -= 1.5
    last = len(stripped)
    while last and stripped[last - 1] in _CLOSERS:
        last -= 1
    if not last or stripped[last - 1] not in TERMINALS:
        points -= 1.5
    opened, closed = stripped[:1] in _QUOTES, stripped[-1:] in _QUOTES
    points -= 0.5 * (opened or closed)
    if not _balanced(stripped) or opened != closed:
        points -= 0.7
    inner = words[1:]
    if inner:
        # "I" is no name; it is the one English word that is always written large.
        points -= 2.0 * sum(word[0].isupper() and word != "I" for word in inner) / len(inner)
    if words:
        points -= 1.5 * sum(any(map(str.isdigit, word)) for word in words) / len(words)
        marks = sum(stripped.count(mark) for mark in ",;、，؛،")
        points -= 4.0 * max(marks / len(words) - 1 / 8, 0.0)
    return points


def _begins_inside(text: str) -> bool:
    """Whether a sentence starts with a mark that belongs to the end of the one before it."""
    return bool(text) and text[0] in ",;:)]}」』）—–-…"


def _balanced(text: str) -> bool:
    if text.count(_STRAIGHT) % 2:
        return False
    closing: list[str] = []
    for character in text:
        if character in _PAIRS:
            closing.append(_PAIRS[character])
        elif character in _PAIRS.values() and (not closing or closing.pop() != character):
            return False
    return not closing
