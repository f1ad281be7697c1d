"""What is asked of expressions: checked once."""

from __future__ import annotations

from collections.abc import Sequence
from contextlib import AbstractContextManager
from dataclasses import dataclass
from typing import Any, Literal

from colloc.answers.expressions.measures import RANKS
from colloc.answers.questions import built_spec
from colloc.counts.sequences.growing import Grower, growing
from colloc.counts.sequences.sharing import MOST_WORDS
from colloc.errors import UsageError
from colloc.settings import DEFAULT_MIN_COUNT, Inside
from colloc.store import slices
from colloc.store.connection import Store
from colloc.store.documents import document_count

Treatment = Literal["drop", "keep"]
CONTIGUOUS_ONLY = ("c_value", "c_value_length", "any_order")
"""Columns that frames with open slots do not have."""
PATTERNS_ONLY = ("pattern_count",)
FRAMES_ONLY = ("fillers", "filler_kinds", "filler_entropy")
SETS_ONLY = ("adjacent", "order_kinds", "order_entropy", "orders")
NOT_OF_SETS = (
    *("completeness", "split_low", "split_high", "cut", "specific_interaction", "best_split_g2", "c_value"),
    *("c_value_length", "any_order", "pattern_count", *FRAMES_ONLY),
)
"""Columns that need an order of the words."""
COLUMNS = (
    *("expression", "words", "count", "adjacent", "documents", "dp_norm", "capitals", "strength", "completeness"),
    *("weakest_split", "split_low", "split_high", "cut", "specific_correlation", "specific_interaction"),
    *("best_split_g2", "c_value", "c_value_length", "any_order", "pattern_count", "fragment", "fragment_count"),
    *("fragments", "filler_kinds", "filler_entropy", "fillers", "order_kinds", "order_entropy", "orders"),
)
"""All columns of an answer, in their order:

``expression``, ``words``
    The words, ``_`` for an open slot, and how many words there are.
``count``, ``documents``, ``dp_norm``
    Occurrences, documents that hold it, and its dispersion over them.
``capitals``
    Share of its words written with a capital inside sentences.
``strength``, ``completeness``
    See `colloc.answers.expressions.judging` and `colloc.answers.expressions.folding`.
``weakest_split``, ``cut``
    PMI in bits across the cut where its halves cling least, and the number of words left of that cut.
``split_low``, ``split_high``
    Its 95 % interval over documents.
``specific_correlation``, ``specific_interaction``
    Van de Cruys 2011, bits.
``best_split_g2``
    The largest G2 across any cut.
``c_value``, ``c_value_length``
    C-value weighted by log2 of the length, and by the length - 1.
``any_order``
    Times the same words stand side by side in any order.
``pattern_count``
    Occurrences that follow the pattern of word classes asked for.
``fragment``, ``fragment_count``, ``fragments``
    The strongest fragment folded into it, with its occurrences, and how many fragments there are.
``filler_kinds``, ``filler_entropy``, ``fillers``
    Different words in an open slot, their entropy in bits (where there are several slots: of the one where it is
    smallest), and the most frequent with their counts, slots divided by ``|``.
``adjacent``, ``order_kinds``, ``order_entropy``, ``orders``
    Of sets in any order: occurrences side by side; different orders, their entropy in bits, and the most frequent
    orders with their counts.
"""
SHOWN = ("count", "documents", "strength", "c_value", "fragment", "fragment_count")
SHOWN_OF_FRAMES = ("count", "documents", "strength", "filler_kinds", "filler_entropy", "fillers")
SHOWN_OF_SETS = ("count", "adjacent", "documents", "strength", "order_kinds", "orders")
"""What is shown beside the expression when nothing else is asked for."""
MOST_GAP = 4
"""Other words that can stand among those of a set, at most."""
MOST_OF_SETS = 4
"""Words of the largest sets when nothing else is asked for: the places to choose from grow with the gap."""
LONGEST_SHOWN = 6
"""Words of the longest expressions when nothing else is asked for."""
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
        Whether sequences that live inside a longer one are folded into it (and frames of which one filler takes up
        most are left out).
    slots : int
        0: words side by side. Else frames with 1 to so many open slots, each of one word.
    any_order : bool
        Sets of words instead, in whatever order they meet.
    gap : int
        Of sets: at most so many other words stand among theirs.
    pattern : str
        Only sequences of which at least half of the occurrences follow this pattern of word classes from end to end;
        see `colloc.answers.tagpatterns`.
    """

    layer: str | None = None
    where: Sequence[str] = ()
    inside: Inside | None = None
    min_words: int = 2
    max_words: int = LONGEST_SHOWN
    min_count: int = DEFAULT_MIN_COUNT
    min_docs: int | None = None
    names: Treatment = "drop"
    common: Treatment = "drop"
    fragments: Literal["fold", "keep"] = "fold"
    slots: int = 0
    any_order: bool = False
    gap: int = 0
    pattern: str | None = None
    rank: str = "strength"

    def __post_init__(self) -> None:
        if not 2 <= self.min_words <= self.max_words <= LONGEST:
            raise UsageError(
                f"expressions have 2 to {LONGEST} words, the least first: not {self.min_words} to {self.max_words}"
            )
        if not 0 <= self.slots <= MOST_WORDS - LONGEST:
            raise UsageError(f"an expression has 0 to {MOST_WORDS - LONGEST} open slots, not {self.slots}")
        if self.slots and self.rank in CONTIGUOUS_ONLY:
            raise UsageError(f"{self.rank} is not defined for expressions with open slots: rank by another column")
        if self.any_order and (self.slots or self.pattern is not None):
            raise UsageError("what stands in any order has neither open slots nor a pattern: give one of the three")
        if self.any_order and self.rank in NOT_OF_SETS:
            raise UsageError(f"{self.rank} is not defined for sets in any order: rank by another column")
        if self.gap and not self.any_order:
            raise UsageError("a gap is for what stands in any order; open slots of frames are asked for by slots")
        if not 0 <= self.gap <= MOST_GAP:
            raise UsageError(f"a gap has 0 to {MOST_GAP} words, not {self.gap}")
        if self.slots and self.pattern is not None:
            raise UsageError("a pattern of word classes leaves no slot open: give either a pattern or slots")
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

    def growing(self, store: Store, jobs: int | None, memory: int) -> AbstractContextManager[Grower]:
        """Where sequences are grown for these options; its files and processes end with it."""
        return growing(
            store,
            layer=self.layer,
            where=self.where,
            inside=self.inside,
            min_count=self.options.min_count,
            jobs=jobs,
            memory=memory,
        )

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
            "slots": chosen.slots or None,
            "any_order": chosen.any_order or None,
            "gap": chosen.gap if chosen.any_order else None,
            "pattern": chosen.pattern,
            "rank": chosen.rank,
        }


def resolve(store: Store, options: ExpressionOptions) -> Asked:
    """Options and store together."""
    built = built_spec(store)
    where = slices.canonical(options.where)
    documents = len(slices.fitting(store, where)) if where else document_count(store)
    fewest = min(FEWEST_DOCUMENTS, documents) if options.min_docs is None else options.min_docs
    return Asked(options, options.layer or built.layer, options.inside or built.inside, where, fewest)


def shown_columns(show: Sequence[str] | None, options: ExpressionOptions) -> list[str]:
    """The columns of an answer, in their order.

    Raises
    ------
    UsageError
        A name that is no column, or none of this kind of expression.
    """
    without: tuple[str, ...] = (*SETS_ONLY, *(CONTIGUOUS_ONLY if options.slots else FRAMES_ONLY))
    if options.any_order:
        without = NOT_OF_SETS
    elif options.pattern is None:
        without += PATTERNS_ONLY
    known = [name for name in COLUMNS if name not in without]
    if show is not None and "all" in show:
        return known
    for name in show or ():
        if name not in known:
            raise UsageError(f"no column {name!r} here: choose from all, {', '.join(known)}")
    usual: tuple[str, ...] = SHOWN_OF_FRAMES if options.slots else SHOWN_OF_SETS if options.any_order else SHOWN
    if options.pattern is not None:
        usual += PATTERNS_ONLY
    chosen = {"expression", options.rank, *(usual if show is None else show)}
    return [name for name in known if name in chosen]
