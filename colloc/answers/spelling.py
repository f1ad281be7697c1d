"""What is said of a word that a store does not know: the words it knows that are spelled much like it."""

from __future__ import annotations

import difflib
from collections.abc import Mapping, Sequence

import numpy as np

from colloc.counts.words import slice_word_counts
from colloc.store import vocabulary
from colloc.store.connection import Store

NAMED = 10
"""Unknown words that a message names."""
_CURLY = "\u2019"
_COMPARED = 5000
"""Candidates that are compared letter by letter, the most frequent: some hundredths of a second."""
_ALIKE = 0.75
"""Share of letters that two spellings have in common, in order (`difflib.SequenceMatcher.ratio`)."""


def near_spellings(store: Store, layer: str, word: str, most: int = 3) -> list[str]:
    """Words of a layer that are spelled like ``word``, nearest first.

    They begin with the same character and differ by at most two in length; where there are many such words, the
    most frequent are compared.
    """
    wanted = vocabulary.brought_to(store, layer, word)
    terms, texts = vocabulary.terms_of_shape(store, layer, wanted)
    if len(terms) > _COMPARED:
        tokens = slice_word_counts(store, layer, "").tokens[terms]
        chosen = np.sort(np.argsort(-tokens, kind="stable")[:_COMPARED]).tolist()
        texts = [texts[place] for place in chosen]
    return difflib.get_close_matches(wanted, texts, n=most, cutoff=_ALIKE)


def apostrophe_twins(store: Store) -> int:
    """How many folded words stand in a store with a curly apostrophe as well as with a straight one.

    None where its folding takes them for one (``apostrophes``), or where it has no layer ``fold``.
    """
    if "fold" not in vocabulary.layer_names(store) or vocabulary.brought_to(store, "fold", _CURLY) != _CURLY:
        return 0
    curly = vocabulary.term_texts(store, "fold", vocabulary.terms_matching(store, "fold", f"*{_CURLY}*"))
    straight = vocabulary.term_numbers(store, "fold", [text.replace(_CURLY, "'") for text in curly if text != _CURLY])
    return int(np.count_nonzero(straight >= 0))


def meant(near: Sequence[str]) -> str:
    """The question that names near spellings, empty where there are none.

    >>> meant(["fog", "frog", "fig"]), meant([])
    ("did you mean 'fog', 'frog' or 'fig'?", '')
    """
    if not near:
        return ""
    *others, last = map(repr, near)
    return f"did you mean {', '.join(others)}{' or ' if others else ''}{last}?"


def spelled_like(store: Store, layer: str, unknown: Sequence[str]) -> dict[str, list[str]]:
    """Near spellings of the first unknown words, those that have some."""
    near = {word: near_spellings(store, layer, word) for word in unknown[:NAMED]}
    return {word: found for word, found in near.items() if found}


def named_unknown(unknown: Sequence[str], near: Mapping[str, Sequence[str]]) -> list[str]:
    """The first unknown words for a message, each with what it may have meant.

    >>> named_unknown(["fogg", "x"], {"fogg": ["fog"]})
    ["'fogg' (did you mean 'fog'?)", "'x'"]
    """
    return [f"{word!r} ({meant(near[word])})" if word in near else repr(word) for word in unknown[:NAMED]]


def not_seen(store: Store, layer: str, word: str) -> str:
    """The message about a word that never occurs, with near spellings or the command that lists words."""
    begins = word[:3].replace("'", "")
    hint = meant(near_spellings(store, layer, word))
    listing = f"`colloc words {store.path} '{begins}*'` lists words that begin like it"
    return f"{store.path}: {word!r} never occurs in layer {layer!r}; {hint or listing}"
