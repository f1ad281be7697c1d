"""Running text rewritten with its expressions joined."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colloc.answers.joining.layers import layer_of_listed, layer_of_words
from colloc.answers.joining.listed import Expression, brought_to_layer
from colloc.answers.joining.matching import Matches, Trie, chosen
from colloc.records import Int64Array, Segments
from colloc.settings import SegmentSettings
from colloc.tokens.classes import code_points
from colloc.tokens.cutting import safe_cut
from colloc.tokens.numbering import TypeNumberer
from colloc.tokens.segmenter import Segmenter

STRETCH = 1 << 20
"""Characters worked on at a time."""
_FORMS_KEPT = 256 * 2**20
"""Bytes that the known word forms may take before they are forgotten."""
BETWEEN = "\u2029"
"""Put between texts that are segmented together: no word, sentence or expression reaches across it."""
_SPACES = tuple(
    point
    for point in range(0x3001)
    if chr(point).isspace() and chr(point) not in "\n\r\v\f\x1c\x1d\x1e\x85\u2028\u2029"
)
_LINE_ENDS = (0x0A, 0x0B, 0x0C, 0x0D, 0x85, 0x2028)


@dataclass(frozen=True, slots=True)
class Joined:
    """One text rewritten.

    Attributes
    ----------
    text : str
    spans : int64 array, shape (n, 4)
        For each expression: start and end in the old text, start and end in the new one, in code points.
    numbers : int64 array, shape (n,)
        Which expression.
    """

    text: str
    spans: Int64Array
    numbers: Int64Array


class Joiner:
    """Joins expressions in texts.

    Parameters
    ----------
    expressions : sequence of Expression
    settings : SegmentSettings
        How text becomes words.
    layer : str
        What words are compared by: ``form``, ``fold``, or, where the settings name a dictionary of lemmas, ``lemma``
        or ``lemma_fold``.
    joiner : str
        Put in place of the space between two words.
    across_lines : bool
        Also where one line end stands between two words, which then is lost.

    Raises
    ------
    UsageError
        Where running text has no such layer.
    """

    def __init__(
        self,
        expressions: Sequence[Expression],
        settings: SegmentSettings,
        *,
        layer: str = "fold",
        joiner: str = "_",
        across_lines: bool = False,
    ) -> None:
        self._called = layer_of_words(layer, settings)
        self.expressions = brought_to_layer(expressions, layer_of_listed(layer, settings))
        self.settings = settings
        self._joiner = joiner
        self._trie = Trie(self.expressions)
        self._segmenter = Segmenter(settings)
        self._numberer = TypeNumberer()
        self._forms = np.zeros(0, np.int64)
        self._blank = np.zeros(0x110000, bool)
        self._blank[list(_SPACES)] = True
        self._across_lines = across_lines
        self._line_end = np.zeros(0x110000, bool)
        self._line_end[list(_LINE_ENDS)] = True

    def join(self, text: str) -> Joined:
        """One text, or a stretch of one that ends at a safe cut."""
        segments = self._segmenter.segment(text)
        matches = self._matches(segments)
        firsts = matches.starts
        lasts = firsts + matches.lengths - 1
        # The gaps inside a match, one after the other.
        counts = matches.lengths - 1
        inner = np.repeat(firsts - np.concatenate([[0], np.cumsum(counts)[:-1]]), counts) + np.arange(counts.sum())
        gap_starts, gap_ends = segments.ends[inner], segments.starts[inner + 1]
        growth = np.concatenate([[0], np.cumsum(len(self._joiner) - (gap_ends - gap_starts))])
        begins = np.concatenate([[0], np.cumsum(counts)])
        old = (segments.starts[firsts], segments.ends[lasts])
        spans = np.stack([*old, old[0] + growth[begins[:-1]], old[1] + growth[begins[1:]]], axis=1)
        return Joined(self._rewritten(text, gap_starts, gap_ends), spans.astype(np.int64), matches.numbers)

    def join_many(self, texts: Sequence[str]) -> list[Joined]:
        """Several texts, segmented together: much quicker for short ones."""
        if any(BETWEEN in text for text in texts) or len(texts) == 1:
            return [self.join(text) for text in texts]
        whole = self.join(BETWEEN.join(texts))
        parts = whole.text.split(BETWEEN)
        offsets = np.concatenate([[0], np.cumsum([len(text) + 1 for text in texts])])
        new_offsets = np.concatenate([[0], np.cumsum([len(part) + 1 for part in parts])])
        cuts = np.searchsorted(whole.spans[:, 0], offsets)
        return [
            Joined(
                part,
                whole.spans[cuts[place] : cuts[place + 1]] - np.repeat([offsets[place], new_offsets[place]], 2),
                whole.numbers[cuts[place] : cuts[place + 1]],
            )
            for place, part in enumerate(parts)
        ]

    def join_stream(self, pieces: Iterable[str]) -> Iterator[Joined]:
        """One long text in pieces cut anywhere; spans are those of the whole text."""
        old = new = 0
        for stretch in self._stretches(pieces):
            joined = self.join(stretch)
            yield Joined(joined.text, joined.spans + np.repeat([old, new], 2), joined.numbers)
            old, new = old + len(stretch), new + len(joined.text)

    def _stretches(self, pieces: Iterable[str]) -> Iterator[str]:
        waiting = ""
        for piece in pieces:
            waiting += piece
            place = 0
            while len(waiting) - place >= STRETCH:
                cut = self._cut(waiting[place : place + 2 * STRETCH]) or self._cut(waiting[place:])
                if not cut:
                    break
                yield waiting[place : place + cut]
                place += cut
            waiting = waiting[place:]
        if waiting:
            yield waiting

    def _cut(self, text: str) -> int:
        """After a line end where nothing is joined across it; where it is, after a blank line."""
        if not self._across_lines:
            line = text.rfind("\n") + 1
            if line and self.settings.pattern is None:
                return line
        return safe_cut(text, self.settings)

    def _matches(self, segments: Segments) -> Matches:
        words = self._words(segments)
        linked = self._linked(segments)
        return chosen(self._trie.find(words, linked), self._trie.scores)

    def _words(self, segments: Segments) -> Int64Array:
        """Each word's number in the trie."""
        if self._numberer.nbytes > _FORMS_KEPT:
            self._numberer.reset()
            self._forms = np.zeros(0, np.int64)
        local = self._numberer.number(segments)
        fresh = self._numberer.take_new()
        known = self._trie.word_numbers
        numbers = [known.get(self._called(form), 0) for form in fresh]
        self._forms = np.concatenate([self._forms, np.array(numbers, np.int64)])
        return self._forms[local]

    def _linked(self, segments: Segments) -> NDArray[np.bool]:
        """Whether only blanks stand between a word and the next one."""
        points = code_points(segments.text)
        starts, ends = segments.starts[1:], segments.ends[:-1]
        linked = np.zeros(len(segments), bool)
        if not len(starts):
            return linked
        # Nearly always one space; what is wider is added up.
        blank = self._blank[points]
        linked[:-1] = (starts == ends + 1) & blank[np.minimum(ends, len(points) - 1)]
        others = np.flatnonzero((starts != ends + 1) | ~linked[:-1])
        others = others[starts[others] > ends[others]]
        lines = self._line_end[points]
        blanks = np.concatenate([[0], np.cumsum(blank, dtype=np.int32)])
        breaks = np.concatenate([[0], np.cumsum(lines & (points != 0x0D), dtype=np.int32)])
        returns = np.concatenate([[0], np.cumsum(points == 0x0D, dtype=np.int32)])
        low, high = ends[others], starts[others]
        n_breaks = breaks[high] - breaks[low]
        n_lines = n_breaks + returns[high] - returns[low]
        filled = blanks[high] - blanks[low] + n_lines == high - low
        allowed = (n_lines == 0) | ((n_breaks <= 1) & (n_lines - n_breaks <= 1) if self._across_lines else False)
        linked[others] = filled & allowed
        return linked

    def _rewritten(self, text: str, gap_starts: Int64Array, gap_ends: Int64Array) -> str:
        pieces = []
        done = 0
        for start, end in zip(gap_starts.tolist(), gap_ends.tolist(), strict=True):
            pieces.append(text[done:start])
            done = end
        pieces.append(text[done:])
        return self._joiner.join(pieces)
