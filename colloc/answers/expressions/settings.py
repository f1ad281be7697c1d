"""What is asked of expressions: checked once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Literal, get_args

from colloc.answers.questions import built_spec
from colloc.counts.sequences.sharing import MOST_WORDS
from colloc.errors import UsageError
from colloc.settings import DEFAULT_MIN_COUNT, Inside
from colloc.store import slices
from colloc.store.connection import Store
from colloc.store.documents import document_count

Treatment = Literal["drop", "keep"]
Rank = Literal[
    "strength",
    "weakest_split",
    "specific_correlation",
    "best_split_g2",
    "c_value",
    "c_value_length",
    "count",
    "documents",
]
RANKS: tuple[str, ...] = get_args(Rank)
LONGEST = 8
"""Words of the longest expressions that can be asked for."""
FEWEST_DOCUMENTS = 3
"""What repeats in one or two documents only is their matter, not the language's."""
NAME_SHARE = 0.34
"""Share of words written with a capital from which a sequence counts as a name: one of two or three words does."""
COMMON_SHARE = 0.5
"""The most frequent words that together make up this share of the running text are the common ones."""

assert LONGEST < MOST_WORDS  # one word more is looked at, to see what is a fragment


@dataclass(frozen=True, slots=True, kw_only=True)
class ExpressionOptions:
    """Which sequences are asked for; ``None`` means as the store was built, or by the size of the store.

    Parameters
    ----------
    min_words, max_words : int
        Length, 2 to 8.
    min_docs : int
        Least number of documents that hold one; 3 when not given, or all where there are fewer.
    names : "drop" or "keep"
        Sequences of which a third or more of the words are written with a capital inside sentences.
    common : "drop" or "keep"
        Sequences made only of the most frequent words, those that make up half of the running text.
    fragments : "fold" or "keep"
        Whether sequences that live inside a longer one are folded into it.
    """

    layer: str | None = None
    where: Sequence[str] = ()
    inside: Inside | None = None
    min_words: int = 2
    max_words: int = 6
    min_count: int = DEFAULT_MIN_COUNT
    min_docs: int | None = None
    names: Treatment = "drop"
    common: Treatment = "drop"
    fragments: Literal["fold", "keep"] = "fold"
    rank: str = "strength"

    def __post_init__(self) -> None:
        if not 2 <= self.min_words <= self.max_words <= LONGEST:
            raise UsageError(
                f"expressions have 2 to {LONGEST} words, the least first: not {self.min_words} to {self.max_words}"
            )
        if self.min_count < 2:
            raise UsageError(f"min_count must be at least 2, not {self.min_count}: what occurs once does not recur")
        for name, value, allowed in (
            ("names", self.names, ("drop", "keep")),
            ("common", self.common, ("drop", "keep")),
            ("fragments", self.fragments, ("fold", "keep")),
            ("rank", self.rank, RANKS),
        ):
            if value not in allowed:
                raise UsageError(f"{name} must be one of {', '.join(allowed)}, not {value!r}")


@dataclass(frozen=True, slots=True)
class Asked:
    """The options with what the store decides filled in."""

    options: ExpressionOptions
    layer: str
    inside: Inside
    where: str
    min_docs: int

    def settings(self, store: Store) -> dict[str, Any]:
        """Everything that decides the numbers."""
        chosen = self.options
        return {
            "store": str(store.path),
            "layer": self.layer,
            "inside": self.inside,
            "where": self.where,
            "min_words": chosen.min_words,
            "max_words": chosen.max_words,
            "min_count": chosen.min_count,
            "min_docs": self.min_docs,
            "names": chosen.names,
            "common": chosen.common,
            "fragments": chosen.fragments,
            "rank": chosen.rank,
        }


def resolve(store: Store, options: ExpressionOptions) -> Asked:
    """Options and store together."""
    built = built_spec(store)
    where = slices.canonical(options.where)
    documents = len(slices.select(store, where)) if where else document_count(store)
    fewest = min(FEWEST_DOCUMENTS, documents) if options.min_docs is None else options.min_docs
    return Asked(options, options.layer or built.layer, options.inside or built.inside, where, fewest)
