"""Verb for engineers: expressions joined in running text."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, overload

from colloc.verbs.opening import StorePath, as_list, reading

if TYPE_CHECKING:
    from colloc.answers.joining.listed import Expression
    from colloc.answers.joining.rewriting import Joined, Joiner
    from colloc.store.opening import Store


@overload
def join(  # type: ignore[overload-overlap] # a str is a sequence of str too, but comes first
    store: StorePath | Store,
    text: str,
    expressions: Sequence[str | Expression] | None = None,
    *,
    layer: str | None = None,
    joiner: str = "_",
    across_lines: bool = False,
) -> Joined: ...
@overload
def join(
    store: StorePath | Store,
    text: Sequence[str],
    expressions: Sequence[str | Expression] | None = None,
    *,
    layer: str | None = None,
    joiner: str = "_",
    across_lines: bool = False,
) -> list[Joined]: ...
def join(
    store: StorePath | Store,
    text: str | Sequence[str],
    expressions: Sequence[str | Expression] | None = None,
    *,
    layer: str | None = None,
    joiner: str = "_",
    across_lines: bool = False,
) -> Joined | list[Joined]:
    """Texts with their expressions joined: longest first, overlapping ones of equal length by score.

    Parameters
    ----------
    text : str or sequence of str
    expressions : sequence of str, optional
        Words separated by spaces; ``*`` stands for any one word, and a score may follow after a tab. Those accepted
        in the store when not given.
    layer : str, optional
        What words are compared by, as the store was built when not given: ``form``, ``fold``, and ``lemma`` or
        ``lemma_fold`` where the store was built with a dictionary of lemmas. Expressions are then written in lemmas.

    Returns
    -------
    Joined, or a list of them
        ``text``; ``spans``: for each expression its start and end in the old text, then in the new one.
    """
    ready = make_joiner(store, expressions, layer=layer, joiner=joiner, across_lines=across_lines)
    return ready.join(text) if isinstance(text, str) else ready.join_many(as_list(text))


def accepted_pairs(store: StorePath | Store, *, layer: str | None = None) -> int:
    """How many pairs without direction are accepted in the store: `join` leaves them out, as they may stand apart."""
    from colloc.answers.joining.listed import accepted_words
    from colloc.answers.questions import built_spec

    with reading(store) as opened:
        return len(accepted_words(opened, layer or built_spec(opened).layer, "pair"))


def make_joiner(
    store: StorePath | Store,
    expressions: Sequence[str | Expression] | None = None,
    *,
    layer: str | None = None,
    joiner: str = "_",
    across_lines: bool = False,
) -> Joiner:
    """What joins one text after the other: ``join``, ``join_many`` and, for long texts in pieces, ``join_stream``."""
    from colloc.answers.concordance.matching import segment_settings
    from colloc.answers.joining.layers import layer_of_words
    from colloc.answers.joining.listed import accepted, expressions_of
    from colloc.answers.joining.rewriting import Joiner
    from colloc.answers.questions import built_spec

    with reading(store) as opened:
        chosen = layer or built_spec(opened).layer
        settings = segment_settings(opened)
        layer_of_words(chosen, settings)  # raises where running text has no such layer
        if expressions is None:
            listed = accepted(opened, chosen)
        else:
            listed = [
                one
                for given in expressions
                for one in (expressions_of("expressions", [given]) if isinstance(given, str) else [given])
            ]
    return Joiner(listed, settings, layer=chosen, joiner=joiner, across_lines=across_lines)
