"""What the words of running text are called in a layer: as far as that can be told without annotation."""

from __future__ import annotations

from collections.abc import Callable

from colloc.errors import UsageError
from colloc.settings import SegmentSettings
from colloc.tokens.folding import folder

PLAIN_LAYERS = ("form", "fold")
DICTIONARY_LAYERS = ("lemma", "lemma_fold")
"""For these a dictionary is needed."""

Calls = Callable[[str], str]


def layer_of_words(layer: str, settings: SegmentSettings) -> Calls:
    """From a word (NFC) to what the layer calls it, the same as a store with these settings has it.

    Raises
    ------
    UsageError
        Where running text has no such layer.
    MissingExtraError
        For lemmas without simplemma.
    """
    fold = folder(settings.folding)
    if layer in PLAIN_LAYERS:
        return fold if layer == "fold" else _itself
    if layer in DICTIONARY_LAYERS and settings.lemma is not None:
        from colloc.tokens.folding.lemmas import lemmatizer

        lemma = lemmatizer(settings.lemma)
        return (lambda word: fold(lemma(word))) if layer == "lemma_fold" else lemma
    if layer in DICTIONARY_LAYERS:
        raise UsageError(f"running text has the layer {layer} where the store was built with --lemma, which it was not")
    raise UsageError(
        f"running text has the layers {', '.join(PLAIN_LAYERS)}, and where the store was built with --lemma "
        f"{' and '.join(DICTIONARY_LAYERS)}; not {layer!r}"
    )


def layer_of_listed(layer: str, settings: SegmentSettings) -> Calls:
    """From a word of a listed expression to how the layer writes it: folded where the layer is."""
    return folder(settings.folding) if layer in ("fold", "lemma_fold") else _itself


def _itself(word: str) -> str:
    return word
