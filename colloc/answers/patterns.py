"""Where the words of a store follow a pattern of word classes, such as ``ADJ NOUN``."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from colloc.answers.concordance.finding import stream_places
from colloc.answers.tagpatterns import Automaton, compile_pattern
from colloc.counts.selection import slice_selection
from colloc.counts.spans import read_stretches, window_spans
from colloc.errors import UsageError
from colloc.records import NO_TERM, Int64Array, TokenSpan, UInt32Array
from colloc.store import vocabulary
from colloc.store.connection import Store

_CLASSES_AT_ONCE = 65_536


def matches(
    store: Store, pattern: str | Automaton, where: str = "", *, longest: bool = False
) -> Iterator[tuple[Int64Array, Int64Array]]:
    """Places of adjacent words, inside one sentence, whose word classes follow a pattern.

    Parameters
    ----------
    pattern : str or Automaton
        See `colloc.answers.tagpatterns`.
    where : str
        Canonical slice; empty for all documents.
    longest : bool
        Only the longest match that begins at a place; otherwise all of them. Matches that begin at different
        places may overlap in either case.

    Yields
    ------
    starts, lengths : int64 arrays, shape (n,)
        Tokens of the stream where matches begin, and their words; by start, and then by length. A bounded stretch of
        the stream at a time.

    Raises
    ------
    UsageError
        The pattern cannot be read, or the store does not tell word classes.
    """
    automaton = compile_pattern(pattern) if isinstance(pattern, str) else pattern
    symbols = _symbols(store, automaton)
    selection = slice_selection(store, where)
    reach = automaton.longest()
    place = 0
    stretches = read_stretches(store, symbols, selection, "sentence")
    for span in window_spans(stretches, 0, len(selection), 0, reach - 1):
        starts, lengths = in_span(span, automaton, longest=longest)
        yield stream_places(selection, starts + place), lengths
        place += len(span.terms) - span.ahead


def in_span(span: TokenSpan, automaton: Automaton, *, longest: bool = False) -> tuple[Int64Array, Int64Array]:
    """Matches that begin in a span; its terms are symbols of the automaton.

    All places are run at once, a word further in each step, and those that lead nowhere are left behind: the time is
    at most the number of words times the longest match.
    """
    n = len(span.terms)
    edges = np.concatenate([span.units[(span.units > 0) & (span.units < n)], [n]])
    ends = np.repeat(edges, np.diff(edges, prepend=0))
    # a word of no class leads nowhere, as the symbol behind the last one
    moves = np.concatenate([automaton.moves, np.zeros((len(automaton.moves), 1), np.int32)], axis=1)
    terms = np.where(span.terms == NO_TERM, moves.shape[1] - 1, span.terms).astype(np.int64)
    at = np.arange(n - span.ahead)
    states: NDArray[np.int32] = np.ones(len(at), np.int32)
    found: list[tuple[Int64Array, Int64Array]] = []
    length = 0
    while len(at):
        states = moves[states, terms[at + length]]
        length += 1
        hits = at[automaton.accepts[states]]
        found.append((hits, np.full(len(hits), length, np.int64)))
        alive = (states != 0) & (at + length < ends[at])
        if length == automaton.longest():
            break
        at, states = at[alive], states[alive]
    starts = np.concatenate([hits for hits, _ in found] or [np.empty(0, np.int64)])
    lengths = np.concatenate([own for _, own in found] or [np.empty(0, np.int64)])
    order = np.argsort(starts, kind="stable")
    starts, lengths = starts[order], lengths[order]
    if longest and len(starts):
        last = np.append(starts[1:] != starts[:-1], True)
        starts, lengths = starts[last], lengths[last]
    return starts, lengths


def _symbols(store: Store, automaton: Automaton) -> UInt32Array:
    """For each type the symbol of its word class; `NO_TERM` where it has none."""
    numbers = {name: symbol for symbol, name in enumerate(automaton.classes, 1)}
    symbols = np.full(vocabulary.type_count(store), NO_TERM)
    known: set[str] = set()
    for first in range(0, len(symbols), _CLASSES_AT_ONCE):
        classes = [upos for _, _, upos in vocabulary.type_keys(store, first, first + _CLASSES_AT_ONCE)]
        known.update(classes)
        symbols[first : first + len(classes)] = [
            numbers.get(upos.upper(), 0) if upos else int(NO_TERM) for upos in classes
        ]
    known.discard("")
    if not known:
        raise UsageError(f"{store.path}: its words have no word classes: build it from annotated text, such as CoNLL-U")
    missing = [name for name in automaton.classes if name not in {upos.upper() for upos in known}]
    if missing:
        raise UsageError(f"{store.path}: no word class {missing[0]!r}, only {', '.join(sorted(known))}")
    return symbols
