"""Patterns of word classes: what is written becomes a table of states, whose size and time are bounded.

A pattern is a row of word classes that stand next to each other, as in
``ADJ NOUN``. ``A|B`` is either of two, ``( )`` holds several together, and what
``?``, ``+`` or ``*`` stands behind may be missing, repeated, or both. ``ANY`` is
a word of any class. ``|`` binds its two neighbours only: ``ADJ|NOUN NOUN`` is an
adjective or a noun, and then a noun. Matches are at most ``LONGEST`` words long.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from colloc.errors import UsageError

LONGEST = 32
"""Words of a match."""
ANY = "ANY"
_LONGEST_PATTERN = 1000
_DEEPEST = 20
_MOST_STATES = 2000
_TOKEN = re.compile(r"\s*([A-Za-z][A-Za-z0-9_:-]*|[()|?+*])")
_MARKS = frozenset("?+*")
_OTHER = 0
"""Symbol of a word whose class the pattern does not name."""


@dataclass(frozen=True, slots=True)
class Automaton:
    """A pattern, ready to be run.

    Attributes
    ----------
    text : str
    classes : tuple of str
        Word classes that the pattern names; symbol i + 1 is the i-th, symbol 0 any other class.
    moves : int32 array, shape (n_states, n_symbols)
        Where each symbol leads from each state. State 0 leads nowhere, state 1 is the beginning.
    accepts : bool array, shape (n_states,)
    """

    text: str
    classes: tuple[str, ...]
    moves: NDArray[np.int32]
    accepts: NDArray[np.bool_]

    def longest(self) -> int:
        """Words of the longest match there can be, at most ``LONGEST``."""
        states = {1}
        for length in range(1, LONGEST + 1):
            states = {int(to) for state in states for to in self.moves[state]} - {0}
            if not states:
                return length - 1
        return LONGEST


@dataclass(slots=True)
class _Nfa:
    """States with moves on symbols and moves on nothing."""

    on: list[dict[int, list[int]]] = field(default_factory=list)
    free: list[list[int]] = field(default_factory=list)

    def state(self) -> int:
        self.on.append({})
        self.free.append([])
        return len(self.on) - 1

    def closure(self, states: frozenset[int] | set[int]) -> frozenset[int]:
        """The states and all that can be reached from them on nothing."""
        found, waiting = set(states), [*states]
        while waiting:
            for to in self.free[waiting.pop()]:
                if to not in found:
                    found.add(to)
                    waiting.append(to)
        return frozenset(found)


_Ends = tuple[int, int]
"""First and last state of a part."""


class _Parser:
    """Recursive descent; each part becomes states at once."""

    def __init__(self, text: str) -> None:
        self._text = text
        self._tokens = _tokens(text)
        self._at = 0
        self.classes: dict[str, int] = {}
        self.nfa = _Nfa()
        self._any: list[tuple[int, int]] = []
        self.first, self.last = self._sequence(0)
        if self._at < len(self._tokens):
            raise self._wrong(f"{self._tokens[self._at]!r} where a word class was expected")
        for state, to in self._any:
            for symbol in range(len(self.classes) + 1):
                self.nfa.on[state].setdefault(symbol, []).append(to)

    def _wrong(self, what: str) -> UsageError:
        return UsageError(f"pattern {self._text!r}: {what}; write it like 'ADJ NOUN' or 'NOUN (ADP NOUN)?'")

    def _peek(self) -> str:
        return self._tokens[self._at] if self._at < len(self._tokens) else ""

    def _sequence(self, depth: int) -> _Ends:
        if depth > _DEEPEST:
            raise self._wrong(f"brackets nested more than {_DEEPEST} deep")
        first, last = self._choice(depth)
        while self._peek() not in ("", ")"):
            begin, end = self._choice(depth)
            self.nfa.free[last].append(begin)
            last = end
        return first, last

    def _choice(self, depth: int) -> _Ends:
        parts = [self._repeated(depth)]
        while self._peek() == "|":
            self._at += 1
            parts.append(self._repeated(depth))
        if len(parts) == 1:
            return parts[0]
        first, last = self.nfa.state(), self.nfa.state()
        for begin, end in parts:
            self.nfa.free[first].append(begin)
            self.nfa.free[end].append(last)
        return first, last

    def _repeated(self, depth: int) -> _Ends:
        begin, end = self._atom(depth)
        while self._peek() in _MARKS:
            mark = self._peek()
            self._at += 1
            first, last = self.nfa.state(), self.nfa.state()
            self.nfa.free[first].append(begin)
            self.nfa.free[end].append(last)
            if mark in "?*":
                self.nfa.free[first].append(last)
            if mark in "+*":
                self.nfa.free[last].append(first)
            begin, end = first, last
        return begin, end

    def _atom(self, depth: int) -> _Ends:
        token = self._peek()
        self._at += 1
        if token == "(":
            ends = self._sequence(depth + 1)
            if self._peek() != ")":
                raise self._wrong("a bracket is not closed")
            self._at += 1
            return ends
        if not token or token in "()|?+*":
            raise self._wrong(f"{token!r} where a word class was expected" if token else "it ends too early")
        first, last = self.nfa.state(), self.nfa.state()
        if token.upper() == ANY:
            self._any.append((first, last))
        else:
            symbol = self.classes.setdefault(token.upper(), len(self.classes) + 1)
            self.nfa.on[first][symbol] = [last]
        return first, last


def _tokens(text: str) -> list[str]:
    if len(text) > _LONGEST_PATTERN:
        raise UsageError(f"a pattern of {len(text)} characters: at most {_LONGEST_PATTERN} can be read")
    found, at = [], 0
    while at < len(text.rstrip()):
        token = _TOKEN.match(text, at)
        if token is None:
            raise UsageError(f"pattern {text!r}: {text[at:].strip()[:1]!r} means nothing; see `colloc pairs --help`")
        found.append(token[1])
        at = token.end()
    return found


def compile_pattern(text: str) -> Automaton:
    """Read a pattern.

    Raises
    ------
    UsageError
        Where it cannot be read, is too large, or would match no word at all.
    """
    parser = _Parser(text)
    nfa, n_symbols = parser.nfa, len(parser.classes) + 1
    start = nfa.closure({parser.first})
    if parser.last in start:
        raise UsageError(f"pattern {text!r} fits no words as well as some: leave out a ? or *")
    numbers = {frozenset[int](): 0, start: 1}
    rows: list[list[int]] = [[0] * n_symbols]
    waiting = [start]
    while len(rows) <= len(waiting):
        states = waiting[len(rows) - 1]
        row = []
        for symbol in range(n_symbols):
            reached = nfa.closure({to for state in states for to in nfa.on[state].get(symbol, ())})
            if reached not in numbers:
                numbers[reached] = len(numbers)
                waiting.append(reached)
            row.append(numbers[reached])
        rows.append(row)
        if len(rows) > _MOST_STATES:
            raise UsageError(f"pattern {text!r} is too involved: write it as several simpler ones")
    accepts = np.array([False, *(parser.last in states for states in waiting)], np.bool_)
    return Automaton(text, tuple(parser.classes), np.array(rows, np.int32), accepts)
