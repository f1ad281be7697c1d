"""Verbs that ask: words, pairs, around, and measures for tables from elsewhere."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any, Literal

from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_EXPECTED, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, as_list, pair_options, reading, store_path

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.answers.sureness.wishes import Wishes
    from colloc.store.opening import Store

DEFAULT_LIMIT = 50


def words(
    store: StorePath | Store,
    *,
    layer: str | None = None,
    where: Sequence[str] | str = (),
    pattern: str | None = None,
    min_count: int = 1,
    min_docs: int = 1,
    sort: Literal["count", "documents", "word", "dp_norm"] = "count",
    limit: int = DEFAULT_LIMIT,
) -> Columns:
    """Words with count, rate per million, documents and dispersion; ``limit=0`` gives all."""
    from colloc.answers.words import words as ask_words

    with reading(store) as opened:
        return ask_words(
            opened,
            layer=layer,
            where=as_list(where),
            pattern=pattern,
            min_count=min_count,
            min_docs=min_docs,
            sort=sort,
            limit=limit,
        )


def pairs(
    store: StorePath | Store,
    *,
    measure: str | None = None,
    show: Sequence[str] | None = None,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    spanned: bool = True,
    where: Sequence[str] | str = (),
    relation: str | None = None,
    min_count: int | None = None,
    min_word_count: int = 1,
    sure: bool = False,
    min_docs: int | None = None,
    max_q: float | None = None,
    above_chance: Literal["order", "corpus"] | None = None,
    interval_above: float | None = None,
    any_strength: bool = False,
    avoid: bool = False,
    min_expected: float = DEFAULT_MIN_EXPECTED,
    upos: str | None = None,
    stop: Sequence[str] | str = (),
    no_self: bool = False,
    limit: int = DEFAULT_LIMIT,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """The pairs that rank highest by one measure (NPMI when not given); ``limit=0`` gives all.

    Thresholds act on what is shown, never on the margins.

    Parameters
    ----------
    show : sequence of str
        Measures; first_count and second_count, the frequencies of the two words in the documents asked about (margins
        count pairs); and columns of sureness: documents, dp_norm, pmi_low, pmi_high, sound, formula_low, formula_high,
        q_value, corpus_floor, above_corpus, order_floor, above_order.
    min_count : int
        Least joint count: 5 when not given, 0 with ``avoid``.
    sure : bool
        All columns of sureness.
    min_docs : int
        Least number of documents that hold the pair. When not given: 3 where the documents asked about are 20 or more,
        else 1; 1 too with ``min_count`` below 5, ``limit=0``, ``avoid``, all relations at once, or words asked for that
        fewer documents hold.
    max_q, above_chance, interval_above
        What rows must reach: the largest q-value, a chance floor, and what the lower end of the interval of PMI must
        exceed.
    any_strength : bool
        Also pairs that meet as often as expected or less; otherwise only those that meet more often.
    avoid : bool
        Pairs that meet much less often than chance, or never, instead of those that meet more often.
    min_expected : float
        Least expected count for which avoidance is claimed.
    upos : str
        A pattern of word classes that the two words follow, next to each other unless a window is given: ``ADJ NOUN``
        or ``ADJ|NOUN NOUN``. The layer is ``lemma/upos`` where none is given.
    stop : sequence of str
        Words that are not shown: languages (``en``), files of words, ``top:N``, the N most frequent, or ``numbers``,
        all without a letter.
    no_self : bool
        Pairs of a word with itself are not shown.
    """
    from colloc.answers.pairs import pairs as ask_pairs

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, relation)
    with reading(store) as opened:
        return ask_pairs(
            opened,
            measure=measure,
            show=show,
            options=options,
            min_count=min_count,
            min_word_count=min_word_count,
            wishes=_wishes(sure, min_docs, max_q, above_chance, interval_above),
            any_strength=any_strength,
            avoid=avoid,
            min_expected=min_expected,
            upos=upos,
            stop=as_list(stop),
            no_self=no_self,
            limit=limit,
            jobs=jobs,
            memory=memory,
            progress=progress,
        )


def around(
    store: StorePath | Store,
    words: Sequence[str] | str,
    *,
    side: Literal["both", "left", "right", "each"] = "both",
    upos: Sequence[str] | str = (),
    measure: str | None = None,
    show: Sequence[str] | None = None,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    spanned: bool = True,
    where: Sequence[str] | str = (),
    relation: str | None = None,
    min_count: int | None = None,
    min_word_count: int = 1,
    sure: bool = False,
    min_docs: int | None = None,
    max_q: float | None = None,
    above_chance: Literal["order", "corpus"] | None = None,
    interval_above: float | None = None,
    any_strength: bool = False,
    avoid: bool = False,
    min_expected: float = DEFAULT_MIN_EXPECTED,
    stop: Sequence[str] | str = (),
    limit: int = DEFAULT_LIMIT,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """The company of each word, strongest first, ``limit`` rows a word; the word asked for is ``first``.

    ``side="each"`` lists both sides apart, ``upos`` lists companions of these word classes apart; with a
    ``relation`` the column ``role`` says whether the word asked for is head or dependent (``side="right"``: head only,
    ``side="left"``: dependent only), and ``relation="all"`` lists every relation apart, in one table with the column
    ``relation``. The other parameters are those of `pairs`.

    Raises
    ------
    NotSeenError
        When none of the words is in the store.
    """
    from colloc.answers.around import around as ask_one
    from colloc.answers.relations import ALL_RELATIONS, around_relations

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, relation)
    ask_around = around_relations if relation == ALL_RELATIONS else ask_one
    with reading(store) as opened:
        return ask_around(
            opened,
            as_list(words),
            side=side,
            upos=as_list(upos),
            measure=measure,
            show=show,
            options=options,
            min_count=min_count,
            min_word_count=min_word_count,
            wishes=_wishes(sure, min_docs, max_q, above_chance, interval_above),
            any_strength=any_strength,
            avoid=avoid,
            min_expected=min_expected,
            stop=as_list(stop),
            limit=limit,
            jobs=jobs,
            memory=memory,
            progress=progress,
        )


def _wishes(
    sure: bool, min_docs: int | None, max_q: float | None, above_chance: Any, interval_above: float | None
) -> Wishes:
    from colloc.answers.sureness.wishes import Wishes

    return Wishes(
        everything=sure, min_docs=min_docs, max_q=max_q, above_chance=above_chance, interval_above=interval_above
    )


def floors(
    store: StorePath | Store,
    *,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    spanned: bool = True,
    where: Sequence[str] | str = (),
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """Make the chance floors of one way to count and keep them in the store; a row for each band of expected count.

    Floors that the store has already are only read.
    """
    from colloc.answers.sureness.listing import listed_floors
    from colloc.store.opening import open_for_writing

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, None)
    with open_for_writing(store_path(store), "floors") as opened:
        return listed_floors(opened, options, jobs=jobs, memory=memory, progress=progress)


def measure(table: Mapping[str, Any] | Columns, *, measures: Sequence[str] | None = None) -> Columns:
    """Measures for counts from anywhere.

    Parameters
    ----------
    table : mapping of str to array-like
        With the columns joint, first_total, second_total and total; others pass through.
    measures : sequence of str
        Names of the catalogue; all when not given.

    Raises
    ------
    DataError
        For a missing column, or counts that no table can have.
    """
    from colloc.answers.measuring import measured

    return measured(table, measures)
