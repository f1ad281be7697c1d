"""The stored stream fed to a sink of pairs, each pair once, with the document of every token."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Protocol

import numpy as np

from colloc.counts.accumulating import BoolArray, PairSink, Places
from colloc.counts.placing import DocumentPlaces
from colloc.counts.positions import add_positions
from colloc.counts.relations import read_dependents
from colloc.counts.selection import Selection
from colloc.counts.spans import PIECE, read_stretches, whole_units, window_spans
from colloc.counts.tasks import reach
from colloc.counts.units import add_units
from colloc.counts.windows import add_windows, add_windows_near
from colloc.records import Int64Array, TokenSpan, UInt32Array
from colloc.settings import TallySpec
from colloc.store.connection import Store

_SPARSE = 16
"""Tokens for each one that matters from which on it is faster to look around those alone."""


class PlacedSink(PairSink, Protocol):
    """A sink that is told before each `load` which tokens they are."""

    def place(self, documents: Int64Array, begin: int, stop: int, units: Int64Array) -> None:
        """Say what is loaded next.

        Parameters
        ----------
        documents : int64 array
            Index of the document of every token.
        begin, stop : int
            The tokens that are counted in this load; those around them are there to be looked at.
        units : int64 array
            Where units are counted: the document of each unit. Tokens then stand for different terms of a unit.
        """


def feed(
    store: Store,
    spec: TallySpec,
    selection: Selection,
    documents: DocumentPlaces,
    labels: UInt32Array,
    sink: PlacedSink,
    cover: BoolArray | None = None,
) -> Iterator[int]:
    """Hand every pair that a tally of ``spec`` counts to ``sink``.

    Parameters
    ----------
    labels : uint32 array, shape (n_types,)
        What each type counts as; `NO_TERM` for no word at all.
    cover : bool array, optional
        By label, the last place for `NO_TERM`: pairs without any of these labels may be left out.

    Yields
    ------
    int
        After each load the index of a document: those before it will bring nothing more.
    """
    stop = documents.stop
    nothing = np.empty(0, np.int64)
    if spec.kind == "relation":
        for found in read_dependents(store, labels, selection, spec.relation, 0, stop):
            end = min(found.first + len(found.terms), stop)
            sink.place(documents.of_stretch(found.first, end), 0, end - found.first, nothing)
            sink.load(found.terms[: end - found.first])
            sink.pair(found.heads, found.dependents)
            yield int(documents.of(np.array([end - 1]))[0])
        return
    if spec.kind == "unit":
        stretches = read_stretches(store, labels, selection, spec.inside, 0, stop)
        for terms, starts, places in whole_units(stretches, 0, stop):
            units = documents.of(places)
            sink.place(np.repeat(units, np.diff(starts, append=len(terms))), 0, len(terms), units)
            add_units(terms, starts, sink)
            yield int(units[-1]) if len(units) else 0
        return
    back, ahead = reach(spec)
    stretches = read_stretches(store, labels, selection, spec.inside, 0, stop)
    place = 0
    for span in window_spans(stretches, 0, stop, back, ahead, PIECE):
        begin = place - span.context
        end = begin + len(span.terms)
        sink.place(documents.of_stretch(begin, end), span.context, len(span.terms) - span.ahead, nothing)
        if spec.kind == "positions":
            add_positions(span, spec.left, spec.right, sink)
        else:
            _add_windows(span, spec, sink, cover)
        place = end - span.ahead
        yield int(documents.of(np.array([place - 1]))[0])


def _add_windows(span: TokenSpan, spec: TallySpec, sink: PlacedSink, cover: BoolArray | None) -> None:
    if cover is not None:
        centres = np.flatnonzero(cover[np.minimum(span.terms, len(cover) - 1)])
        if len(centres) * _SPARSE < len(span.terms):
            add_windows_near(span, spec.left, spec.right, sink, centres)
            return
    add_windows(span, spec.left, spec.right, sink)


class Fork:
    """Hands everything on to several sinks."""

    def __init__(self, sinks: Sequence[PlacedSink]) -> None:
        self._sinks = sinks

    def place(self, documents: Int64Array, begin: int, stop: int, units: Int64Array) -> None:
        """See `PlacedSink.place`."""
        for sink in self._sinks:
            sink.place(documents, begin, stop, units)

    def load(self, terms: UInt32Array) -> None:
        """See `PairSink.load`."""
        for sink in self._sinks:
            sink.load(terms)

    def pair(self, first: Places, second: Places, valid: BoolArray | None = None) -> None:
        """See `PairSink.pair`."""
        for sink in self._sinks:
            sink.pair(first, second, valid)
