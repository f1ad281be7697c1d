"""Annotated batches into the arrays that segmenting makes of plain text, with columns of annotation beside them."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colloc.records import Annotation, Int64Array
from colloc.store.annotation import HEAD, STEP, WIDTH, OtherLines, pack_rest
from colloc.tokens.annotated.reading import Words

Arrays = dict[str, NDArray[Any]]


@dataclass(frozen=True, slots=True)
class Annotations:
    """What an annotated batch has beside its tokens; nothing where the text is plain.

    Attributes
    ----------
    columns : dict of arrays, shape (n_tokens,)
    values : dict of list of str
        What the numbers of a column stand for, where they stand for something.
    rests : list of bytes
        What fits in no column, one an entry; none where texts are not kept.
    """

    columns: Arrays = field(default_factory=dict)
    values: dict[str, list[str]] = field(default_factory=dict)
    rests: list[bytes] = field(default_factory=list)


def annotations_of(words: Words, annotation: Annotation, keep_text: bool) -> Annotations:
    """Columns, values and rests of words that were read."""
    columns: Arrays = {name: narrow(numbers) for name, (numbers, _) in words.values.items()}
    if words.heads is not None:
        columns[HEAD] = words.heads
    rests = []
    if keep_text:
        columns[STEP] = np.diff(words.starts, prepend=words.starts[:1]).astype(np.int32)
        columns[WIDTH] = narrow(words.widths)
        rests = [
            pack_rest(annotation.columns, one.texts, OtherLines(*one.before), OtherLines(*one.after), one.changed)
            for one in words.remainders
        ]
    return Annotations(columns, {name: values for name, (_, values) in words.values.items()}, rests)


def sentence_anchors(words: Words, every: int) -> Int64Array:
    """Words where showing text can begin: sentences about ``every`` words apart, and all that begin an entry."""
    stretch = words.sentences // every
    spaced = words.sentences[np.diff(stretch, prepend=-1) > 0]
    return np.union1d(spaced, words.part_words[words.part_words < len(words)])


def narrow(numbers: NDArray[Any]) -> NDArray[Any]:
    """Numbers from 0 on in as few bytes as hold them."""
    largest = int(numbers.max(initial=0))
    kind = np.uint8 if largest < 2**8 else np.uint16 if largest < 2**16 else np.uint32
    return numbers.astype(kind)
