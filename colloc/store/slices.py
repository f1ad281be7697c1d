"""Slices: documents chosen by metadata, written ``key=value``, joined by ``&``.

::

    genre=press                 the value itself; numbers as they are written
    genre=press,fiction         any of several
    year=1990..1999             a range of numbers, both ends included
    year=1990..  year=..1999    open at one end
    id=harbour-17               the document of this identifier
    title="A, B & C"            quotes keep `,`, `&`, `..` and spaces; `""` stands for a quote
    genre=press & year=1990..   all of them must hold
    not (genre=press)           all documents for which the conditions in brackets do not all hold

Nothing that a user writes becomes SQL: conditions are compared in Python, on
the metadata that SQLite reads.
"""

from __future__ import annotations

import json
import math
import re
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from colloc.errors import NotSeenError, UsageError
from colloc.records import FloatArray, Int64Array, MetaValue
from colloc.store.connection import Store
from colloc.store.documents import visible_end

IDENTIFIER_KEY = "id"
_PLAIN = re.compile(r'[^\s",&=()]+')
_NUMBER = r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?"
_HYPHEN = re.compile(r"(\d+) *[-\u2013] *(\d+)")
_LISTED = 10
"""Values of a key that a message lists."""
_RANGE = re.compile(rf"({_NUMBER})?\.\.({_NUMBER})?")
_PIECE = re.compile(r'\s*(?:"((?:[^"]|"")*)"|([^",&]*?))\s*(?=[,&]|$)')
_KEY = re.compile(r'\s*(?:"((?:[^"]|"")+)"|([^"=&,]+?))\s*=')
_NOT = re.compile(r"\s*not\s*\(")
_BRACKET = re.compile(r'"(?:[^"]|"")*"|[()]')


@dataclass(frozen=True, slots=True)
class _Condition:
    """One key with the texts, or the ranges of numbers, that it may have."""

    key: str
    texts: tuple[str, ...]
    ranges: tuple[tuple[float, float], ...]
    written: str

    def holds(self, value: MetaValue) -> bool:
        if value is None:
            return False
        if as_text(value) in self.texts:
            return True
        number = _as_number(value)
        return number is not None and any(low <= number <= high for low, high in self.ranges)


@dataclass(frozen=True, slots=True)
class _Exception:
    """What must not hold all together."""

    conditions: tuple[_Condition | _Exception, ...]
    written: str


def canonical(wheres: Sequence[str]) -> str:
    """Several conditions as one text that is the same however they were written; empty for no condition.

    Raises
    ------
    UsageError
        A condition that cannot be read.
    """
    conditions = {condition.written for where in wheres for condition in _parsed(where)}
    return " & ".join(sorted(conditions))


def complement(where: str, within: str = "") -> str:
    """The slice of all other documents, or of the others of the slice ``within``; both in canonical form.

    Raises
    ------
    UsageError
        There are no others: ``where`` is empty.
    """
    if not where:
        raise UsageError("all documents have no rest: name a slice, such as key=value")
    return canonical([f"not ({where})", *([within] if within else [])])


def quoted(value: str) -> str:
    """A value as it must be written in a condition to stand for itself."""
    if _PLAIN.fullmatch(value) and not _RANGE.fullmatch(value):
        return value
    return '"' + value.replace('"', '""') + '"'


def select(store: Store, where: str) -> Int64Array:
    """Numbers of the documents of a slice, ascending; all documents where ``where`` is empty.

    Raises
    ------
    UsageError
        A condition that cannot be read, or a key that no document has.
    """
    conditions = _parsed(where)
    if not conditions:
        return _all_documents(store)
    return _fulfilling(store, conditions)


def fitting(store: Store, where: str) -> Int64Array:
    """The documents of a slice, as `select` gives them, of which there must be one where ``where`` is not empty.

    Raises
    ------
    UsageError
        A condition that cannot be read, or a key that no document has.
    NotSeenError
        No document fits; the message lists values that there are.
    """
    numbers = select(store, where)
    if where and not len(numbers):
        conditions = list(_simple(_parsed(where)))
        hints = [f"did you mean {meant}" for condition in conditions if (meant := _meant_range(condition))]
        known = [_known_values(store, key) for key in dict.fromkeys(condition.key for condition in conditions)]
        raise NotSeenError(f"{store.path}: no document fits {where!r}; " + "; ".join([*hints, *known]))
    return numbers


def _simple(conditions: Sequence[_Condition | _Exception]) -> Iterator[_Condition]:
    """The conditions, those in brackets too."""
    for condition in conditions:
        if isinstance(condition, _Exception):
            yield from _simple(condition.conditions)
        else:
            yield condition


def _meant_range(condition: _Condition) -> str:
    """The condition with ``..`` where it has a hyphen between two numbers; empty where it has none."""
    meant = [match for text in condition.texts if (match := _HYPHEN.fullmatch(text))]
    return f"{quoted(condition.key)}={','.join(f'{match[1]}..{match[2]}' for match in meant)}" if meant else ""


def _known_values(store: Store, key: str) -> str:
    """The first values of a key, for a message."""
    values = list(values_of(store, key))
    more = f", ... ({len(values)} values)" if len(values) > _LISTED else ""
    return f"values of {key}: {', '.join(values[:_LISTED])}{more}"


def _all_documents(store: Store) -> Int64Array:
    rows = store.iterate("SELECT id FROM documents WHERE id < ? ORDER BY id", (visible_end(store),))
    return np.fromiter((number for (number,) in rows), dtype=np.int64)


def _fulfilling(store: Store, conditions: Sequence[_Condition | _Exception]) -> Int64Array:
    """Documents for which all of at least one condition hold."""
    chosen: Int64Array | None = None
    for condition in conditions:
        fitting = _fitting(store, condition)
        chosen = fitting if chosen is None else np.intersect1d(chosen, fitting)
    return chosen if chosen is not None else np.empty(0, dtype=np.int64)


def metadata_keys(store: Store) -> list[str]:
    """Keys that any document has, sorted."""
    sql = "SELECT DISTINCT json_each.key FROM documents, json_each(documents.metadata) WHERE documents.id < ?"
    return sorted(key for (key,) in store.rows(sql, (visible_end(store),)))


def values_of(store: Store, key: str) -> dict[str, int]:
    """Values of a key with the number of documents of each: numbers by size, then texts in order."""
    counts: Counter[str] = Counter()
    for _, value in _values(store, key):
        if value is not None:
            counts[as_text(value)] += 1
    return {text: counts[text] for text in sorted(counts, key=_sort_key)}


def numbers_of(store: Store, key: str) -> tuple[Int64Array, FloatArray]:
    """Documents whose value of a key is a number (or a text that reads as one), by document number, with it."""
    found = [
        (number, as_number) for number, value in _values(store, key) if (as_number := _as_number(value)) is not None
    ]
    numbers = np.array([number for number, _ in found], np.int64)
    return numbers, np.array([value for _, value in found], np.float64)


def as_text(value: MetaValue) -> str:
    """A metadata value as conditions and tables write it: JSON's way for all but texts."""
    return value if isinstance(value, str) else json.dumps(value)


def _values(store: Store, key: str) -> list[tuple[int, MetaValue]]:
    """Document numbers with their value of a key, for those that have it."""
    if key == IDENTIFIER_KEY:
        return store.rows("SELECT id, identifier FROM documents WHERE id < ? ORDER BY id", (visible_end(store),))
    # json_each gives keys as values: no path has to be put together from what the user wrote.
    sql = (
        "SELECT documents.id, json_each.value, json_each.type FROM documents, json_each(documents.metadata) "
        "WHERE json_each.key = ? AND documents.id < ? ORDER BY documents.id"
    )
    truths = {"true": True, "false": False}
    return [(number, truths.get(kind, value)) for number, value, kind in store.rows(sql, (key, visible_end(store)))]


def _fitting(store: Store, condition: _Condition | _Exception) -> Int64Array:
    if isinstance(condition, _Exception):
        return np.setdiff1d(_all_documents(store), _fulfilling(store, condition.conditions))
    if condition.key == IDENTIFIER_KEY and not condition.ranges:
        numbers = []
        for text in condition.texts:
            sql = "SELECT id FROM documents WHERE identifier = ? AND id < ?"
            number = store.value(sql, (text, visible_end(store)))
            if number is not None:
                numbers.append(number)
        return np.array(sorted(numbers), dtype=np.int64)
    values = _values(store, condition.key)
    if not values:
        known = ", ".join([IDENTIFIER_KEY, *metadata_keys(store)])
        raise UsageError(f"{store.path}: no document has the key {condition.key!r}; keys: {known}")
    return np.array([number for number, value in values if condition.holds(value)], dtype=np.int64)


def _parsed(where: str) -> list[_Condition | _Exception]:
    """The conditions of one text."""
    conditions: list[_Condition | _Exception] = []
    position = 0
    while position < len(where.rstrip()) or (conditions and position <= len(where)):
        negated = _NOT.match(where, position)
        if negated is not None:
            exception, position = _exception(where, negated.end())
            conditions.append(exception)
            if position >= len(where):
                break
            position += 1  # behind the &
            continue
        match = _KEY.match(where, position)
        if match is None:
            raise _nonsense(where)
        key = _unquoted(match[1], match[2])
        pieces, position = _pieces(where, match.end())
        conditions.append(_condition(where, key, pieces))
        if position >= len(where):
            break
        position += 1  # behind the &
    return conditions


def _exception(where: str, position: int) -> tuple[_Exception, int]:
    """What stands between the bracket before ``position`` and its partner, and where the next condition's & is."""
    depth = 1
    for match in _BRACKET.finditer(where, position):
        depth += {"(": 1, ")": -1}.get(match[0], 0)
        if depth == 0:
            inner, rest = where[position : match.start()], where[match.end() :]
            conditions = sorted(_parsed(inner), key=lambda condition: condition.written)
            behind = len(where) - len(rest.lstrip())
            if not conditions or (behind < len(where) and where[behind] != "&"):
                break
            written = " & ".join(dict.fromkeys(condition.written for condition in conditions))
            return _Exception(tuple(conditions), f"not ({written})"), behind
    raise _nonsense(where)


def _pieces(where: str, position: int) -> tuple[list[tuple[str, bool]], int]:
    """Values between commas, each with whether it was quoted, and where they end."""
    pieces = []
    while True:
        match = _PIECE.match(where, position)
        if match is None:
            raise _nonsense(where)
        pieces.append((_unquoted(match[1], match[2]), match[1] is not None))
        position = match.end()
        if position >= len(where) or where[position] == "&":
            return pieces, position
        position += 1  # behind the comma


def _condition(where: str, key: str, pieces: list[tuple[str, bool]]) -> _Condition:
    texts, ranges = set(), {}
    for text, was_quoted in pieces:
        match = None if was_quoted else _RANGE.fullmatch(text)
        if match is not None and (match[1] or match[2]):
            low = float(match[1]) if match[1] else -math.inf
            high = float(match[2]) if match[2] else math.inf
            if low > high:
                raise UsageError(f"the range {text} in {where!r} is empty: write the smaller number first")
            ranges[f"{_short(low)}..{_short(high)}"] = (low, high)
        elif text or was_quoted:
            texts.add(text)
        else:
            raise _nonsense(where)
    written = ",".join([*sorted(map(quoted, texts)), *sorted(ranges)])
    # A key with an equals sign, a comma or the like must be quoted as a value would be.
    return _Condition(key, tuple(sorted(texts)), tuple(ranges.values()), f"{quoted(key)}={written}")


def _unquoted(inner: str | None, plain: str | None) -> str:
    return (plain or "") if inner is None else inner.replace('""', '"')


def _short(number: float) -> str:
    if math.isinf(number):
        return ""
    return str(int(number)) if number.is_integer() and abs(number) < 2**53 else repr(number)


def _as_number(value: MetaValue) -> float | None:
    if isinstance(value, bool) or value is None:
        return None
    try:
        number = float(value)
    except ValueError:
        return None
    return None if math.isnan(number) else number


def _sort_key(text: str) -> tuple[bool, float, str]:
    number = _as_number(text)
    return number is None, 0.0 if number is None else number, text


def _nonsense(where: str) -> UsageError:
    return UsageError(
        f"cannot read the slice {where!r}: write key=value, key=a,b or key=1990..1999, joined by & "
        '(quote a value that holds one of these signs: key="a, b"); not (...) for all others'
    )
