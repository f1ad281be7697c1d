"""What the user chose: frozen, checked once at the edge, kept in the store as JSON."""

from __future__ import annotations

import dataclasses
import json
from dataclasses import dataclass
from typing import Any, Literal, Self, get_args

from colloc.errors import UsageError

Inside = Literal["sentence", "paragraph", "document"]
TallyKind = Literal["window", "span", "unit", "positions", "relation"]
Margins = Literal["pairs", "positions", "tokens"]

DEFAULT_WINDOW = 5
DEFAULT_LAYER = "fold"
DEFAULT_MIN_COUNT = 5
DEFAULT_MIN_EXPECTED = 5.0
"""Expected count from which an absence means something: chance alone leaves such a pair out once in 148 times."""
DEFAULT_MEASURE = "npmi"
LARGEST_WINDOW = 1000
DEFAULT_MEMORY = 2 * 2**30
"""Bytes that all processes of a command together stay below, unless told otherwise."""
SMALLEST_MEMORY = 384 * 2**20
"""Less than this is refused, or taken as this: the libraries alone need about half of it."""


def _choice(name: str, value: str, allowed: tuple[str, ...]) -> None:
    if value not in allowed:
        raise UsageError(f"{name} must be one of {', '.join(allowed)}, not {value!r}")


def _later(default: Any) -> Any:
    """A field that stores made before it do not have."""
    return dataclasses.field(default=default, metadata={"later": True})


class _Jsonable:
    """Settings go into the store and beside results as plain JSON objects."""

    def to_json(self) -> str:
        values: dict[str, Any] = dataclasses.asdict(self)  # type: ignore[call-overload]
        for field in dataclasses.fields(self):  # type: ignore[arg-type]
            # What came later is written where it was chosen only, so that older stores are as they were.
            if field.metadata.get("later") and values[field.name] == field.default:
                del values[field.name]
        return json.dumps(values, sort_keys=True)

    @classmethod
    def from_json(cls, text: str) -> Self:
        values: dict[str, Any] = json.loads(text)
        fields = dataclasses.fields(cls)  # type: ignore[arg-type]
        unknown = values.keys() - {field.name for field in fields}
        if unknown:
            raise UsageError(f"unknown {cls.__name__} keys: {', '.join(sorted(unknown))}")
        tuples = {key: tuple(value) if isinstance(value, list) else value for key, value in values.items()}
        return cls(**tuples)


@dataclass(frozen=True, slots=True, kw_only=True)
class SegmentSettings(_Jsonable):
    """How text becomes words and sentences (UAX #29 and what is laid on top of it).

    ``tailored=False`` switches every addition off, which is how the official
    test files are run.
    """

    tailored: bool = True
    hyphens: Literal["keep", "split"] = "keep"
    """Words joined by a hyphen: one word, or one for each part."""
    numbers: Literal["keep", "drop"] = "keep"
    """Tokens without a letter."""
    addresses: Literal["keep", "drop", "split"] = "keep"
    """URLs and e-mail addresses: one word, no word, or split by UAX #29."""
    line_ends: Literal["paragraph", "space"] = "paragraph"
    """A line end ends the paragraph (UAX #29), or is a space as in wrapped text, where a blank line ends it."""
    abbreviations: bool = True
    """No sentence ends after the abbreviations of ``colloc.tokens.abbreviations``."""
    max_token: int = 256
    """Longer tokens (in code points) are left out and reported."""
    pattern: str | None = None
    """A `regex` pattern of the user's for tokens, instead of UAX #29 words."""
    scripts: Literal["unicode", "dictionary"] = _later("unicode")
    """Scripts without spaces (Chinese, Japanese, Thai, Lao, Khmer, Burmese): UAX #29, or words by dictionary (ICU)."""
    hashtags: Literal["split", "keep"] = _later("split")
    """``#tag`` and ``@name``: the word without its sign, or one word with it."""
    punctuation: Literal["drop", "keep"] = _later("drop")
    """Marks and symbols that are no part of a word: no tokens, or tokens."""
    folding: tuple[str, ...] = _later(())
    """Additions to case folding, by the names of ``colloc.tokens.folding.additions``."""
    lemma: str | None = _later(None)
    """Language whose dictionary gives lemmas to words that carry none."""

    def __post_init__(self) -> None:
        _choice("hyphens", self.hyphens, ("keep", "split"))
        _choice("numbers", self.numbers, ("keep", "drop"))
        _choice("addresses", self.addresses, ("keep", "drop", "split"))
        _choice("line_ends", self.line_ends, ("paragraph", "space"))
        _choice("scripts", self.scripts, ("unicode", "dictionary"))
        _choice("hashtags", self.hashtags, ("split", "keep"))
        _choice("punctuation", self.punctuation, ("drop", "keep"))
        if self.max_token < 1:
            raise UsageError(f"max_token must be at least 1, not {self.max_token}")


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadSettings(_Jsonable):
    """How input becomes documents."""

    format: str = "auto"
    """``auto`` goes by file name; else txt, jsonl, csv, tsv and what later readers add."""
    encoding: str = "utf-8"
    """A codec name, or ``detect``."""
    errors: Literal["strict", "replace"] = "strict"
    text_column: str = "text"
    id_column: str | None = None
    """Column holding the document identifier; ``id`` is used where there is one."""
    meta_from_path: str | None = None
    """A pattern such as ``{genre}/{year}-{id}.txt`` matched against the end of the path."""
    meta_table: str | None = None
    """A CSV, TSV or JSON Lines file keyed by file name (first column)."""
    max_record: int = 64 * 2**20
    """Largest JSON or CSV record in bytes."""
    max_unpacked: int = 64 * 2**30
    """Largest unpacked size in bytes of one compressed file."""
    skip_duplicates: Literal["none", "document", "paragraph"] = "none"
    meta_xpath: tuple[str, ...] = _later(())
    """``name=XPath``: metadata from the headers of TEI documents."""

    def __post_init__(self) -> None:
        _choice("errors", self.errors, ("strict", "replace"))
        _choice("skip_duplicates", self.skip_duplicates, ("none", "document", "paragraph"))
        if self.max_record < 1024:
            raise UsageError(f"max_record must be at least 1024 bytes, not {self.max_record}")


@dataclass(frozen=True, slots=True, kw_only=True)
class TallySpec(_Jsonable):
    """Which co-occurrences one tally counts; two equal specs are the same tally.

    kind
        ``window``: M[x, y] = times y follows x at distance 1..right (symmetric
        and directed questions are both answered from it; left is 0).
        ``span``: C = M_right + transpose(M_left), for unequal left and right.
        ``positions``: tokens of x with at least one y within left..right.
        ``unit``: units (``inside``) that contain both x and y.
        ``relation``: dependency pairs (head, dependent) of ``relation``
        (empty: all relations together).
    where
        The slice, in canonical form; empty means all documents.
    """

    layer: str = DEFAULT_LAYER
    kind: TallyKind = "window"
    left: int = 0
    right: int = DEFAULT_WINDOW
    inside: Inside = "sentence"
    where: str = ""
    relation: str = ""

    def __post_init__(self) -> None:
        _choice("kind", self.kind, get_args(TallyKind))
        _choice("inside", self.inside, get_args(Inside))
        for name, value in (("left", self.left), ("right", self.right)):
            if not 0 <= value <= LARGEST_WINDOW:
                raise UsageError(f"a window must be between 0 and {LARGEST_WINDOW} words, not {value} ({name})")
        if self.kind == "window" and (self.left != 0 or self.right < 1):
            raise UsageError("a window tally counts followers: left is 0 and right at least 1")
        if self.kind in ("span", "positions") and self.left + self.right < 1:
            raise UsageError("a span needs at least one word on one side")


def told_reach(kind: str, left: int, right: int) -> dict[str, int]:
    """A table's reach as the options that ask for it: ``window`` where both sides are equal; none of units, relations.

    >>> told_reach("window", 0, 5), told_reach("span", 1, 3), told_reach("unit", 0, 0)
    ({'window': 5}, {'left': 1, 'right': 3}, {})
    """
    if kind in ("unit", "relation"):
        return {}
    # A window is stored as followers alone: its left is 0.
    return {"window": right} if kind == "window" or left == right else {"left": left, "right": right}


def told_spec(spec: TallySpec) -> dict[str, Any]:
    """Settings of a table for people: those that apply, in the words of the options."""
    stored = dataclasses.asdict(spec)
    reach = told_reach(spec.kind, stored.pop("left"), stored.pop("right"))
    unused = "inside" if spec.kind == "relation" else "relation"
    del stored[unused]
    return {"layer": stored.pop("layer"), "kind": stored.pop("kind"), **reach, **stored}
