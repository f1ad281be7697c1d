"""Lines of text around a word, a phrase or a pattern: a concordance."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.concordance import finding, matching
from colloc.answers.concordance.choosing import choose
from colloc.answers.concordance.finding import Hits
from colloc.answers.concordance.ordering import LineOrder, first_of_each_document, ordered
from colloc.answers.concordance.passages import Passage, PassageReader, read_many
from colloc.answers.questions import PairOptions, built_spec, chosen_spec
from colloc.errors import NotSeenError, UsageError
from colloc.records import Int64Array
from colloc.settings import LARGEST_WINDOW, TallySpec
from colloc.store import slices
from colloc.store.connection import Store

CONTEXT = 20
"""Words shown on either side unless told otherwise."""
OWN_COLUMNS = ("document", "token", "character", "before", "match", "after", "partner", "partner_character", "distance")


@dataclass(frozen=True, slots=True)
class Line:
    """One place in the text, as it is shown.

    Attributes
    ----------
    passage : Passage
    place, length : int
        The match: tokens of the stream.
    partner, partner_length : int
        The second expression; -1 where none was asked for.
    distance : int
        Words from one to the other, negative where the second stands before.
    """

    passage: Passage
    place: int
    length: int
    partner: int
    partner_length: int
    distance: int


def reach_of(store: Store, options: PairOptions) -> TallySpec:
    """The reach of a second expression, as the options say or as the store was built."""
    spec = chosen_spec(options, built_spec(store), "positions")
    if spec.kind == "unit":
        return TallySpec(
            layer=spec.layer,
            kind="positions",
            left=LARGEST_WINDOW,
            right=LARGEST_WINDOW,
            inside=spec.inside,
            where=spec.where,
        )
    if spec.kind == "relation":
        raise UsageError(
            "lines look for words within reach of each other, not for relations: give window, or left and right"
        )
    return spec


def lines(
    store: Store,
    first: str,
    second: str | None = None,
    *,
    options: PairOptions | None = None,
    sort: LineOrder = "text",
    seed: int = 0,
    best: bool = False,
    one_per_document: bool = False,
    context: int = CONTEXT,
    sentences: bool = False,
    limit: int = 50,
) -> Columns:
    """Lines that hold ``first``, with ``second`` in reach where it is given.

    Parameters
    ----------
    first, second : str
        A word, several words that follow each other, or words with ``*`` for any characters (``*`` alone is any word).
    options : PairOptions
        layer, window or left and right (words between the nearest ends), inside, where.
    sort : {"text", "document", "before", "after", "random"}
    seed : int
        Of the random order.
    best : bool
        Only good example sentences, best first (`colloc.answers.concordance.choosing`), instead of ``sort``.
    one_per_document : bool
        The first line of each document in that order.
    context : int
        Words shown on either side; with ``sentences`` the whole sentence instead.
    limit : int
        Lines; 0 for all.

    Returns
    -------
    Columns
        document, token and character (of the match, in the document, from 0), the metadata, before, match and after:
        together a verbatim stretch of the document. With ``second`` also partner (its text), partner_character and
        distance (words, negative where it stands before). ``settings["found"]`` is how many lines there are in all.

    Raises
    ------
    NotSeenError
        When a word is unknown, or nothing is found.
    UsageError
        When the store keeps no text.
    """
    options = options or PairOptions()
    if context < 0:
        raise UsageError(f"context must be at least 0 words, not {context}")
    spec = reach_of(store, options)
    reader = PassageReader(store)
    hits = _hits(store, spec, first, second)
    if best:
        chosen = choose(store, reader, hits, spec.layer, limit, seed)
    else:
        chosen = ordered(store, reader, hits, sort, spec.layer, seed, 0 if one_per_document else limit)
        if one_per_document:
            chosen = chosen[first_of_each_document(hits.documents[chosen])]
    shown = read_lines(reader, hits.take(chosen[: limit or None]), context, sentences or best)
    settings: dict[str, Any] = {
        "store": str(store.path),
        "layer": spec.layer,
        "first": first,
        "second": second,
        "left": spec.left if second is not None else None,
        "right": spec.right if second is not None else None,
        "inside": spec.inside,
        "where": spec.where,
        "sort": "best" if best else sort,
        "seed": seed if sort == "random" or best else None,
        "one_per_document": one_per_document,
        "sentences": sentences or best,
        "found": len(hits),
        "in_documents": len(np.unique(hits.documents)),
        "shown": len(shown),
    }
    return as_columns(store, shown, settings, paired=second is not None)


def _hits(store: Store, spec: TallySpec, first: str, second: str | None) -> Hits:
    search = matching.prepare(store, spec.layer, [first] if second is None else [first, second])
    hits = finding.find(store, search, left=spec.left, right=spec.right, inside=spec.inside, where=spec.where)
    if not len(hits):
        place = f" in documents where {spec.where}" if spec.where else ""
        near = "" if second is None else f" with {second!r} {spec.left} words before to {spec.right} after"
        raise NotSeenError(
            f"{store.path}: {first!r}{near} never occurs inside one {spec.inside}{place}; "
            "try a wider window, `--inside document`, or `*` for any characters"
        )
    return hits


def read_lines(reader: PassageReader, hits: Hits, context: int, sentences: bool) -> list[Line]:
    """The text of some hits, in their order."""
    spans = []
    for place, document, partner in zip(
        hits.places.tolist(), hits.documents.tolist(), hits.partners.tolist(), strict=True
    ):
        first, stop = place, place + hits.length
        if partner >= 0:
            first, stop = min(first, partner), max(stop, partner + hits.partner_length)
        if sentences:
            first, stop = reader.sentence(first, stop - first, document)
        else:
            first, stop = min(first, place - context), max(stop, place + hits.length + context)
        spans.append((first, stop, document))
    passages = read_many(reader, spans)
    rows = zip(passages, hits.places.tolist(), hits.partners.tolist(), hits.distances.tolist(), strict=True)
    return [
        Line(passage, place, hits.length, partner, hits.partner_length, distance)
        for passage, place, partner, distance in rows
    ]


def as_columns(store: Store, shown: Sequence[Line], settings: dict[str, Any], *, paired: bool) -> Columns:
    """Lines as the columns of :func:`lines`."""
    spans = [line.passage.span(line.place, line.length) for line in shown]
    rows = list(zip(shown, spans, strict=True))
    columns: dict[str, Any] = {
        "document": _texts(line.passage.document.identifier for line in shown),
        "token": _numbers(line.place - line.passage.document.first_token for line in shown),
        "character": _numbers(line.passage.start + begin for line, (begin, _) in rows),
    }
    for key in slices.metadata_keys(store):
        name = f"meta_{key}" if key in OWN_COLUMNS else key
        columns[name] = _texts(
            None if (value := line.passage.document.metadata.get(key)) is None else slices.as_text(value)
            for line in shown
        )
    columns["before"] = _texts(line.passage.text[:begin] for line, (begin, _) in rows)
    columns["match"] = _texts(line.passage.text[begin:end] for line, (begin, end) in rows)
    columns["after"] = _texts(line.passage.text[end:] for line, (_, end) in rows)
    if paired:
        partners = [line.passage.span(line.partner, line.partner_length) for line in shown]
        both = list(zip(shown, partners, strict=True))
        columns["partner"] = _texts(line.passage.text[begin:end] for line, (begin, end) in both)
        columns["partner_character"] = _numbers(line.passage.start + begin for line, (begin, _) in both)
        columns["distance"] = _numbers(line.distance for line in shown)
    return Columns(columns, settings)


def _texts(values: Any) -> np.ndarray:
    return np.array([*values, None], dtype=object)[:-1]


def _numbers(values: Any) -> Int64Array:
    return np.array(list(values), dtype=np.int64)
