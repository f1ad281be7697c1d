"""From text to word tokens, sentences and paragraphs: UAX #29 and the tailoring that the settings ask for."""

from __future__ import annotations

import numpy as np

from colloc.kernels.characters import first_from
from colloc.kernels.switch import compiled
from colloc.records import Int64Array, Segments
from colloc.settings import SegmentSettings
from colloc.tokens.addresses import find_addresses
from colloc.tokens.arrays import any_within, distinct
from colloc.tokens.classes import Kinds, Points, classes, code_points, kinds_of
from colloc.tokens.dictionaries import check_library, dictionary_words, find_runs
from colloc.tokens.patterns import compiled as compiled_pattern
from colloc.tokens.patterns import pattern_tokens
from colloc.tokens.sentences import sentence_breaks
from colloc.tokens.signs import find_marks, find_tags
from colloc.tokens.words import HYPHENS, word_tokens

_Spans = tuple[Int64Array, Int64Array]


class Segmenter:
    """Segments stretches of text in one way.

    Without tailoring a token is a segment between word boundaries that holds a
    letter or a digit (general category L or N). See ``SegmentSettings`` for what
    is laid on top of that. A user's pattern replaces words, hyphens and
    addresses; ``numbers``, ``max_token`` and sentences work as ever. A pattern and
    ``max_token`` hold without tailoring, too.
    """

    def __init__(self, settings: SegmentSettings) -> None:
        """Raises ``UsageError`` for a wrong token pattern, ``MissingExtraError`` where ICU is needed and not there."""
        self.settings = settings
        if settings.pattern is not None:
            compiled_pattern(settings.pattern)
        if settings.scripts == "dictionary":
            check_library()

    def segment(self, text: str, following: str = "", opening: bool = True) -> Segments:
        """Tokens, sentences and paragraphs of one stretch.

        Parameters
        ----------
        text : str
            The stretch: a document, or a part of one that ends where ``safe_cut`` says.
        following : str
            What comes next in the document, of which the first code point counts; empty at its end.
        opening : bool
            Whether a sentence and a paragraph begin at the start of `text`: True at the start
            of a document, else ``closed`` of the stretch before.

        Raises
        ------
        DataError
            Where a user's pattern takes too long.
        """
        settings = self.settings
        points = code_points(text + following[:1])
        kinds = kinds_of(points)
        line_ends = settings.line_ends if settings.tailored else "paragraph"
        breaks = sentence_breaks(kinds, points, line_ends, settings.tailored and settings.abbreviations)
        sentence_starts, paragraph_starts = breaks.sentences, breaks.paragraphs
        if settings.pattern is not None:
            inner = paragraph_starts[paragraph_starts < len(text)]
            starts, ends = pattern_tokens(text, settings.pattern, inner)
        else:
            addresses = _no_spans()
            if settings.tailored and settings.addresses != "split":
                addresses = find_addresses(text, points)
                sentence_starts = _outside(sentence_starts, addresses)
            starts, ends = self._words(text, points, kinds, addresses)
            starts, ends = _clipped(starts, ends, len(text))
        if settings.tailored and settings.numbers == "drop":
            letter = classes().letter
            lettered = letter[kinds[starts]]
            others = np.flatnonzero(~lettered)
            lettered[others] = any_within(kinds, letter, starts[others], ends[others])
            starts, ends = starts[lettered], ends[lettered]
        lengths = ends - starts
        dropped = 0
        if len(lengths) and int(lengths.max()) > settings.max_token:
            short = lengths <= settings.max_token
            dropped = len(short) - int(np.count_nonzero(short))
            starts, ends = starts[short], ends[short]
        sentence_starts = sentence_starts[sentence_starts <= len(text)]
        paragraph_starts = paragraph_starts[paragraph_starts <= len(text)]
        last_start = int(starts[-1]) if len(starts) else -1
        ended = not following or (len(sentence_starts) > 0 and int(sentence_starts[-1]) > last_start)
        return Segments(
            text=text,
            starts=starts,
            ends=ends,
            sentences=_first_tokens(starts, sentence_starts, opening),
            paragraphs=_first_tokens(starts, paragraph_starts, opening),
            closed=ended or (opening and not len(starts)),
            dropped=dropped,
            points=points[: len(text)],
        )

    def _words(self, text: str, points: Points, kinds: Kinds, addresses: _Spans) -> _Spans:
        settings = self.settings
        hyphens: Int64Array | None = None
        if settings.tailored and settings.hyphens == "keep":
            found = points == HYPHENS[0]
            if points.dtype != np.uint8:
                found |= (points == HYPHENS[1]) | (points == HYPHENS[2])
            hyphens = np.flatnonzero(found)
        words = word_tokens(kinds, hyphens)
        if settings.tailored and settings.scripts == "dictionary":
            runs = find_runs(points[: len(text)])
            if len(runs[0]):
                between = _with_addresses(kinds, hyphens, words, runs, False)
                words = _merged(between, dictionary_words(text, kinds, *runs))
        if settings.tailored and settings.hashtags == "keep":
            tags = find_tags(points)
            outside = _outside(tags[0], addresses)
            apart = np.isin(tags[0], outside)
            words = _with_addresses(kinds, hyphens, words, (tags[0][apart], tags[1][apart]), True)
        if len(addresses[0]):
            words = _with_addresses(kinds, hyphens, words, addresses, settings.addresses == "keep")
        if settings.tailored and settings.punctuation == "keep":
            words = _merged(words, find_marks(points[: len(text)], *words))
        return words


def _merged(some: _Spans, others: _Spans) -> _Spans:
    """Spans of both, ascending; none may overlap another."""
    starts = np.concatenate((some[0], others[0]))
    order = np.argsort(starts, kind="stable")
    return starts[order], np.concatenate((some[1], others[1]))[order]


def _no_spans() -> _Spans:
    return np.zeros(0, np.int64), np.zeros(0, np.int64)


def _outside(positions: Int64Array, spans: _Spans) -> Int64Array:
    """Positions that are not strictly inside one of the spans."""
    starts, ends = spans
    if not len(starts):
        return positions
    nearest = np.searchsorted(starts, positions) - 1
    inside = (nearest >= 0) & (positions < ends[np.maximum(nearest, 0)])
    return positions[~inside]


def _with_addresses(kinds: Kinds, hyphens: Int64Array | None, words: _Spans, addresses: _Spans, keep: bool) -> _Spans:
    """Words with those that touch an address taken out, and the addresses put in where they are kept.

    What such a word has outside the address is segmented by itself.
    """
    starts, ends = words
    first, last = addresses
    overlapped_from = np.searchsorted(ends, first, "right")
    overlapped_to = np.searchsorted(starts, last, "left")
    depth = np.zeros(len(starts) + 1, np.int64)
    np.add.at(depth, overlapped_from, 1)
    np.add.at(depth, overlapped_to, -1)
    untouched = np.cumsum(depth)[:-1] == 0
    parts = [(starts[untouched], ends[untouched])]
    if keep:
        parts.append(addresses)
    free = np.append(first, len(kinds))
    for index, (low, high) in enumerate(zip(overlapped_from.tolist(), overlapped_to.tolist(), strict=True)):
        if low == high:
            continue
        previous_end = int(last[index - 1]) if index else 0
        for begin, end in (
            (max(int(starts[low]), previous_end), int(first[index])),
            (int(last[index]), min(int(ends[high - 1]), int(free[index + 1]))),
        ):
            if begin < end:
                inside = None if hyphens is None else hyphens[(hyphens >= begin) & (hyphens < end)] - begin
                parts.append(tuple(edge + begin for edge in word_tokens(kinds[begin:end], inside)))  # type: ignore[arg-type]
    all_starts = np.concatenate([part[0] for part in parts])
    all_ends = np.concatenate([part[1] for part in parts])
    # A word between two addresses is a remnant of both.
    all_starts, order = np.unique(all_starts, return_index=True)
    return all_starts, all_ends[order]


def _clipped(starts: Int64Array, ends: Int64Array, length: int) -> _Spans:
    """Tokens of the stretch itself, without the code point that follows it."""
    if len(ends) and int(ends[-1]) > length:
        count = int(np.searchsorted(starts, length))
        return starts[:count], np.minimum(ends[:count], length)
    return starts, ends


def _first_tokens(starts: Int64Array, breaks: Int64Array, opening: bool) -> Int64Array:
    """Numbers of the tokens that come first after a break, and of token 0 where `opening`."""
    if compiled():
        if opening:
            breaks = np.concatenate((np.zeros(1, np.int64), breaks))
        numbers = np.empty(len(breaks), np.int64)
        return numbers[: first_from(starts, breaks, numbers)]
    found = np.searchsorted(starts, breaks)
    if opening:
        found = np.concatenate((np.zeros(1, np.int64), found))
    return distinct(found[: np.searchsorted(found, len(starts))])
