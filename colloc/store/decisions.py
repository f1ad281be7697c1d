"""What people decided about pairs and expressions: an append-only history, keyed by texts.

A decision names its words by their texts, with layer and kind, never by numbers of
this store: documents may come and go and the store may be built anew, and the
decisions still say what they said.
"""

from __future__ import annotations

import json
import unicodedata
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any, Literal, get_args

from colloc.errors import DataError, StoreDamagedError, UsageError
from colloc.store.connection import Store

Kind = Literal["pair", "directed", "expression"]
"""``pair``: two words near each other in any order; ``directed``: the second after the first; ``expression``: words in
a row, ``*`` standing for any one word."""
Verdict = Literal["accept", "reject", "unsure", "withdrawn"]
Key = tuple[str, str, tuple[str, ...]]
"""Layer, kind and words; those of a ``pair`` sorted, since its order means nothing."""


@dataclass(frozen=True, slots=True)
class Example:
    """A chosen line of text, kept whole so that it outlives its document.

    Parameters
    ----------
    document : str
        Identifier.
    start : int
        Where the text begins in the document, in code points.
    text : str
        Verbatim.
    marks : tuple of (int, int)
        Start and end in ``text`` (code points, end exclusive): for a pair those of its words in their order, for an
        expression that of the whole.
    """

    document: str
    start: int
    text: str
    marks: tuple[tuple[int, int], ...]

    def __post_init__(self) -> None:
        _check_text("an example", self.document, self.text)
        if any(not 0 <= begin < end <= len(self.text) for begin, end in self.marks) or not self.marks or self.start < 0:
            raise DataError(f"an example of {self.document!r} has marks outside its text")

    @property
    def place(self) -> tuple[str, int]:
        """Document and offset of the first mark: how people name a line."""
        return self.document, self.start + self.marks[0][0]

    def to_dict(self) -> dict[str, Any]:
        """As JSON values."""
        return {"document": self.document, "start": self.start, "text": self.text, "marks": [*map(list, self.marks)]}


@dataclass(frozen=True, slots=True)
class Decision:
    """One decision of one judge.

    Parameters
    ----------
    layer, kind, words
        What it is about; ``words`` in the order in which they were judged.
    verdict : {"accept", "reject", "unsure", "withdrawn"}
        ``withdrawn``: as if this judge had not decided.
    judge : str
        Who.
    decided : str
        When: ISO 8601 with time zone.
    """

    layer: str
    kind: Kind
    words: tuple[str, ...]
    verdict: Verdict
    judge: str
    decided: str
    sense: str = ""
    note: str = ""
    labels: tuple[str, ...] = ()
    examples: tuple[Example, ...] = field(default=())

    def __post_init__(self) -> None:
        if self.kind not in get_args(Kind):
            raise UsageError(f"kind must be one of {', '.join(get_args(Kind))}, not {self.kind!r}")
        if self.verdict not in get_args(Verdict):
            raise UsageError(f"the verdict must be one of {', '.join(get_args(Verdict))}, not {self.verdict!r}")
        if (len(self.words) != 2) if self.kind != "expression" else (len(self.words) < 2):
            raise UsageError(f"a decision of kind {self.kind} is about two words{_MORE.get(self.kind, '')}")
        if any(not word for word in self.words):
            raise UsageError("a decision is about words: one of them is empty")
        if not self.judge.strip():
            raise UsageError("say who decides: --by NAME")
        _check_text("a decision", self.layer, *self.words, self.judge, self.sense, self.note, *self.labels)
        if any(not label for label in self.labels) or len(set(self.labels)) < len(self.labels):
            raise UsageError("labels must not be empty or given twice")
        try:
            when = datetime.fromisoformat(self.decided)
        except ValueError as error:
            raise DataError(f"{self.decided!r} is no time in ISO 8601") from error
        if when.tzinfo is None:
            raise DataError(f"{self.decided!r} names no time zone: write +00:00 after it for UTC")

    @property
    def key(self) -> Key:
        """What it is about, in the form in which equal matters are equal."""
        return key_of(self.layer, self.kind, self.words)

    def to_dict(self) -> dict[str, Any]:
        """As JSON values; :func:`from_dict` reads it back."""
        return {
            "layer": self.layer,
            "kind": self.kind,
            "words": list(self.words),
            "verdict": self.verdict,
            "sense": self.sense,
            "note": self.note,
            "labels": list(self.labels),
            "examples": [example.to_dict() for example in self.examples],
            "judge": self.judge,
            "decided": self.decided,
        }


_MORE = {"expression": " or more"}


def key_of(layer: str, kind: str, words: Sequence[str]) -> Key:
    """The form in which equal matters are equal: NFC, and the words of a ``pair`` in a fixed order."""
    texts = [unicodedata.normalize("NFC", word) for word in words]
    return layer, kind, tuple(sorted(texts) if kind == "pair" else texts)


def from_dict(record: dict[str, Any], place: str) -> Decision:
    """A decision from JSON values.

    Raises
    ------
    DataError
        For a record that is none; the message begins with ``place``.
    """
    try:
        unknown = record.keys() - Decision.__dataclass_fields__.keys()
        if unknown:
            raise DataError(f"unknown keys {', '.join(sorted(map(str, unknown)))}")
        examples = tuple(
            Example(one["document"], int(one["start"]), one["text"], tuple((int(a), int(b)) for a, b in one["marks"]))
            for one in _list(record, "examples")
        )
        texts = {name: record[name] for name in ("layer", "kind", "verdict", "judge", "decided")}
        more = {name: record.get(name, "") for name in ("sense", "note")}
        words, labels = tuple(_list(record, "words")), tuple(_list(record, "labels"))
        if not all(isinstance(value, str) for value in (*texts.values(), *more.values(), *words, *labels)):
            raise DataError("a value that must be text is none")
        return Decision(words=words, labels=labels, examples=examples, **texts, **more)
    except KeyError as error:
        raise DataError(f"{place}: no decision: {error.args[0]!r} is missing") from error
    except (UsageError, DataError, TypeError, ValueError) as error:
        raise DataError(f"{place}: no decision: {error}") from error


def _list(record: dict[str, Any], name: str) -> list[Any]:
    value = record.get(name, [])
    if not isinstance(value, list):
        raise DataError(f"{name} must be a list")
    return value


def _check_text(what: str, *texts: str) -> None:
    for text in texts:
        if any("\ud800" <= character <= "\udfff" for character in text):
            raise UsageError(f"{what} cannot hold half of a surrogate pair: {text!r}")


def append(store: Store, decisions: Iterable[Decision]) -> int:
    """Add decisions to the history; those that stand there already, to the letter and the time, are left out.

    Returns
    -------
    int
        How many were added.
    """
    with store.transaction():
        known = set(store.rows(f"SELECT {_COLUMNS} FROM decisions"))
        new = [row for row in dict.fromkeys(map(_row, decisions)) if row not in known]
        store.execute_many(f"INSERT INTO decisions ({_COLUMNS}) VALUES ({', '.join('?' * 10)})", new)
    return len(new)


_COLUMNS = "layer, kind, words, verdict, sense, note, labels, examples, judge, decided"


def _row(decision: Decision) -> tuple[str, ...]:
    values = decision.to_dict()
    return tuple(
        value if isinstance(value, str) else json.dumps(value, ensure_ascii=False)
        for value in (values[name] for name in _COLUMNS.split(", "))
    )


def iterate(store: Store) -> Iterator[tuple[int, Decision]]:
    """The whole history with the number of each decision, oldest first; empty for a store of schema 1."""
    if not store.value("SELECT count(*) FROM sqlite_schema WHERE name = 'decisions'"):
        return
    for number, *row in store.iterate(f"SELECT id, {_COLUMNS} FROM decisions ORDER BY id"):
        record: dict[str, Any] = dict(zip(_COLUMNS.split(", "), row, strict=True))
        try:
            for name in ("words", "labels", "examples"):
                record[name] = json.loads(record[name])
            decision = from_dict(record, f"decision {number}")
        except ValueError as error:
            raise StoreDamagedError(f"{store.path}: decision {number} cannot be read ({error})") from error
        except DataError as error:
            raise StoreDamagedError(f"{store.path}: {error}") from error
        yield number, decision


def newest(store: Store) -> dict[tuple[Key, str], tuple[int, Decision]]:
    """The decision that counts for each matter and judge, withdrawn ones included, with its number.

    Newest means: the latest time, then the later in this store.
    """
    found: dict[tuple[Key, str], tuple[int, Decision]] = {}
    for number, decision in iterate(store):
        place = (decision.key, decision.judge)
        if place not in found or _when(decision) >= _when(found[place][1]):
            found[place] = (number, decision)
    return found


def _when(decision: Decision) -> datetime:
    return datetime.fromisoformat(decision.decided)
