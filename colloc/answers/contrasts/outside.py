"""A store's words against word frequencies from elsewhere: a list of counts, or general frequencies of a language."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.contrasts.gathering import word_counts_by_document
from colloc.answers.contrasts.saying import both_directions, say
from colloc.answers.contrasts.words import ContrastOrder, check_order, ranking_score
from colloc.answers.questions import built_spec
from colloc.counts.words import slice_word_counts
from colloc.errors import DataError, MissingExtraError, NotSeenError, UsageError
from colloc.measures.contrast import as_table, keyness_g2, log_ratio_interval
from colloc.measures.discoveries import log_q_values
from colloc.measures.exact import association_log_p
from colloc.measures.intervals import Interval
from colloc.measures.subcorpora.reference import g2_to_rate, log_ratio_to_rate, rate_test_log_p
from colloc.measures.tails import chi_square_log_p
from colloc.records import FloatArray, Int64Array
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT
from colloc.store import slices, vocabulary
from colloc.store.connection import Store

ABSENT = "that only; no document here has it"


@dataclass(frozen=True, slots=True)
class Frequencies:
    """Word frequencies from elsewhere.

    Attributes
    ----------
    name : str
        What they are called in the settings.
    values : mapping of str to float
        Counts, or relative frequencies where ``total`` is None.
    total : float or None
        Tokens that the counts were taken from.
    """

    name: str
    values: Mapping[str, float]
    total: float | None


def counted_list(name: str, counts: Mapping[str, int], total: int | None = None) -> Frequencies:
    """A list of counts; ``total`` is their sum unless the list was cut short and the whole is known.

    Raises
    ------
    DataError
        A count is negative, all are 0, or they exceed the total.
    """
    if any(count < 0 for count in counts.values()):
        raise DataError(f"{name}: counts must not be negative")
    whole = sum(counts.values())
    if not whole or (total is not None and total < whole):
        raise DataError(f"{name}: the counts add up to {whole}, which no corpus of {total or 0} words can have")
    return Frequencies(name, counts, float(total or whole))


def general_frequencies(language: str) -> Frequencies:
    """Relative frequencies of the words of a language, from the package `wordfreq` (Speer 2022).

    Raises
    ------
    MissingExtraError
        The package is not installed.
    UsageError
        It has no list for this language.
    """
    try:
        import wordfreq
    except ImportError as error:
        raise MissingExtraError("general word frequencies need wordfreq: pip install 'colloc[reference]'") from error
    known = wordfreq.available_languages()
    if language not in known:
        raise UsageError(f"no general word frequencies for {language!r}: there are {', '.join(sorted(known))}")
    return Frequencies(f"wordfreq {language}", wordfreq.get_frequency_dict(language), None)


def contrast_frequencies(
    store: Store,
    frequencies: Frequencies,
    *,
    where: Sequence[str] = (),
    layer: str | None = None,
    pattern: str | None = None,
    min_count: int = DEFAULT_MIN_COUNT,
    min_docs: int = 1,
    sort: ContrastOrder = "documents",
    limit: int = 50,
    memory: int = DEFAULT_MEMORY,
) -> Columns:
    """Words that the store has more often, or less often, than the frequencies from elsewhere say.

    Words are compared in the layer's form, so a folded layer adds up what differs in case alone. Words of the list
    that the store lacks are in the table too, and words of the store that the list lacks; where the list has
    relative frequencies, which cannot be 0, the latter are left out.

    Returns
    -------
    Columns
        word, log_ratio, formula_low, formula_high (bits, 95 %), count_this, count_that (counted lists only),
        per_million_this, per_million_that, documents_this, g2, q, document_q (the documents' mean rate against that of
        the list; never below the q-value of G2), says.

    Raises
    ------
    NotSeenError
        No word occurs often enough.
    """
    check_order(sort)
    layer = layer or built_spec(store).layer
    slice_text = slices.canonical(where)
    counts = slice_word_counts(store, layer, slice_text)
    tokens = int(counts.tokens.sum())
    known, lacking = _in_layer(store, layer, frequencies)
    tested = counts.tokens + (known if frequencies.total is not None else 0) >= max(min_count, 1)
    if frequencies.total is None:
        # A rate says how many are expected here: a word that should be frequent and is not is news.
        tested = (np.maximum(counts.tokens, known * tokens) >= max(min_count, 1)) & (known > 0)
    lacking = _often_enough(lacking, frequencies, tokens, min_count)
    if pattern is not None:
        matching = np.zeros(len(tested), dtype=bool)
        matching[vocabulary.terms_matching(store, layer, pattern)] = True
        tested, lacking = tested & matching, {}
    terms = np.flatnonzero(tested)
    if not len(terms) + len(lacking):
        raise NotSeenError(f"{store.path}: no word occurs {min_count} times here or in the list; lower --min-count")
    texts = list(lacking)
    count = np.concatenate([counts.tokens[terms], np.zeros(len(texts), np.int64)])
    other = np.concatenate([known[terms], np.array(list(lacking.values()), np.float64)])
    held = np.concatenate([counts.documents[terms], np.zeros(len(texts), np.int64)])
    log_ratio, interval, g2, log_p = _compared(count, tokens, other, frequencies.total)
    rate = other / frequencies.total if frequencies.total is not None else other
    document_log_p, largest = _over_documents(store, layer, slice_text, terms, held, rate, memory)
    # The list's own uncertainty is in G2 alone: both must speak for a finding.
    document_log_p = np.maximum(document_log_p, log_p)
    log_q, document_log_q = log_q_values(log_p), log_q_values(document_log_p)
    more_here = log_ratio >= 0
    score = ranking_score(sort, document_log_p, log_ratio, interval.low, interval.high, g2)
    shown = np.flatnonzero((held >= min_docs) | (count == 0))
    rows = shown[both_directions(score[shown], [np.abs(g2[shown])], more_here[shown], limit)]
    from_store = rows[rows < len(terms)]
    names = dict(zip(from_store.tolist(), vocabulary.term_texts(store, layer, terms[from_store]), strict=True))
    remarks = say(
        np.exp(log_q[rows]),
        np.exp(document_log_q[rows]),
        (count[rows], other[rows]),
        (largest[rows], np.zeros(len(rows), np.int64)),
        more_here[rows],
    )
    # What no document has leaves the test over documents nothing to work with.
    remarks = [ABSENT if count[row] == 0 else remark for row, remark in zip(rows, remarks, strict=True)]
    columns: dict[str, Any] = {
        "word": [names[row] if row < len(terms) else texts[row - len(terms)] for row in rows.tolist()],
        "log_ratio": log_ratio[rows],
        "formula_low": interval.low[rows],
        "formula_high": interval.high[rows],
        "count_this": count[rows],
        **({"count_that": other[rows]} if frequencies.total is not None else {}),
        "per_million_this": count[rows] * (1e6 / max(tokens, 1)),
        "per_million_that": rate[rows] * 1e6,
        "documents_this": held[rows],
        "g2": g2[rows],
        "q": np.exp(log_q[rows]),
        "document_q": np.exp(document_log_q[rows]),
        "says": remarks,
    }
    settings = {
        "store": str(store.path),
        "layer": layer,
        "this": slice_text or "all documents",
        "that": frequencies.name,
        "pattern": pattern,
        "min_count": min_count,
        "min_docs": min_docs,
        "sort": sort,
        "limit": limit,
        "tested": len(terms) + len(texts),
        "tokens_this": tokens,
        **({"tokens_that": frequencies.total} if frequencies.total is not None else {}),
    }
    return Columns(columns, settings)


def _in_layer(store: Store, layer: str, frequencies: Frequencies) -> tuple[FloatArray, dict[str, float]]:
    """The frequencies by term number, and those of words that the store does not know, by text."""
    brought: dict[str, float] = {}
    for text, value in frequencies.values.items():
        form = vocabulary.brought_to(store, layer, text)
        brought[form] = brought.get(form, 0.0) + float(value)
    numbers = _term_numbers(store, layer, list(brought))
    values = np.array(list(brought.values()), np.float64)
    known = np.zeros(vocabulary.term_count(store, layer))
    there = numbers >= 0
    known[numbers[there]] = values[there]
    lacking = {form: value for (form, value), here in zip(brought.items(), there.tolist(), strict=True) if not here}
    return known, lacking


def _term_numbers(store: Store, layer: str, forms: list[str]) -> Int64Array:
    """As :func:`vocabulary.term_numbers`; a long list is looked up in all terms at once, a short one word by word."""
    if vocabulary.term_count(store, layer) > 10 * len(forms):
        return vocabulary.term_numbers(store, layer, forms)
    number_of = {text: number for number, text in enumerate(vocabulary.term_texts(store, layer))}
    return np.array([number_of.get(form, -1) for form in forms], np.int64)


def _often_enough(
    lacking: Mapping[str, float], frequencies: Frequencies, tokens: int, min_count: int
) -> dict[str, float]:
    scale = 1.0 if frequencies.total is not None else float(tokens)
    return {text: value for text, value in lacking.items() if value * scale >= max(min_count, 1)}


def _compared(
    count: Int64Array, tokens: int, other: FloatArray, total: float | None
) -> tuple[FloatArray, Interval, FloatArray, FloatArray]:
    """Log ratio, its interval, G2 and ln p."""
    if total is None:
        log_ratio, interval = log_ratio_to_rate(count, tokens, other)
        g2 = g2_to_rate(count, tokens, other)
        return log_ratio, interval, g2, chi_square_log_p(np.abs(g2))
    log_ratio, interval = log_ratio_interval(count, tokens, other, total)
    return (
        log_ratio,
        interval,
        keyness_g2(count, tokens, other, total),
        association_log_p(*as_table(count, tokens, other, total)),
    )


def _over_documents(
    store: Store,
    layer: str,
    slice_text: str,
    terms: Int64Array,
    held: Int64Array,
    rate: FloatArray,
    memory: int,
) -> tuple[FloatArray, Int64Array]:
    """ln p of the documents' mean rate against the known one, and the most that one document has."""
    log_p, largest = np.full(len(rate), np.nan), np.zeros(len(rate), np.int64)
    for lot, found in word_counts_by_document(store, layer, [slice_text], terms, held[: len(terms)], memory):
        rates, n = found.rates, len(found.sizes)
        mean = np.bincount(rates.items, weights=rates.rates, minlength=found.n_items) / n
        square = np.bincount(rates.items, weights=rates.rates**2, minlength=found.n_items)
        variance = np.maximum(square - n * mean**2, 0.0) / max(n - 1, 1)
        log_p[lot] = rate_test_log_p(mean, variance, np.full(found.n_items, n), rate[lot])
        largest[lot] = found.largest_on(True)
    return log_p, largest
