"""Verbs that compare: two sub-corpora, two words, a list from elsewhere, many slices."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any, Literal

from colloc.errors import UsageError
from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, as_list, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.store.opening import Store

DEFAULT_LIMIT = 50
Order = Literal["documents", "bound", "log_ratio", "g2", "association", "bits", "t", "log_odds"]


def contrast(
    store: StorePath | Store,
    first: str | None = None,
    second: str | None = None,
    *,
    this: Sequence[str] | str = (),
    that: Sequence[str] | str = (),
    by: str | None = None,
    words: Sequence[str] = (),
    listed: Mapping[str, int] | None = None,
    listed_total: int | None = None,
    listed_name: str = "list",
    reference: str | None = None,
    pairs: bool = False,
    side: Literal["both", "left", "right"] = "both",
    where: Sequence[str] | str = (),
    pattern: str | None = None,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    relation: str | None = None,
    min_count: int = DEFAULT_MIN_COUNT,
    min_word_count: int = 1,
    min_docs: int = 1,
    sort: Order | None = None,
    limit: int = DEFAULT_LIMIT,
    permutations: int = 0,
    seed: int = 1,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """What two slices, two words, many slices, or the store and a list from elsewhere do not have in common.

    ============================  ==========================================================================
    asked with                    answer
    ============================  ==========================================================================
    this (and that)               words that the slices use at different rates; with ``pairs`` pairs of words
    this (and that), two words    the evidence for this pair side by side
    by                            words that tell the values of a metadata key apart
    by, two words                 the pair's association in each value, pooled, and whether all agree
    words (two)                   what stands by one of two words and not by the other
    listed, or reference          words more or less frequent than in a list of counts, or than in a language
    ============================  ==========================================================================

    Parameters
    ----------
    this, that : str or sequences of str
        The slices; without ``that`` all other documents.
    listed : mapping of str to int
        Counts of words from elsewhere; ``listed_total`` is the size of what they were counted in, where the list was
        cut short.
    reference : str
        A language code of the package `wordfreq`.
    side : {"both", "left", "right"}
        With ``words``: which side of them the company stands on.
    sort : str
        documents (the test over documents), bound (the end of the interval nearer to 0), log_ratio, g2; association
        for pairs; bits or documents for many slices; bound, t, log_odds or g2 for two words.
    permutations : int
        Exchanges of document labels; p-values adjusted by max-T take the place of q-values.

    Raises
    ------
    UsageError
        Nothing to compare was named, or more than one thing.
    """
    if (first is None) != (second is None):
        raise UsageError("a contrast of one pair needs both words")
    asked = {
        "this": bool(this),
        "by": by is not None,
        "word": bool(words),
        "list": listed is not None,
        "reference": reference is not None,
    }
    named = [f"--{name}" for name, given in asked.items() if given]
    if len(named) != 1:
        either = "--this SLICE, --by KEY, --word X --word Y, --list FILE or --reference LANGUAGE"
        raise UsageError(f"name one thing to compare: {either}" + (f", not {' and '.join(named)}" if named else ""))
    if that and not this:
        raise UsageError("--that is the other side of --this: name both, or --this alone")
    if first is not None and not (this or by):
        raise UsageError("a pair is compared over slices: name --this SLICE or --by KEY")
    ranked = {"sort": sort} if sort is not None else {}
    options = pair_options(layer, window, left, right, unit, inside, margins, directed, True, where, relation)
    counting: dict[str, Any] = {"options": options, "jobs": jobs, "memory": memory, "progress": progress}
    shown: dict[str, Any] = {"min_count": min_count, "limit": limit, **ranked}
    listing: dict[str, Any] = {**shown, "where": as_list(where), "layer": layer, "memory": memory}
    sides: dict[str, Any] = {"this": as_list(this), "that": as_list(that)}
    with reading(store) as opened:
        if by is not None:
            if first is not None and second is not None:
                from colloc.answers.contrasts.strata import contrast_strata

                return contrast_strata(opened, first, second, by=by, **counting)
            from colloc.answers.contrasts.apart import tell_apart

            return tell_apart(opened, by=by, **listing)
        if words:
            from colloc.answers.contrasts.company import contrast_company

            if len(words) != 2:
                raise UsageError(f"the company of two words is compared: give --word twice, not {len(words)} times")
            return contrast_company(opened, words[0], words[1], side=side, min_docs=min_docs, **counting, **shown)
        if listed is not None or reference is not None:
            from colloc.answers.contrasts import outside

            frequencies = (
                outside.counted_list(listed_name, listed, listed_total)
                if listed is not None
                else outside.general_frequencies(str(reference))
            )
            return outside.contrast_frequencies(opened, frequencies, pattern=pattern, min_docs=min_docs, **listing)
        if first is not None and second is not None:
            from colloc.answers.contrasts.card import contrast_pair

            return contrast_pair(opened, first, second, **sides, **counting)
        exchanged: dict[str, Any] = {"permutations": permutations, "seed": seed}
        if pairs:
            from colloc.answers.contrasts.pairs import contrast_pairs

            if pattern is not None:
                raise UsageError("a pattern chooses words: leave it out with pairs")
            thresholds: dict[str, Any] = {"min_word_count": min_word_count, "min_docs": min_docs}
            return contrast_pairs(opened, **sides, **counting, **shown, **thresholds, **exchanged)
        from colloc.answers.contrasts.words import contrast_words

        return contrast_words(opened, **sides, pattern=pattern, min_docs=min_docs, **listing, **exchanged)
