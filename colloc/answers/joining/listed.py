"""The expressions to join: those of a list, or those that people accepted in a store."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

from colloc.errors import DataError, UsageError
from colloc.store import decisions
from colloc.store.connection import Store


@dataclass(frozen=True, slots=True)
class Expression:
    """Words in a row.

    Attributes
    ----------
    words : tuple of str
        As the layer writes them; ``*`` stands for any one word.
    score : float
        Decides between overlapping expressions of the same length.
    """

    words: tuple[str, ...]
    score: float = 0.0


def expressions_of(name: str, lines: Iterable[str]) -> list[Expression]:
    """One expression a line, its words separated by spaces; a score may follow after a tab.

    Raises
    ------
    DataError
        Names the line that has fewer than two words, or a score that is no number.
    """
    found = []
    for number, line in enumerate(lines, 1):
        text, _, score = line.strip().partition("\t")
        if not text:
            continue
        words = tuple(text.split())
        if len(words) < 2:
            raise DataError(f"{name}:{number}: an expression has two words or more, separated by spaces, not {text!r}")
        try:
            found.append(Expression(words, float(score) if score else 0.0))
        except ValueError as error:
            raise DataError(f"{name}:{number}: the score {score!r} is no number") from error
    if not found:
        raise DataError(f"{name}: no expression in it")
    return found


def accepted(store: Store, layer: str) -> list[Expression]:
    """Expressions, and pairs in their order, that someone accepted and nobody rejected; the score is how many did.

    Raises
    ------
    UsageError
        Where there is none of this layer.
    """
    found = accepted_words(store, layer, "expression", "directed")
    if not found:
        pairs = len(accepted_words(store, layer, "pair"))
        others = f" ({pairs} of its pairs without direction, which are not joined)" if pairs else ""
        raise UsageError(
            f"{store.path}: no expression of the layer {layer!r} is accepted{others}; "
            "accept some, or list them in a file"
        )
    return [Expression(words, float(count)) for words, count in found.items()]


def accepted_words(store: Store, layer: str, *kinds: decisions.Kind) -> dict[tuple[str, ...], int]:
    """Words that someone accepted and nobody rejected as one of these kinds, and how many did."""
    votes: dict[tuple[str, ...], int] = {}
    rejected: set[tuple[str, ...]] = set()
    for decision in (decision for _, decision in decisions.newest(store).values()):
        if decision.layer != layer or decision.kind not in kinds:
            continue
        words = decision.key[2]
        if decision.verdict == "accept":
            votes[words] = votes.get(words, 0) + 1
        elif decision.verdict == "reject":
            rejected.add(words)
    return {words: count for words, count in votes.items() if words not in rejected}


def brought_to_layer(expressions: Sequence[Expression], written: Callable[[str], str]) -> list[Expression]:
    """The expressions as the layer writes their words, each once, with its highest score."""
    best: dict[tuple[str, ...], float] = {}
    for one in expressions:
        words = tuple(map(written, one.words))
        best[words] = max(best.get(words, one.score), one.score)
    return [Expression(words, score) for words, score in best.items()]
