"""The text that annotated words were written as: readable, with the place of every word."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colloc.records import Int64Array, UInt8Array
from colloc.tokens.annotated.buffer import MASKS, Buffer, Slices, code_points_before, column_text, gather, having
from colloc.tokens.annotated.lines import Lines

PARAGRAPH_END = "\n\n"
"""Stands between paragraphs and between documents."""
_NO_SPACE = b"SpaceAfter=No"
_NEW_PARAGRAPH = b"NewPar=Yes"
_OPENERS = np.array([int.from_bytes(word, "little") for word in (b"newpar", b"newdoc")], np.uint64)
_OPENER = len(b"newpar")


@dataclass(frozen=True, slots=True)
class Surface:
    """Readable text of some words.

    Attributes
    ----------
    text : str
        Up to the last word's end, or the space behind it.
    starts, widths : int64 arrays, shape (n_words,)
        Code points; the words of a multiword token that are not spelled out one after the other all have its place.
    """

    text: str
    starts: Int64Array
    widths: Int64Array


def paragraph_starts(lines: Lines, misc: Misc | None) -> Int64Array:
    """Words that begin a paragraph: ``# newpar`` or ``# newdoc`` before their sentence, or ``NewPar=Yes`` in MISC."""
    marked = lines.before.words[_openers(lines.buffer, lines.before.lines)]
    found = [marked[marked < len(lines)], lines.part_words[lines.part_words < len(lines)]]
    if misc is not None:
        found.append(np.flatnonzero(having(misc.joined, misc.begins, _NEW_PARAGRAPH)))
    return np.unique(np.concatenate(found))


def _openers(buffer: Buffer, lines: Slices) -> NDArray[np.bool_]:
    """Which lines are comments that say that a paragraph, or a document, begins."""
    following = np.minimum(lines.starts + 1, len(buffer.bytes))
    words = following + (buffer.words[following] & MASKS[1] == ord(" "))
    head = buffer.words[words]
    ends = (head >> np.uint64(8 * _OPENER)) & MASKS[1]
    named = np.isin(head & MASKS[_OPENER], _OPENERS)
    opens: NDArray[np.bool_] = named & ((ends == ord(" ")) | (ends == ord("\n")))
    # Written with other spaces than one in front and one behind: looked at one by one.
    first = head & MASKS[1]
    unusual = (first <= ord(" ")) | (first >= 128) | (named & ~opens)
    for row in np.flatnonzero(unusual).tolist():
        start = int(lines.starts[row])
        comment = buffer.text(start + 1, start + int(lines.lengths[row]))
        opens[row] = comment.split(maxsplit=1)[:1] in (["newpar"], ["newdoc"])
    opens &= buffer.bytes[lines.starts] == ord("#")
    return opens


@dataclass(frozen=True, slots=True)
class Misc:
    """The fields of MISC, as `colloc.tokens.annotated.buffer.column_text` gives them."""

    joined: UInt8Array
    begins: Int64Array


def surface(lines: Lines, paragraphs: Int64Array, misc: Misc | None, goes_on: bool) -> Surface:
    """The words as they were written: a space behind each, unless ``SpaceAfter=No``; the last only if it ``goes_on``.

    Multiword tokens stand in place of their words.
    """
    form = lines.columns["form"]
    starts, sizes = form.starts.copy(), form.lengths.copy()
    gaps = np.ones(len(lines), np.int64)
    if misc is not None:
        gaps[having(misc.joined, misc.begins, _NO_SPACE)] = 0
    shared = _place_ranges(lines, starts, sizes, gaps)
    gaps[paragraphs[paragraphs > 0] - 1] = len(PARAGRAPH_END)
    if not goes_on:
        gaps[-1:] = 0
    # Behind a field there is room for a gap, to be overwritten: what divides it from the next, and that one's start.
    written, begins = gather(lines.buffer.bytes, Slices(starts, sizes + gaps))
    ends = begins + sizes
    written[ends[gaps == 1]] = ord(" ")
    for offset in range(len(PARAGRAPH_END)):
        written[ends[gaps == len(PARAGRAPH_END)] + offset] = ord(PARAGRAPH_END[offset])
    text = written.tobytes().decode("utf-8", "surrogatepass")
    if len(text) < len(written):
        begins = code_points_before(written, begins)
        ends = code_points_before(written, ends)
    widths = ends - begins
    for word, length in shared:
        begins[word : word + length], widths[word : word + length] = begins[word], widths[word]
    return Surface(text, begins, widths)


def _place_ranges(lines: Lines, starts: Int64Array, sizes: Int64Array, gaps: Int64Array) -> list[tuple[int, int]]:
    """Write multiword tokens in place of their words; tells those whose words share one place."""
    ranges, data = lines.ranges, lines.buffer.bytes
    if not len(ranges.words):
        return []
    begins = np.cumsum(ranges.lengths) - ranges.lengths
    words = np.repeat(ranges.words - begins, ranges.lengths)
    words += np.arange(len(words))
    no_space = np.zeros(len(ranges.words), bool)
    if "misc" in ranges.columns:
        no_space = having(*column_text(lines.buffer, ranges.columns["misc"]), _NO_SPACE)
    gaps[words] = 0
    gaps[ranges.words + ranges.lengths - 1] = ~no_space
    spelled = ranges.columns["form"]
    differing = np.add.reduceat(sizes[words], begins) != spelled.lengths
    alike = np.repeat(~differing, ranges.lengths)
    one, firsts = gather(data, spelled.only(~differing))
    other, _ = gather(data, Slices(starts[words[alike]], sizes[words[alike]]))
    if len(one):
        differing[~differing] = np.logical_or.reduceat(one != other, firsts)
    sizes[words[np.repeat(differing, ranges.lengths)]] = 0
    shared = ranges.words[differing]
    starts[shared], sizes[shared] = spelled.starts[differing], spelled.lengths[differing]
    return [*zip(shared.tolist(), ranges.lengths[differing].tolist(), strict=True)]
