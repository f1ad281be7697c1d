"""Verbs for engineers: words as rows of numbers."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Literal

from colloc.settings import DEFAULT_MEMORY, DEFAULT_MIN_COUNT, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, as_list, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.answers.spaces.choosing import Choice
    from colloc.answers.spaces.matrix import Matrix
    from colloc.answers.spaces.vectors import Vectors
    from colloc.store.opening import Store


def matrix(
    store: StorePath | Store,
    output: StorePath | None = None,
    *,
    value: Literal["ppmi", "npmi", "g2", "count"] = "ppmi",
    shift: float = 1.0,
    smoothing: float = 1.0,
    weighting: Literal["flat", "harmonic", "linear"] = "flat",
    rows: Sequence[str] | None = None,
    contexts: Sequence[str] | None = None,
    min_row_count: int = 1,
    min_context_count: int = 1,
    most_rows: int | None = None,
    most_contexts: int | None = None,
    layer: str | None = None,
    context_layer: str | None = None,
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
    min_count: float = 1,
    min_value: float | None = None,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Matrix:
    """The sparse matrix of a table: words as rows, their company as columns.

    Parameters
    ----------
    output : path, optional
        Also written there: ``.npz`` (scipy), ``.mtx`` (Matrix Market) or ``.arrow``; without an ending the first
        two. Labels and settings stand beside it as JSON.
    value : {"ppmi", "npmi", "g2", "count"}
    shift, smoothing : float
        log2 shift is taken off PMI before the cut at 0; the totals of the contexts are raised to a power
        (Levy, Goldberg & Dagan 2015, section 3.2). For ``ppmi`` only.
    weighting : {"flat", "harmonic", "linear"}
        What a pair at distance d of a window of reach w counts: 1, 1/d, or (w + 1 - d)/w.
    rows, contexts : sequence of str, optional
        Words in the order wanted; by frequency with the ``min_`` and ``most_`` options otherwise. The margins are
        always those of all text.
    context_layer : str, optional
        Contexts are words of this layer and rows of ``layer``, as in lemmas beside forms: counted in one pass over
        the text, by window or relation.
    min_count, min_value : float
        Cells below are left out.
    """
    from colloc.answers.spaces.matrix import MatrixOptions
    from colloc.answers.spaces.matrix import matrix as make_matrix
    from colloc.exports.matrices import write_matrix

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, spanned, where, relation)
    chosen = MatrixOptions(
        value=value,
        shift=shift,
        smoothing=smoothing,
        weighting=weighting,
        rows=_choice(rows, min_row_count, most_rows),
        contexts=_choice(contexts, min_context_count, most_contexts),
        context_layer=context_layer,
        min_count=min_count,
        min_value=min_value,
    )
    with reading(store) as opened:
        made = make_matrix(opened, options=options, chosen=chosen, jobs=jobs, memory=memory, progress=progress)
    if output is not None:
        write_matrix(made, Path(output))
    return made


def vectors(
    store: StorePath | Store,
    output: StorePath | None = None,
    *,
    dimensions: int = 300,
    power: float = 0.5,
    join_contexts: bool = False,
    seed: int = 0,
    shift: float = 1.0,
    smoothing: float = 0.75,
    weighting: Literal["flat", "harmonic", "linear"] = "flat",
    rows: Sequence[str] | None = None,
    contexts: Sequence[str] | None = None,
    min_row_count: int | None = None,
    min_context_count: int | None = None,
    most_rows: int | None = None,
    most_contexts: int | None = None,
    layer: str | None = None,
    context_layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    where: Sequence[str] | str = (),
    relation: str | None = None,
    min_count: float = 1,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Vectors:
    """Word vectors: the leading singular vectors of the PPMI matrix (Levy, Goldberg & Dagan 2015).

    Parameters
    ----------
    output : path, optional
        Also written there: ``.npy`` or ``.txt`` (a word and its numbers a line); without an ending both. Labels and
        settings stand beside it as JSON.
    power : float
        Power of the singular values: 1, 0.5 or 0.
    join_contexts : bool
        Add to each word's vector the vector of the same word as a context.
    seed : int
        Equal seeds give equal vectors.
    min_row_count, min_context_count : int, optional
        5 when not given, but where words are listed.

    The other options are those of :func:`matrix`.
    """
    from colloc.answers.spaces.matrix import MatrixOptions
    from colloc.answers.spaces.vectors import VectorOptions
    from colloc.answers.spaces.vectors import vectors as make_vectors
    from colloc.exports.vectors import write_vectors

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, True, where, relation)
    chosen = MatrixOptions(
        shift=shift,
        smoothing=smoothing,
        weighting=weighting,
        rows=_choice(rows, min_row_count, most_rows),
        contexts=_choice(contexts, min_context_count, most_contexts),
        context_layer=context_layer,
        min_count=min_count,
    )
    shape = VectorOptions(dimensions=dimensions, power=power, join_contexts=join_contexts, seed=seed)
    with reading(store) as opened:
        made = make_vectors(
            opened, options=options, chosen=chosen, shape=shape, jobs=jobs, memory=memory, progress=progress
        )
    if output is not None:
        write_vectors(made, Path(output))
    return made


def similar(
    store: StorePath | Store,
    words: Sequence[str] | str,
    *,
    vectors: StorePath | Vectors | None = None,
    shift: float = 1.0,
    smoothing: float = 0.75,
    weighting: Literal["flat", "harmonic", "linear"] = "flat",
    min_row_count: int | None = None,
    min_context_count: int | None = None,
    layer: str | None = None,
    context_layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    where: Sequence[str] | str = (),
    relation: str | None = None,
    limit: int = 20,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """The nearest words of each word by the cosine of their PPMI rows, and the contexts that they share.

    Parameters
    ----------
    vectors : path or Vectors, optional
        Take the cosines of these vectors instead; the shared contexts are still those of the PPMI matrix. Where the
        vectors were made from another store, shared contexts are left out, and the answer's setting ``shared``
        names both stores.
    min_row_count, min_context_count : int, optional
        Words seen less often are not compared, or no contexts. When not given: 50, and 20 in a text that has fewer
        than 1,000 words seen 50 times; the answer's settings say which.

    Raises
    ------
    NotSeenError
        When one of the words never occurs, or has no row.
    """
    from colloc.answers.columns import Columns
    from colloc.answers.questions import resolve_spec
    from colloc.answers.spaces.choosing import Choice
    from colloc.answers.spaces.likeness import Space, check_seen, made_elsewhere
    from colloc.answers.spaces.likeness import similar as nearest
    from colloc.answers.spaces.matrix import MatrixOptions
    from colloc.answers.spaces.matrix import matrix as make_matrix
    from colloc.answers.spaces.vectors import Vectors
    from colloc.exports.vectors import read_vectors

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, True, where, relation)
    chosen = MatrixOptions(
        shift=shift,
        smoothing=smoothing,
        weighting=weighting,
        rows=Choice(min_count=min_row_count),
        contexts=Choice(min_count=min_context_count),
        context_layer=context_layer,
    )
    given = vectors if vectors is None or isinstance(vectors, Vectors) else read_vectors(Path(vectors))
    asked = as_list(words)
    with reading(store) as opened:
        apart = None if given is None else made_elsewhere(given, opened)
        if given is not None and apart is not None:
            answer = nearest(Space(given), asked, limit=limit)
            return Columns(answer.data, {**answer.settings, "shared": apart})
        check_seen(opened, resolve_spec(opened, options)[0].layer, asked)
        made = make_matrix(opened, options=options, chosen=chosen, jobs=jobs, memory=memory, progress=progress)
    return nearest(Space(made if given is None else given), asked, limit=limit, contexts=made)


def agreement(
    space: Matrix | Vectors | StorePath,
    lists: Mapping[str, Sequence[tuple[str, str, float]]],
    *,
    seed: int = 0,
) -> Columns:
    """Spearman's correlation of cosines with people's judgements, with a bootstrap interval and coverage.

    Parameters
    ----------
    space : Matrix, Vectors or path of written vectors
    lists : mapping of name to sequence of (word, word, score)
    """
    from colloc.answers.spaces.agreement import agreement as correlate
    from colloc.answers.spaces.judged import from_rows
    from colloc.answers.spaces.likeness import Space
    from colloc.answers.spaces.matrix import Matrix
    from colloc.answers.spaces.vectors import Vectors
    from colloc.exports.vectors import read_vectors

    known = space if isinstance(space, Matrix | Vectors) else read_vectors(Path(space))
    judged = [from_rows(name, rows) for name, rows in lists.items()]
    return correlate(Space(known), judged, seed=seed)


def _choice(words: Sequence[str] | None, min_count: int | None, most: int | None) -> Choice:
    from colloc.answers.spaces.choosing import Choice

    least = min_count if min_count is not None else DEFAULT_MIN_COUNT if words is None else 1
    return Choice(words=None if words is None else tuple(words), min_count=least, most=most)
