"""How a store brings words to the same form: its folding, and where lemmas come from that words do not carry."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cache

from colloc.settings import SegmentSettings
from colloc.store import facts
from colloc.store.connection import Store
from colloc.tokens.folding import fold, folder


@dataclass(frozen=True, slots=True)
class Forms:
    """What a store was told when it was made.

    Attributes
    ----------
    fold : function
        From a form to its folded form.
    language : str or None
        Whose dictionary gives lemmas to words without.
    """

    fold: Callable[[str], str]
    language: str | None

    def folded(self, forms: Sequence[str]) -> list[str]:
        """Forms, folded."""
        if self.fold is fold:
            # Most words are of ASCII letters, and a call for each would take most of the time.
            return [form.lower() if form.isascii() else fold(form) for form in forms]
        return [*map(self.fold, forms)]

    def lemmas(self, forms: Sequence[str], given: Sequence[str]) -> list[str]:
        """Lemmas of some types: those that they carry, else those of the dictionary, else empty."""
        if self.language is None:
            return list(given)
        from colloc.tokens.folding.lemmas import lemmatizer

        lemma_of = lemmatizer(self.language)
        return [lemma or (lemma_of(form) if form else "") for form, lemma in zip(forms, given, strict=True)]


def store_forms(store: Store) -> Forms:
    """How this store does it."""
    return _forms(facts.get(store, "segment_settings", "{}"))


@cache
def _forms(settings: str) -> Forms:
    chosen = SegmentSettings.from_json(settings)
    return Forms(folder(chosen.folding), chosen.lemma)
