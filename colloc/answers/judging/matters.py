"""What a decision is about: a pair or an expression, named by its words."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass

from colloc.answers.concordance.matching import parts_of
from colloc.answers.questions import built_spec
from colloc.answers.spelling import not_seen
from colloc.errors import DataError, NotSeenError, UsageError
from colloc.store import vocabulary
from colloc.store.connection import Store
from colloc.store.decisions import Decision, Key, key_of
from colloc.store.decisions import Example as Example
from colloc.store.decisions import Kind as Kind
from colloc.store.decisions import Verdict as Verdict

OPEN = "*"
"""Stands for any one word in an expression; ``_``, which is no word either, is read as the same."""


@dataclass(frozen=True, slots=True)
class Matter:
    """One pair or expression; ``words`` in the order in which they are shown."""

    layer: str
    kind: Kind
    words: tuple[str, ...]

    @property
    def key(self) -> Key:
        """The form in which equal matters are equal."""
        return key_of(self.layer, self.kind, self.words)

    @property
    def text(self) -> str:
        """The words as people read them."""
        return " ".join(self.words)


def matter_of(decision: Decision) -> Matter:
    """What a decision is about."""
    return Matter(decision.layer, decision.kind, decision.words)


def make_matter(
    store: Store, words: Sequence[str], kind: Kind | None = None, layer: str | None = None, *, known: bool = True
) -> Matter:
    """The matter that somebody names.

    Parameters
    ----------
    words : sequence of str
        One text of several words is an expression, two texts are a pair, more an expression.
    kind : {"pair", "directed", "expression"}, optional
    layer : str, optional
        As the store was built when not given; words are brought to its form.
    known : bool
        Whether every word must be in the store.

    Raises
    ------
    NotSeenError
        For a word that the layer does not have.
    UsageError
        For an unknown layer, or too few words.
    """
    layer = layer or built_spec(store).layer
    if layer not in vocabulary.layer_names(store):
        raise UsageError(f"no layer {layer!r}: there are {', '.join(vocabulary.layer_names(store))}")
    parts = list(words)
    if len(parts) == 1:
        parts, kind = parts_of(store, layer, parts[0]), kind or "expression"
    if len(parts) < 2:
        raise UsageError("a decision is about two words or an expression: give X Y, or a quoted phrase")
    kind = kind or ("pair" if len(parts) == 2 else "expression")
    if kind != "expression" and len(parts) != 2:
        raise UsageError(f"a {kind} has two words, not {len(parts)}")
    parts = [OPEN if word in (OPEN, "_") else vocabulary.brought_to(store, layer, word) for word in parts]
    if kind != "expression" and OPEN in parts:
        raise UsageError("* is an open place of an expression; a pair has two words")
    closed = [word for word in parts if word != OPEN]
    if not closed:
        raise UsageError("an expression has at least one word that is not *")
    if known:
        numbers = vocabulary.term_numbers(store, layer, closed).tolist()
        for word, number in zip(closed, numbers, strict=True):
            if number < 0:
                raise NotSeenError(not_seen(store, layer, word))
    return Matter(layer, kind, tuple(parts))


def written_list(texts: Sequence[str], separator: str) -> str:
    """Texts in one cell: joined by the separator, or as a JSON array where that would not read back."""
    joined = separator.join(texts)
    return joined if _plain_list(joined, separator) == list(texts) else json.dumps(list(texts), ensure_ascii=False)


def read_list(cell: str, separator: str) -> list[str]:
    """What :func:`written_list` was given, or what a person wrote.

    Raises
    ------
    DataError
        For a cell that begins like a JSON array and is none.
    """
    if not cell.strip().startswith("["):
        return _plain_list(cell, separator)
    try:
        found = json.loads(cell)
    except ValueError as error:
        raise DataError(f"{cell!r} begins like a list and is none ({error})") from error
    if not all(isinstance(text, str) for text in found):
        raise DataError(f"{cell!r} must be a list of texts")
    return list(found)


def _plain_list(cell: str, separator: str) -> list[str]:
    if cell.startswith("["):
        return []
    return [part.strip() for part in cell.split(separator.strip() or None) if part.strip()]
