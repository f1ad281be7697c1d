"""What a user may look for: a word, a phrase, or words with ``*`` in them."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from colloc.answers.spelling import not_seen
from colloc.errors import NotSeenError, UsageError
from colloc.records import Int64Array, UInt32Array
from colloc.settings import SegmentSettings
from colloc.store import facts, vocabulary
from colloc.store.connection import Store
from colloc.tokens.segmenter import Segmenter

MOST_PARTS = 30
"""Words of a search together; each takes one bit of a mask."""
_PLAIN_LAYERS = ("form", "fold")


@dataclass(frozen=True, slots=True)
class Search:
    """One or two expressions as bits of a mask over the types of a store.

    Attributes
    ----------
    masks : uint32 array, shape (n_types,)
        Bit j is set where the type fits part j; the parts of the second expression follow those of the first.
    lengths : tuple of int
        Words of each expression.
    """

    masks: UInt32Array
    lengths: tuple[int, ...]

    def types_of(self, part: int) -> Int64Array:
        """Types that fit one part, ascending."""
        return np.flatnonzero(self.masks & np.uint32(1 << part))


def segment_settings(store: Store) -> SegmentSettings:
    """How the store's text was segmented."""
    return SegmentSettings.from_json(facts.get(store, "segment_settings"))


def versions(store: Store) -> dict[str, str]:
    """Versions of what made the store, by name."""
    found: dict[str, str] = json.loads(facts.get(store, "versions", "{}"))
    return found


def parts_of(store: Store, layer: str, expression: str) -> list[str]:
    """The words of an expression, as the store's segmenter divides it; those with ``*``, and known words, stay whole.

    Raises
    ------
    UsageError
        Where no word is in it.
    """
    parts = [part for parts in divided(store, layer, expression.split()) for part in parts]
    if not parts:
        raise UsageError(f"{expression!r} holds no word: look for a word, several words, or words with * in them")
    return parts


def divided(store: Store, layer: str, pieces: Sequence[str]) -> list[list[str]]:
    """The words in each piece of text without spaces; as in `parts_of`, but a piece may hold none."""
    segmenter = Segmenter(segment_settings(store))
    known = vocabulary.term_numbers(store, layer, list(pieces)) >= 0
    parts: list[list[str]] = []
    for piece, there in zip(pieces, known.tolist(), strict=True):
        # words of annotated text ('s, n't, a comma) are what their annotation says, not what a segmenter makes of them
        if there or "*" in piece or layer not in _PLAIN_LAYERS:
            parts.append([piece])
            continue
        found = segmenter.segment(piece)
        parts.append([piece[start:end] for start, end in zip(found.starts.tolist(), found.ends.tolist(), strict=True)])
    return parts


def prepare(store: Store, layer: str, expressions: Sequence[str]) -> Search:
    """Look the words of one or two expressions up.

    Raises
    ------
    NotSeenError
        When a part fits no word of the layer; the message names the nearest help.
    UsageError
        For an empty expression, or too many words.
    """
    divided = [parts_of(store, layer, expression) for expression in expressions]
    if sum(map(len, divided)) > MOST_PARTS:
        raise UsageError(f"at most {MOST_PARTS} words can be looked for at once")
    of_type = vocabulary.layer_map(store, layer)
    n_terms = vocabulary.term_count(store, layer)
    bits = np.zeros(n_terms + 1, np.uint32)
    for bit, part in enumerate(part for parts in divided for part in parts):
        bits[_terms(store, layer, part)] |= np.uint32(1 << bit)
    # Types outside the layer have the largest number as their term: the last place, where no bit is.
    return Search(bits[np.minimum(of_type, n_terms)], tuple(map(len, divided)))


def _terms(store: Store, layer: str, part: str) -> Int64Array:
    if "*" in part:
        found = vocabulary.terms_matching(store, layer, part)
        if not len(found):
            raise NotSeenError(f"{store.path}: no word of layer {layer!r} fits {part!r}; * stands for any characters")
        return found
    number = vocabulary.term_numbers(store, layer, [part])
    if number[0] < 0:
        raise NotSeenError(not_seen(store, layer, part))
    return number
