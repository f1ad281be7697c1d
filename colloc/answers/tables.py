"""From a tally and a margins convention to contingency tables: the only place that does it.

Three conventions (all from unfiltered counts; thresholds act on what is shown):

``pairs``
    The observation is a pair of tokens. Directed: M with its own row and column
    sums. Symmetric: S = M + transpose(M), the margins are the row sums of S and
    the total is twice the number of pairs; for x = y all four are halved, so
    that neither the expected count nor G2 counts anything twice.
``positions``
    The observation is a token: joint = tokens of x with at least one y in
    reach, first_total = f(x), second_total = tokens with a y in reach,
    total = tokens. Never symmetric.
``tokens``
    p(x, y) = S / T beside p(x) = f(x) / N. The table is given on the scale of
    T: first_total = f(x)·T/N, so that log2(joint·total / (first·second)) is
    log2((S/T) / (f(x) f(y) / N²)). With ``spanned=False`` S is divided by N
    instead, as in Church & Hanks (1990), Table 3. Only measures that need no
    cells may be asked of it.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal, Protocol, cast

import numpy as np

from colloc.errors import UsageError
from colloc.records import FloatArray, Int64Array, PairBlock, UInt32Array, WordCounts
from colloc.settings import Margins, TallySpec
from colloc.store.tallies import Tally

Counts = Int64Array | FloatArray

Side = Literal["both", "left", "right"]
"""Which side of the first word the second stands on."""

TOKEN_MARGIN_MEASURES = ("pmi", "npmi", "ppmi", "pmi2", "pmi3")
"""The PMI family: all that the ``tokens`` convention can bear."""


@dataclass(frozen=True, slots=True)
class PairTable:
    """Contingency tables of many pairs.

    Attributes
    ----------
    first, second : uint32 arrays, shape (n,)
        Terms.
    joint : int64 array, shape (n,); float64 where counts are weighted
    first_total, second_total, total : int64 or float64 arrays, shape (n,)
        The margins and the total of each pair's own table.
    """

    first: UInt32Array
    second: UInt32Array
    joint: Int64Array
    first_total: Int64Array | FloatArray
    second_total: Int64Array | FloatArray
    total: Int64Array | FloatArray

    def __len__(self) -> int:
        return len(self.first)

    def take(self, index: np.ndarray) -> PairTable:
        """The rows chosen by a mask or by row numbers."""
        return PairTable(*(getattr(self, name)[index] for name in _FIELDS))

    @property
    def arguments(self) -> tuple[FloatArray | Int64Array, ...]:
        """joint, first_total, second_total, total: what measures take."""
        return self.joint, self.first_total, self.second_total, self.total


_FIELDS = ("first", "second", "joint", "first_total", "second_total", "total")


def joined(tables: list[PairTable]) -> PairTable:
    """Several tables as one; needs at least one."""
    return PairTable(*(np.concatenate([getattr(table, name) for table in tables]) for name in _FIELDS))


@dataclass(frozen=True, slots=True)
class Convention:
    """How cells of a tally become tables.

    Parameters
    ----------
    margins : {"pairs", "positions", "tokens"}
    directed : bool
        Whether (x, y) and (y, x) are two questions.
    spanned : bool
        For ``tokens``: divide S by the sum of the table (True) or by N (False).
    """

    margins: Margins = "pairs"
    directed: bool = False
    spanned: bool = True

    def check(self, kind: str) -> None:
        """Raise UsageError where a tally of this kind cannot be read this way."""
        if (self.margins == "positions") != (kind == "positions"):
            raise UsageError(f"margins {self.margins!r} cannot be read from a tally of kind {kind!r}")
        if kind == "unit" and self.directed:
            raise UsageError("units that hold both words have no direction: leave out directed")
        if kind == "unit" and self.margins == "tokens":
            raise UsageError("units are counted with their own margins: use margins pairs")
        if not self.spanned and self.margins != "tokens":
            raise UsageError("no-span goes with margins tokens only")

    def check_measures(self, names: tuple[str, ...]) -> None:
        """Raise UsageError for a measure that this convention cannot bear."""
        if self.margins != "tokens":
            return
        for name in names:
            if name not in TOKEN_MARGIN_MEASURES:
                raise UsageError(
                    f"measure {name!r} needs the cells of a table, which margins tokens does not have: "
                    f"use margins pairs or positions, or one of {', '.join(TOKEN_MARGIN_MEASURES)}"
                )


class Totals(Protocol):
    """What a table is made with besides its joint count: a `Tally`, `Sums` of some documents, or weighted sums."""

    @property
    def spec(self) -> TallySpec: ...
    @property
    def total(self) -> int | float: ...
    @property
    def first(self) -> Int64Array | FloatArray: ...
    @property
    def second(self) -> Int64Array | FloatArray: ...


@dataclass(frozen=True, slots=True)
class Sums:
    """Row and column sums by number of the word, and the sum of all; as a tally of ``spec`` has them."""

    spec: TallySpec
    total: int | float
    first: Int64Array | FloatArray
    second: Int64Array | FloatArray


class TableMaker:
    """Makes the tables of joint counts by one convention.

    Parameters
    ----------
    totals : Totals
    convention : Convention
    words : WordCounts or None
        Frequencies of the same words in the same documents; needed for ``tokens`` only.
    """

    def __init__(self, totals: Totals, convention: Convention, words: WordCounts | None = None) -> None:
        self.spec = totals.spec
        kind = self.spec.kind
        convention.check(kind)
        self.convention = convention
        self._totals = totals
        self._first: Int64Array | FloatArray
        self._second: Int64Array | FloatArray
        self.total: int | float
        self.ordered = convention.directed or kind in ("positions", "span", "relation")
        """Whether (x, y) and (y, x) are separate rows."""
        if convention.margins == "tokens":
            if words is None:
                raise UsageError("margins tokens needs word frequencies")
            self._set_token_margins(words)
        elif kind == "unit" or self.ordered:
            # A unit is one observation, so its margins are not row sums and nothing is doubled.
            self._first, self._second, self.total = totals.first, totals.second, totals.total
        else:
            both = totals.first + totals.second
            self._first, self._second, self.total = both, both, 2 * totals.total

    def _set_token_margins(self, words: WordCounts) -> None:
        tokens = int(words.tokens.sum())
        cells = self._totals.total if self.ordered else 2 * self._totals.total
        self.total = cells if self.convention.spanned else tokens
        scaled = words.tokens.astype(np.float64) * (self.total / tokens if tokens else 0.0)
        self._first, self._second = scaled, scaled

    def counted(self, first: UInt32Array, second: UInt32Array, joint: Counts, side: Side = "both") -> PairTable:
        """The tables of pairs whose joint counts are known.

        Parameters
        ----------
        joint : int64 array, shape (n,)
            Ordered: the cells [first, second]. With a side: the cells of the side of ``first`` that ``second``
            stands on. Otherwise both cells of a pair together.
        """
        counts = cast(Int64Array, joint)
        if self.spec.kind == "unit":
            return self._plain(first, second, counts)
        if self.ordered or side == "right":
            return self._directed(first, second, counts)
        return self._mirrored(first, second, counts) if side == "left" else self._symmetric(first, second, counts)

    def first_totals(self) -> Int64Array | FloatArray:
        """First margin of every term (before halving on the diagonal)."""
        return self._first

    def second_totals(self) -> Int64Array | FloatArray:
        """Second margin of every term."""
        return self._second

    def _plain(self, first: UInt32Array, second: UInt32Array, joint: Int64Array) -> PairTable:
        total = np.full(len(first), self.total)
        return PairTable(first, second, joint, self._first[first], self._second[second], total)

    def _directed(self, first: UInt32Array, second: UInt32Array, joint: Int64Array) -> PairTable:
        return self._one_sided(first, second, joint, self._totals.first, self._totals.second)

    def _mirrored(self, first: UInt32Array, second: UInt32Array, joint: Int64Array) -> PairTable:
        return self._one_sided(first, second, joint, self._totals.second, self._totals.first)

    def _one_sided(
        self,
        first: UInt32Array,
        second: UInt32Array,
        joint: Int64Array,
        rows: Int64Array | FloatArray,
        columns: Int64Array | FloatArray,
    ) -> PairTable:
        """Cells of M (or of its transpose) with their own margins."""
        if self.convention.margins == "tokens":
            table = self._plain(first, second, joint)
            if self.ordered or not self.convention.spanned:
                return table
            # The scale of T is halved with the table: M has half the sum of S.
            halves = (table.first_total / 2, table.second_total / 2, table.total / 2)
            return PairTable(first, second, joint, *halves)
        total = np.full(len(first), self._totals.total)
        return PairTable(first, second, joint, rows[first], columns[second], total)

    def _symmetric(self, first: UInt32Array, second: UInt32Array, joint: Int64Array) -> PairTable:
        table = self._plain(first, second, joint)
        same = first == second
        if self.convention.margins == "tokens":
            # S[x, x] is twice the number of pairs; p(x, y) = S / T holds on the diagonal as it stands.
            table.joint[same] *= 2
            return table
        if same.any():
            # Halved: S[x,x]/2 is the stored forward count, R(x)/2 = (row + column)/2, T/2.
            first_total = table.first_total.astype(np.float64)
            second_total = table.second_total.astype(np.float64)
            total = table.total.astype(np.float64)
            for margin in (first_total, second_total, total):
                margin[same] /= 2
            return PairTable(first, second, joint, first_total, second_total, total)
        return table


class TableReader(TableMaker):
    """Reads one tally by one convention.

    Parameters
    ----------
    tally : Tally
    convention : Convention
    words : WordCounts or None
        Frequencies of the layer in the tally's slice; needed for ``tokens`` only.
    """

    def __init__(self, tally: Tally, convention: Convention, words: WordCounts | None = None) -> None:
        super().__init__(tally, convention, words)
        self.tally = tally

    def blocks(self) -> Iterator[PairTable]:
        """All pairs of the tally, a bounded stretch at a time."""
        for block in self.tally.blocks():
            yield self.table(block)

    def around(self, term: int, side: Side = "both") -> PairTable:
        """Every pair with ``term``, which is put first.

        Parameters
        ----------
        side : {"both", "left", "right"}
            Which side of the term the others stand on. ``left`` reads the cells
            [other, term], so the term's margin is then its column sum.
        """
        block = self.tally.around(term)
        term_is_low = block.low == term
        other = np.where(term_is_low, block.high, block.low)
        after = np.where(term_is_low, block.forward, block.backward)
        before = np.where(term_is_low, block.backward, block.forward)
        same = block.low == block.high
        before = np.where(same, block.forward, before)
        terms = np.full(len(other), term, dtype=np.uint32)
        if side == "right" or (side == "both" and self.ordered):
            return self._directed(terms, other, after)
        if side == "left":
            return self._mirrored(terms, other, before)
        return self._symmetric(terms, other, block.forward + block.backward)

    def table(self, block: PairBlock) -> PairTable:
        """The tables of a block of cells.

        Unordered pairs stand in the order in which they are met more often.
        """
        if self.tally.spec.kind == "unit":
            return self._plain(block.low, block.high, block.forward)
        if self.ordered:
            # What was met in one direction only is no row of the other.
            on, off = block.forward != 0, (block.low != block.high) & (block.backward != 0)
            return joined(
                [
                    self._directed(block.low[on], block.high[on], block.forward[on]),
                    self._directed(block.high[off], block.low[off], block.backward[off]),
                ]
            )
        swap = block.backward > block.forward
        first = np.where(swap, block.high, block.low)
        second = np.where(swap, block.low, block.high)
        return self._symmetric(first, second, block.forward + block.backward)

    def given(self, first: UInt32Array, second: UInt32Array) -> PairTable:
        """The tables of given pairs, in their order; a joint count of 0 where never together."""
        low, high = np.minimum(first, second), np.maximum(first, second)
        block = self.tally.pairs(low, high)
        forward = np.where(first <= second, block.forward, block.backward)
        if self.tally.spec.kind == "unit":
            return self._plain(first, second, block.forward)
        if self.ordered:
            return self._directed(first, second, forward)
        return self._symmetric(first, second, block.forward + block.backward)
